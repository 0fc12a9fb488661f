"""What each kind of part writes into the equations: one function a kind, in one registry.

A function returns None when the part is written, else why it cannot take part in the solve.

References
----------
C. Ho, A. Ruehli, P. Brennan, "The modified nodal approach to network analysis", IEEE Trans. Circuits and Systems,
CAS-22, 1975 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable

from ..circuit.parts import Part, PartKind
from .system import SHORT_S, System, add_branch, add_source

Stamp = Callable[[System, Part], str | None]

INDUCTOR_OHM = 1e-9  # keeps loops of inductors and sources solvable

# Amplifiers are written by the system; their supply pins and those of connectors and rail sources carry no current here.
_SILENT = frozenset((PartKind.AMPLIFIER, PartKind.CONNECTOR, PartKind.COUPLING, PartKind.REGULATOR))


def stamp_part(system: System, part: Part) -> str | None:
    """Write one part; return the reason when it cannot take part in the solve."""
    stamp = _STAMPS.get(part.kind)
    if stamp is not None:
        return stamp(system, part)
    return None if part.kind in _SILENT else f"{part.designator} is a {part.kind} that the solve has no model of"


def _ends(system: System, part: Part) -> tuple[int, int]:
    return system.index(part.pins[0].net), system.index(part.pins[1].net)


def _no_value(part: Part) -> str:
    return f"{part.designator} has no value"


def _resistor(system: System, part: Part) -> str | None:
    if part.value is None or len(part.pins) < 2:
        return _no_value(part)
    one, two = _ends(system, part)
    system.conductances.conductance(one, two, SHORT_S if abs(part.value) < 1 / SHORT_S else 1 / part.value)
    return None


def _capacitor(system: System, part: Part) -> str | None:
    if len(part.pins) < 2:
        return _no_value(part)
    one, two = _ends(system, part)
    system.capacitors[part.designator] = (one, two)
    if part.value is not None:
        system.storages.conductance(one, two, part.value)
    return None


def _inductor(system: System, part: Part) -> str | None:
    one, two = _ends(system, part)
    row = add_branch(system, part.designator)
    for net, sign in ((one, 1.0), (two, -1.0)):
        system.conductances.add(net, row, sign)
        system.conductances.add(row, net, sign)
    system.conductances.add(row, row, -INDUCTOR_OHM)
    system.storages.add(row, row, -(part.value or 0.0))
    return None


def _voltage_source(system: System, part: Part) -> str | None:
    one, two = _ends(system, part)
    if one == two:
        return None
    row = add_source(system, part.designator, one, two, part.value or 0.0)
    if two < 0:
        system.drivers.setdefault(part.pins[0].net, row)
    elif one < 0:
        system.drivers.setdefault(part.pins[1].net, row)
    else:
        for pin in part.pins[:2]:
            system.between.setdefault(pin.net, row)
    return None if part.value is not None else _no_value(part)


def _current_source(system: System, part: Part) -> str | None:
    one, two = _ends(system, part)
    value = part.value or 0.0
    if one >= 0:
        system.sources[one] -= value
    if two >= 0:
        system.sources[two] += value
    return None if part.value is not None else _no_value(part)


def _pairs(part: Part) -> list[tuple[str, str]]:
    return [(part.control[i], part.control[i + 1]) for i in range(0, len(part.control) - 1, 2)]


def _gains(part: Part, count: int) -> tuple[float, list[float]] | None:
    """Return constant and gains of a linear controlled source; None when it is not linear."""
    if part.expression is not None or count == 0:
        return None
    if part.value is not None:
        return 0.0, [part.value]
    rest = list(part.coefficients[1:])
    if not part.coefficients or any(rest[count:]):
        return None
    return part.coefficients[0], [*rest[:count], *[0.0] * (count - len(rest))]


def _not_linear(part: Part) -> str:
    return f"{part.designator} is a controlled source that is not linear"


def _vcvs(system: System, part: Part) -> str | None:
    pairs = _pairs(part)
    found = _gains(part, len(pairs))
    if found is None:
        return _not_linear(part)
    one, two = _ends(system, part)
    row = add_source(system, part.designator, one, two, found[0])
    for (plus, minus), gain in zip(pairs, found[1], strict=False):
        system.conductances.add(row, system.index(plus), -gain)
        system.conductances.add(row, system.index(minus), gain)
    if two < 0:
        system.drivers.setdefault(part.pins[0].net, row)
    return None


def _vccs(system: System, part: Part) -> str | None:
    pairs = _pairs(part)
    found = _gains(part, len(pairs))
    if found is None:
        return _not_linear(part)
    one, two = _ends(system, part)
    for net, sign in ((one, 1.0), (two, -1.0)):
        if net >= 0:
            system.sources[net] -= sign * found[0]
        for (plus, minus), gain in zip(pairs, found[1], strict=False):
            system.conductances.add(net, system.index(plus), sign * gain)
            system.conductances.add(net, system.index(minus), -sign * gain)
    return None


def _controlling_branches(system: System, part: Part) -> list[int] | None:
    folded = {name.casefold(): row for name, row in system.branch_index.items()}
    rows = [folded.get(each.casefold()) for each in part.control]
    found = [each for each in rows if each is not None]
    return found if found and len(found) == len(rows) else None


def _cccs(system: System, part: Part) -> str | None:
    branches = _controlling_branches(system, part)
    if branches is None:
        return f"{part.designator}: the source that controls it is not in the netlist"
    found = _gains(part, len(branches))
    if found is None:
        return _not_linear(part)
    one, two = _ends(system, part)
    for net, sign in ((one, 1.0), (two, -1.0)):
        if net >= 0:
            system.sources[net] -= sign * found[0]
        for branch, gain in zip(branches, found[1], strict=False):
            system.conductances.add(net, branch, sign * gain)
    return None


def _ccvs(system: System, part: Part) -> str | None:
    branches = _controlling_branches(system, part)
    if branches is None:
        return f"{part.designator}: the source that controls it is not in the netlist"
    found = _gains(part, len(branches))
    if found is None:
        return _not_linear(part)
    one, two = _ends(system, part)
    row = add_source(system, part.designator, one, two, found[0])
    for branch, gain in zip(branches, found[1], strict=False):
        system.conductances.add(row, branch, -gain)
    return None


def _nonlinear(system: System, part: Part) -> str | None:
    if len(part.pins) < (2 if part.kind is PartKind.DIODE else 3):
        return f"{part.designator} shows too few pins"
    system.nonlinear.append(part)
    return None


_STAMPS: dict[PartKind, Stamp] = {
    PartKind.RESISTOR: _resistor,
    PartKind.CAPACITOR: _capacitor,
    PartKind.INDUCTOR: _inductor,
    PartKind.VOLTAGE_SOURCE: _voltage_source,
    PartKind.CURRENT_SOURCE: _current_source,
    PartKind.VCVS: _vcvs,
    PartKind.VCCS: _vccs,
    PartKind.CCCS: _cccs,
    PartKind.CCVS: _ccvs,
    PartKind.DIODE: _nonlinear,
    PartKind.BJT: _nonlinear,
    PartKind.JFET: _nonlinear,
    PartKind.MOSFET: _nonlinear,
}
