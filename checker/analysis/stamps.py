"""What each kind of part writes into the equations: one function a kind, in one registry.

References
----------
C. Ho, A. Ruehli, P. Brennan, "The modified nodal approach to network analysis", IEEE Trans. Circuits and Systems,
CAS-22, 1975 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable

from ..circuit.parts import Part, PartKind
from .system import SHORT_S, System, add_branch, add_source

Stamp = Callable[[System, Part], bool]


def stamp_part(system: System, part: Part) -> bool:
    """Write one part; False when it cannot take part in the solve (no value, a kind without a model)."""
    stamp = _STAMPS.get(part.kind)
    return stamp(system, part) if stamp is not None else part.kind in _SILENT


def _ends(system: System, part: Part) -> tuple[int, int]:
    return system.index(part.pins[0].net), system.index(part.pins[1].net)


def _resistor(system: System, part: Part) -> bool:
    if part.value is None or len(part.pins) < 2:
        return False
    one, two = _ends(system, part)
    system.conductances.conductance(one, two, SHORT_S if abs(part.value) < 1 / SHORT_S else 1 / part.value)
    return True


def _capacitor(system: System, part: Part) -> bool:
    if len(part.pins) < 2:
        return False
    one, two = _ends(system, part)
    system.capacitors[part.designator] = (one, two)
    if part.value is None:
        return False
    system.storages.conductance(one, two, part.value)
    return True


def _inductor(system: System, part: Part) -> bool:
    one, two = _ends(system, part)
    row = add_branch(system, part.designator)
    for net, sign in ((one, 1.0), (two, -1.0)):
        system.conductances.add(net, row, sign)
        system.conductances.add(row, net, sign)
    system.conductances.add(row, row, -1e-9)
    system.storages.add(row, row, -(part.value or 0.0))
    return True


def _voltage_source(system: System, part: Part) -> bool:
    one, two = _ends(system, part)
    row = add_source(system, part.designator, one, two, part.value or 0.0)
    if two < 0:
        system.drivers.setdefault(part.pins[0].net, row)
    elif one < 0:
        system.drivers.setdefault(part.pins[1].net, row)
    return part.value is not None


def _current_source(system: System, part: Part) -> bool:
    one, two = _ends(system, part)
    value = part.value or 0.0
    if one >= 0:
        system.sources[one] -= value
    if two >= 0:
        system.sources[two] += value
    return part.value is not None


def _control_nets(part: Part) -> tuple[str, str] | None:
    return (part.control[0], part.control[1]) if len(part.control) >= 2 else None


def _vcvs(system: System, part: Part) -> bool:
    pairs = [(part.control[i], part.control[i + 1]) for i in range(0, len(part.control) - 1, 2)]
    gains = [part.value] if part.value is not None else list(part.coefficients[1:])
    if not pairs or len(gains) < len(pairs):
        return False
    one, two = _ends(system, part)
    constant = part.coefficients[0] if part.value is None and part.coefficients else 0.0
    row = add_source(system, part.designator, one, two, constant)
    for (plus, minus), gain in zip(pairs, gains, strict=False):
        if gain is None:
            return False
        system.conductances.add(row, system.index(plus), -gain)
        system.conductances.add(row, system.index(minus), gain)
    if two < 0:
        system.drivers.setdefault(part.pins[0].net, row)
    return True


def _vccs(system: System, part: Part) -> bool:
    control = _control_nets(part)
    if control is None or part.value is None:
        return False
    one, two = _ends(system, part)
    plus, minus = (system.index(net) for net in control)
    for net, sign in ((one, 1.0), (two, -1.0)):
        system.conductances.add(net, plus, sign * part.value)
        system.conductances.add(net, minus, -sign * part.value)
    return True


def _controlling_branch(system: System, part: Part) -> int | None:
    if not part.control:
        return None
    wanted = part.control[0].casefold()
    for name, row in system.branch_index.items():
        if name.casefold() == wanted:
            return row
    return None


def _cccs(system: System, part: Part) -> bool:
    branch = _controlling_branch(system, part)
    if branch is None or part.value is None:
        return False
    one, two = _ends(system, part)
    system.conductances.add(one, branch, part.value)
    system.conductances.add(two, branch, -part.value)
    return True


def _ccvs(system: System, part: Part) -> bool:
    branch = _controlling_branch(system, part)
    if branch is None or part.value is None:
        return False
    one, two = _ends(system, part)
    row = add_source(system, part.designator, one, two, 0.0)
    system.conductances.add(row, branch, -part.value)
    return True


def _nonlinear(system: System, part: Part) -> bool:
    if len(part.pins) < (2 if part.kind is PartKind.DIODE else 3):
        return False
    system.nonlinear.append(part)
    return True


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

# Amplifiers are written by the system itself; connectors carry no current.
_SILENT = {PartKind.AMPLIFIER, PartKind.CONNECTOR, PartKind.COUPLING}
