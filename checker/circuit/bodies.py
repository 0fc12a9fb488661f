"""What a subcircuit body computes to: which port is the output, which inputs steer it, with which gain.

The body is solved at DC with its ports driven one by one (capacitors open, inductors short, junctions open, transistors
absent), by plain Gaussian elimination: bodies hold a few dozen unknowns at most. The sign of the gain tells the
inputs apart, whatever the author called them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

from .parts import Part, PartKind

LINEAR_KINDS = frozenset(
    {
        PartKind.RESISTOR,
        PartKind.CAPACITOR,
        PartKind.INDUCTOR,
        PartKind.VCVS,
        PartKind.VCCS,
        PartKind.CCCS,
        PartKind.CCVS,
    }
)

_BRANCHES = frozenset({PartKind.VCVS, PartKind.CCVS, PartKind.VOLTAGE_SOURCE, PartKind.INDUCTOR})

HIGH_GAIN = 999.0
MOST_PARTS = 120
# A stage that charges a capacitor has no resistance of its own; simulators give every net this conductance.
LEAST_SIEMENS = 1e-12


@dataclass(frozen=True, slots=True)
class BodyGain:
    """Open-loop DC gain of a body from its differential input to its output port."""

    plus: str
    minus: str
    output: str
    gain: float


def is_linear(parts: Iterable[Part]) -> bool:
    """True when every part is a resistor, capacitor, inductor or a controlled source with a plain gain."""
    return all(part.kind in LINEAR_KINDS and part.expression is None and part.value is not None for part in parts)


def differential_gain(
    parts: Sequence[Part], ports: Sequence[str], ground: str | None, least: float = HIGH_GAIN
) -> BodyGain | None:
    """Find the output port and the two ports that steer it with opposite gains of at least ``least``.

    Returns None when no port, or more than one, answers like an amplifier's output.
    """
    inside = set(ports) - {ground}
    if len(inside) < 3 or len(parts) > MOST_PARTS or not has_input_pair(parts, inside):
        return None
    found: list[BodyGain] = []
    for output in ports:
        if output == ground:
            continue
        others = [each for each in ports if each not in (output, ground)]
        gains: dict[str, float] = {}
        for driven in others:
            drives = {each: 1.0 if each == driven else 0.0 for each in others}
            answer = solve_body(parts, drives, output, ground)
            if answer is None:
                gains = {}
                break
            gains[driven] = answer
        strong = [each for each in others if abs(gains.get(each, 0.0)) >= least]
        if len(strong) != 2:
            continue
        first, second = strong
        if gains[first] * gains[second] >= 0:
            continue
        plus, minus = (first, second) if gains[first] > 0 else (second, first)
        ratio = gains[plus] / -gains[minus]
        if not 0.9 < ratio < 1.1:
            continue
        found.append(BodyGain(plus, minus, output, (gains[plus] - gains[minus]) / 2))
    return found[0] if len(found) == 1 else None


def has_input_pair(parts: Iterable[Part], ports: set[str]) -> bool:
    """True when some source is steered by two ports themselves, as an amplifier's first stage is.

    A block built of amplifiers and resistors has its sources steered by inner nets.
    """
    behind: dict[str, str | None] = {}
    listed = list(parts)
    for part in listed:
        if part.kind is PartKind.RESISTOR:
            first, second = part.nets
            for inner, outer in ((first, second), (second, first)):
                if inner not in ports:
                    behind[inner] = outer if inner not in behind and outer in ports else None
    for part in listed:
        if part.kind in (PartKind.VCVS, PartKind.VCCS) and len(part.control) >= 2:
            ends = [each if each in ports else behind.get(each) for each in part.control[:2]]
            if ends[0] in ports and ends[1] in ports and ends[0] != ends[1]:
                return True
    return False


def solve_body(parts: Sequence[Part], drives: Mapping[str, float], wanted: str, ground: str | None) -> float | None:
    """Return the DC voltage of ``wanted`` against ground with the given nets driven (V); None when it is not fixed."""
    nets: dict[str, int] = {}
    for part in parts:
        for net in (*part.nets, *_control_nets(part)):
            if net != ground:
                nets.setdefault(net, len(nets))
    for net in drives:
        nets.setdefault(net, len(nets))
    if wanted not in nets:
        return None
    branches: dict[str, int] = {}
    for part in parts:
        if part.kind in _BRANCHES:
            branches[part.designator.lower()] = len(nets) + len(branches)
    size = len(nets) + len(branches) + len(drives)
    rows: list[dict[int, float]] = [{} for _ in range(size)]
    right = [0.0] * size

    def add(row: int | None, column: int | None, value: float) -> None:
        if row is not None and column is not None:
            rows[row][column] = rows[row].get(column, 0.0) + value

    def at(net: str) -> int | None:
        return None if net == ground else nets[net]

    for row in nets.values():
        add(row, row, LEAST_SIEMENS)
    for part in parts:
        if len(part.pins) < 2 or part.kind is PartKind.COUPLING:
            continue
        a, b = at(part.pins[0].net), at(part.pins[1].net)
        kind, value = part.kind, part.value
        if kind is PartKind.RESISTOR:
            if not value:
                value = 1e-3 if value == 0 else 1e12
            _conduct(add, a, b, 1 / value)
        elif kind is PartKind.VCCS:
            for net, weight in _weights(part):
                add(a, at(net), weight)
                add(b, at(net), -weight)
        elif kind is PartKind.CCCS and value is not None and part.control:
            branch = branches.get(part.control[0].lower())
            add(a, branch, value)
            add(b, branch, -value)
        elif kind in _BRANCHES:
            branch = branches[part.designator.lower()]
            add(a, branch, 1.0)
            add(b, branch, -1.0)
            add(branch, a, 1.0)
            add(branch, b, -1.0)
            if kind is PartKind.VCVS:
                for net, weight in _weights(part):
                    add(branch, at(net), -weight)
            elif kind is PartKind.CCVS and value is not None and part.control:
                add(branch, branches.get(part.control[0].lower()), -value)
    for index, (net, volts) in enumerate(drives.items()):
        branch = len(nets) + len(branches) + index
        add(at(net), branch, 1.0)
        add(branch, at(net), 1.0)
        right[branch] = volts
    solution = _eliminate(rows, right)
    return None if solution is None else solution[nets[wanted]]


def _control_nets(part: Part) -> tuple[str, ...]:
    return part.control if part.kind in (PartKind.VCVS, PartKind.VCCS) else ()


def _weights(part: Part) -> list[tuple[str, float]]:
    """Controlling nets with their gains, linear terms only."""
    pairs = [part.control[index : index + 2] for index in range(0, len(part.control) - 1, 2)]
    linear = (part.value,) if part.value is not None else ()
    gains: Sequence[float] = part.coefficients[1 : 1 + len(pairs)] if part.coefficients else linear
    weights = []
    for pair, gain in zip(pairs, gains, strict=False):
        weights += [(pair[0], gain), (pair[1], -gain)]
    return weights


def _conduct(
    add: Callable[[int | None, int | None, float], None], a: int | None, b: int | None, siemens: float
) -> None:
    add(a, a, siemens)
    add(b, b, siemens)
    add(a, b, -siemens)
    add(b, a, -siemens)


def _eliminate(rows: list[dict[int, float]], right: list[float]) -> list[float] | None:
    """Solve sparse equations by elimination with row pivoting; None when an unknown is not fixed."""
    size = len(rows)
    order: list[tuple[int, dict[int, float], float]] = []
    live = list(range(size))
    for column in range(size):
        best, largest = None, 0.0
        for index in live:
            value = abs(rows[index].get(column, 0.0))
            scale = max((abs(each) for each in rows[index].values()), default=0.0)
            if scale and value / scale > largest and value > 1e-18:
                best, largest = index, value / scale
        if best is None or largest < 1e-15:
            return None
        pivot, pivot_right = rows[best], right[best]
        live.remove(best)
        order.append((column, pivot, pivot_right))
        for index in live:
            entry = rows[index].get(column)
            if not entry:
                continue
            factor = entry / pivot[column]
            row = rows[index]
            for key, value in pivot.items():
                row[key] = row.get(key, 0.0) - factor * value
            row[column] = 0.0
            right[index] -= factor * pivot_right
    solution = [0.0] * size
    for column, pivot, pivot_right in reversed(order):
        total = pivot_right - sum(value * solution[key] for key, value in pivot.items() if key > column)
        solution[column] = total / pivot[column]
    return solution
