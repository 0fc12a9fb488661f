"""Nets whose voltage the netlist does not settle, and why: what cannot be solved, and all that it moves.

A doubt starts where something without a model, without a value or without a DC path meets a net, and spreads through
parts that pass DC and from the inputs of an amplifier to its output. It stops at rails, sources and amplifier outputs.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from ..circuit.parts import Amplifier, PartKind

if TYPE_CHECKING:
    from .bench import Bench

_BLOCKS = frozenset((PartKind.CAPACITOR, PartKind.AMPLIFIER, PartKind.CONNECTOR, PartKind.COUPLING, PartKind.REGULATOR))
_CONTROLLED = frozenset((PartKind.VCVS, PartKind.VCCS, PartKind.BEHAVIOURAL))


def find_doubts(bench: Bench) -> dict[str, str]:
    """Return the reason by net, for every net that is in doubt at DC."""
    return spread_doubts(bench, dict(_origins(bench)))


def _origins(bench: Bench) -> Iterable[tuple[str, str]]:
    circuit, system = bench.circuit, bench.system
    for net in system.floating:
        yield net, f"net {net} has no DC path in the netlist: declare its signal or rail"
    for name, reason in system.left_out.items():
        part = circuit.part(name)
        for net in part.nets if part is not None else ():
            if not circuit.is_stiff(net) and net not in system.drivers:
                yield net, reason
    for amplifier in circuit.amplifiers:
        if amplifier.name in bench.switching and bench.limits[amplifier.name] is None:
            yield amplifier.output, f"the levels of {amplifier.name} are not known: its rails are not"
    for row in system.amplifiers:
        if row.is_packaged and row.fixed_gain is None:
            yield row.amplifier.output, f"the gain of {row.amplifier.name} is not known"
    for net, signal in circuit.signals.items():
        if signal.is_current and signal.source is None:
            yield net, f"the mean current into {net} is not drawn"
    for each in circuit.undetermined:
        part = circuit.part(each.designator)
        for net in part.nets if part is not None else ():
            if not circuit.is_stiff(net):
                yield net, f"the pins of {each.designator} are not known"


def spread_doubts(bench: Bench, origins: dict[str, str], *, held: Iterable[str] = ()) -> dict[str, str]:
    """Return all nets that the doubtful ones move; ``held`` nets stop the spread."""
    circuit = bench.circuit
    stopped = set(held)
    by_input: dict[str, list[Amplifier]] = {}
    for each in circuit.amplifiers:
        for net in (each.plus, each.minus, *(net for role, net in each.others if role == "REF")):
            by_input.setdefault(net, []).append(each)
    controlled = _controlled_nets(bench)
    found: dict[str, str] = {}
    waiting = [(net, reason) for net, reason in origins.items() if net not in stopped]
    while waiting:
        net, reason = waiting.pop()
        if net in found:
            continue
        found[net] = reason
        for amplifier in by_input.get(net, ()):
            if amplifier.output not in found and amplifier.output not in stopped:
                waiting.append((amplifier.output, reason))
        for designator, _ in circuit.pins_on(net):
            part = circuit.parts[designator]
            if part.kind in _BLOCKS or len(part.pins) < 2:
                continue
            for other in part.nets:
                if other in found or other in stopped or circuit.is_stiff(other) or other in bench.system.drivers:
                    continue
                waiting.append((other, reason))
        for moved in controlled.get(net, ()):
            if moved not in found and moved not in stopped and not circuit.is_ground(moved):
                waiting.append((moved, reason))
    return found


def _controlled_nets(bench: Bench) -> dict[str, list[str]]:
    """Return the nets that controlled sources move, by the net that controls them."""
    bare = {each.designator for each in bench.circuit.amplifiers}
    found: dict[str, list[str]] = {}
    for part in bench.circuit.parts.values():
        if part.kind in _CONTROLLED and part.designator not in bare:
            for net in part.control:
                found.setdefault(net, []).extend(part.nets)
    return found
