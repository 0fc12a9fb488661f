"""What the analysis hands on: figures that are known with a unit, or unknown with the reason."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, TypeAlias


@dataclass(frozen=True, slots=True)
class Known:
    """A computed figure. ``value`` is a float, a bool, a string, or a tuple or mapping of floats, in SI units.

    ``assumptions`` are the statements that the figure rests on (``"headroom of 2.0 V assumed: no part data"``).
    """

    value: Any
    assumptions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Unknown:
    """A figure that could not be computed. ``missing`` names what would make it known, in the reader's words."""

    reason: str
    missing: str | None = None


Figure: TypeAlias = Known | Unknown
