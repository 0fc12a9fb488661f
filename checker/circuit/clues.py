"""What flattening learns about an instance that may be an amplifier or a rail source, before rails are known."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from ..errors import Location
from .partdata import PartData
from .parts import Part


@dataclass(frozen=True, slots=True)
class Clue:
    """One instance that stays opaque.

    ``nets`` are in the order of the line and ``ports`` name them where a definition does. ``channels`` holds the
    roles of each channel as role to position; it is empty while the roles are not known, and ``orders`` then lists
    the orders that are customary for such an instance, each with its description. ``data`` is what is known of the
    part by its name. ``gain`` and ``inner`` come from a linear body.
    """

    designator: str
    location: Location
    nets: tuple[str, ...]
    part_name: str | None
    ports: tuple[str, ...] = ()
    channels: tuple[Mapping[str, int], ...] = ()
    orders: tuple[tuple[str, tuple[str, ...]], ...] = ()
    data: PartData | None = None
    evidence: str = ""
    gain: float | None = None
    inner: tuple[Part, ...] = ()
    is_certain: bool = False
    extra: Mapping[str, str] = field(default_factory=dict)
