"""Ideal amplifiers: bare controlled sources whose gain is so high that they can be nothing else.

A source counts when it turns the difference of two nets into a voltage against ground with a gain of at least 1000.
Behavioural sources are judged by the slope of their expression where the inputs are equal, so that a limited
``limit(1e5*(V(p)-V(n)), -15, 15)`` counts as well.
"""

from __future__ import annotations

import re
from collections.abc import Callable

from ..text.expressions import ExpressionError, evaluate
from .bodies import HIGH_GAIN
from .parts import Amplifier, Part, PartKind

_PROBE = re.compile(r"V\(([^(),\s]+)(?:,([^(),\s]+))?\)")
_TABLE = re.compile(r"^\s*(V\([^()]+\)|[^=()]*?)\s*[}\s]*=\s*(.+)$", re.IGNORECASE)


def ideal_amplifier(part: Part, is_ground: Callable[[str], bool]) -> Amplifier | None:
    """Return the amplifier that a source stands for; None for any other source."""
    if part.kind is PartKind.VCVS and part.expression is None:
        if part.value is None or len(part.control) != 2 or part.coefficients:
            return None
        gain, pair = part.value, (part.control[0], part.control[1])
    elif part.expression is not None and part.kind in (PartKind.VCVS, PartKind.BEHAVIOURAL):
        if "I" in part.marks or "laplace" in part.marks:
            return None
        found = slope(part.expression, is_table="table" in part.marks)
        if found is None:
            return None
        gain, pair = found
    else:
        return None
    if abs(gain) < HIGH_GAIN or pair[0] == pair[1]:
        return None
    first, second = part.pins[0].net, part.pins[1].net
    if is_ground(second) and not is_ground(first):
        output = first
    elif is_ground(first) and not is_ground(second):
        output, gain = second, -gain
    else:
        return None
    plus, minus = pair if gain > 0 else (pair[1], pair[0])
    return Amplifier(
        part.designator,
        part.designator,
        "op-amp",
        plus,
        minus,
        output,
        part.location,
        gain=abs(gain),
        gain_origin="netlist",
        evidence=f"a source with a gain of {abs(gain):.3g} from the difference of two nets",
    )


def slope(text: str, *, is_table: bool = False) -> tuple[float, tuple[str, str]] | None:
    """Return the gain of an expression at equal inputs and the two nets (rising, falling) that steer it.

    None when it does not depend on exactly one difference of two nets.
    """
    if is_table:
        return _table_slope(text)
    nets: dict[str, str] = {}

    def name(match: re.Match[str]) -> str:
        first = nets.setdefault(match[1], f"zz{len(nets)}")
        if match[2] is None:
            return f"({first})"
        second = nets.setdefault(match[2], f"zz{len(nets)}")
        return f"({first}-{second})"

    plain = _PROBE.sub(name, text)
    if len(nets) < 2 or len(nets) > 4:
        return None
    names = list(nets.values())
    # Supplies that appear as clamps stand apart, so that the limits do not touch where the slope is taken.
    for high in (None, *names):
        for low in (None, *(each for each in names if each != high)):
            if (high is None) != (low is None):
                continue
            rest = {each: 0.0 for each in names}
            if high is not None and low is not None:
                rest[high], rest[low] = 10.0, -10.0
            found = _slopes(plain, rest, names)
            strong = [each for each in names if abs(found.get(each, 0.0)) >= HIGH_GAIN] if found else []
            if found and len(strong) == 2 and high not in strong and low not in strong:
                one, two = strong
                if abs(found[one] + found[two]) <= 0.1 * abs(found[one]):
                    back = {value: key for key, value in nets.items()}
                    return found[one], (back[one], back[two])
    return None


def _slopes(text: str, at: dict[str, float], names: list[str]) -> dict[str, float] | None:
    step = 1e-7
    found: dict[str, float] = {}
    try:
        for each in names:
            up = evaluate(text, {**at, each: at[each] + step})
            down = evaluate(text, {**at, each: at[each] - step})
            found[each] = (up - down) / (2 * step)
    except ExpressionError:
        return None
    return found


def _table_slope(text: str) -> tuple[float, tuple[str, str]] | None:
    match = _TABLE.match(text)
    probe = _PROBE.search(text)
    if match is None or probe is None or probe[2] is None:
        return None
    numbers = [each for each in re.split(r"[\s,()]+", match[2]) if each]
    try:
        values = [evaluate(each.strip("{}"), {}) for each in numbers]
    except ExpressionError:
        return None
    points = sorted(zip(values[::2], values[1::2], strict=False))
    slopes = [
        (y2 - y1) / (x2 - x1)
        for (x1, y1), (x2, y2) in zip(points, points[1:], strict=False)
        if x2 > x1 and x1 <= 0.0 <= x2
    ]
    if not slopes:
        return None
    steepest = max(slopes, key=abs)
    return steepest, (probe[1], probe[2])
