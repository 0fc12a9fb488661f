"""Lines that only name a part: what its data say about the order of its nets."""

from __future__ import annotations

from ..text.netlist import ElementLine
from .assemble import Level, opaque
from .clues import Clue
from .definitions import AMPLIFIER_KINDS, FIVE_PIN_ORDERS, RAIL_KINDS
from .partdata import PartData
from .parts import Part, PartKind
from .pinouts import orders_for


def named_part(
    element: ElementLine, level: Level, data: PartData | None, *, is_package_line: bool, is_board: bool
) -> tuple[Part, Clue | None]:
    """Return the opaque part of a line that names a part, with a clue when its data make it an amplifier or source."""
    name = element.model or ""
    if data is None or data.kind not in AMPLIFIER_KINDS | RAIL_KINDS:
        return opaque(element, level), None
    kind = PartKind.REGULATOR if data.kind in RAIL_KINDS else PartKind.AMPLIFIER
    part = opaque(element, level, kind)
    count = len(element.nets)
    orders = list(orders_for(data, name, count, is_package_line=is_package_line))
    if not is_board and count == 5 and data.kind in {"op-amp", "comparator", "current-feedback"}:
        standard = FIVE_PIN_ORDERS[0]
        orders = [standard, *(each for each in orders if each[1] != standard[1])]
    if not is_board and count == 3 and data.kind in {"op-amp", "comparator", "current-feedback"}:
        orders.append(("customary order of models", ("IN+", "IN-", "OUT")))
    clue = Clue(part.designator, element.location, part.nets, element.model, orders=tuple(orders), data=data)
    return part, clue
