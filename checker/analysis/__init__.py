"""From a circuit and its stages to figures: operating point, small signal, extremes, tolerance, each on demand."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from .figures import Figure, Known, Unknown
from .measures import find_measure, list_measures
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench

__all__ = ["Bench", "Figure", "Known", "Subject", "Unknown", "find_measure", "list_measures"]


def __getattr__(name: str) -> Any:
    if name == "Bench":
        from .bench import Bench

        return Bench
    raise AttributeError(name)
