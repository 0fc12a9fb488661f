"""The region of a stage: its amplifiers with all that hangs on their pins, up to nets that something else holds.

Rails, ground, sources and the outputs of other amplifiers end a region, unless those amplifiers stand in one loop with
it; then the loop is one region. Figures of a stage are computed on its region, so that their cost does not grow with
the board.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..circuit.graph import Circuit
from ..circuit.parts import Amplifier, Part, PartKind
from ..topology.loops import without_ends
from .subjects import CURRENT_INPUT
from .system import System, build_system

if TYPE_CHECKING:
    from .bench import Bench

_PASSIVE_ENDS = frozenset((PartKind.AMPLIFIER, PartKind.CONNECTOR, PartKind.REGULATOR, PartKind.OPAQUE))


@dataclass(slots=True)
class Region:
    """A piece of a circuit that is solved by itself; answers the questions of :func:`build_system`.

    ``edges`` are the nets where it ends, held still while the region is solved.
    """

    whole: Circuit
    nets: tuple[str, ...]
    parts: Mapping[str, Part]
    amplifiers: tuple[Amplifier, ...]
    edges: tuple[str, ...]

    @property
    def ground(self) -> str | None:
        """The net at 0 V."""
        return self.whole.ground

    def net(self, name: str) -> str | None:
        """Return the circuit's spelling of a net."""
        return self.whole.net(name)

    def parts_on(self, net: str) -> tuple[Part, ...]:
        """Return the parts with a pin on a net."""
        return self.whole.parts_on(net)


def regions_of(bench: Bench) -> dict[str, Region]:
    """Return the region of every amplifier, by name; amplifiers in one loop share one."""
    circuit = bench.circuit
    ends = driven_from_outside(bench)
    reaches = {each.name: _reach(circuit, (each,), ends=ends) for each in circuit.amplifiers}
    loops = _loops(circuit, ends)
    found: dict[str, Region] = {}
    for amplifier in circuit.amplifiers:
        if amplifier.name in found:
            continue
        members = loops.get(amplifier.name, (amplifier,))
        reach = reaches[amplifier.name] if len(members) == 1 else _reach(circuit, members, ends=ends)
        region = _region(circuit, members, *reach)
        for each in members:
            found[each.name] = region
    return found


_Reach = tuple[dict[str, None], dict[str, None], dict[str, None]]


def driven_from_outside(bench: Bench) -> frozenset[str]:
    """Return the nets by which a signal comes from what the netlist does not draw: they count as held by it."""
    circuit = bench.circuit
    floating = set(bench.system.floating)
    found = {net for net, signal in circuit.signals.items() if not signal.is_current and signal.other is None}
    for stage in bench.stages:
        if stage.topology not in CURRENT_INPUT:
            found.update(net for net in stage.inputs if net in floating)
    return frozenset(found)


def _reach(
    circuit: Circuit, amplifiers: Iterable[Amplifier], nets: Iterable[str] = (), ends: frozenset[str] = frozenset()
) -> _Reach:
    """Walk from the pins of amplifiers and further nets; return inner nets, parts and the nets where the walk ended."""
    members = tuple(amplifiers)
    own_outputs = {each.output for each in members}
    inner: dict[str, None] = {}
    parts: dict[str, None] = {}
    edges: dict[str, None] = {}
    waiting = [*(net for each in members for net in _pins(each)), *nets]
    while waiting:
        net = waiting.pop()
        if net in inner or net in edges:
            continue
        if circuit.is_stiff(net) or net in ends or (net not in own_outputs and circuit.amplifiers_at(net)):
            edges[net] = None
            continue
        inner[net] = None
        for designator, _ in circuit.pins_on(net):
            part = circuit.parts[designator]
            if designator in parts or part.kind in _PASSIVE_ENDS:
                continue
            parts[designator] = None
            waiting.extend(part.nets)
            if part.kind in (PartKind.VCVS, PartKind.VCCS, PartKind.BEHAVIOURAL):
                waiting.extend(part.control)
    return inner, parts, edges


def _pins(amplifier: Amplifier) -> Iterator[str]:
    yield from (amplifier.plus, amplifier.minus, amplifier.output)
    for role, net in amplifier.others:
        if role in {"REF", "RG", "RG2"}:
            yield net


def _drivers(circuit: Circuit, amplifier: Amplifier, ends: frozenset[str]) -> list[str]:
    """Return the amplifiers whose outputs reach the inputs of one over passive parts; its own output holds itself."""
    seen: set[str] = set()
    found: list[str] = []
    waiting = [net for net in _pins(amplifier) if net != amplifier.output]
    if amplifier.output in (amplifier.plus, amplifier.minus):
        seen.add(amplifier.output)
    while waiting:
        net = waiting.pop()
        if net in seen:
            continue
        seen.add(net)
        drivers = circuit.amplifiers_at(net)
        if drivers:
            found.extend(each.name for each in drivers if each is not amplifier)
            continue
        if circuit.is_stiff(net) or net in ends:
            continue
        for designator, _ in circuit.pins_on(net):
            part = circuit.parts[designator]
            if part.kind not in _PASSIVE_ENDS:
                waiting.extend(part.nets)
                if part.kind in (PartKind.VCVS, PartKind.VCCS, PartKind.BEHAVIOURAL):
                    waiting.extend(part.control)
    return found


def _loops(circuit: Circuit, ends: frozenset[str]) -> dict[str, tuple[Amplifier, ...]]:
    """Return the amplifiers that stand in one loop with each other, by name."""
    if len(circuit.amplifiers) < 2:
        return {}
    drivers = {each.name: set(_drivers(circuit, each, ends)) for each in circuit.amplifiers}
    looped = without_ends(drivers)
    if not looped:
        return {}
    import networkx

    graph = networkx.DiGraph()
    graph.add_nodes_from(looped)
    graph.add_edges_from((driver, name) for name in looped for driver in drivers[name] if driver in looped)
    known = {each.name: each for each in circuit.amplifiers}
    order = {name: index for index, name in enumerate(known)}
    found = {}
    for group in networkx.strongly_connected_components(graph):
        if len(group) > 1:
            members = tuple(known[name] for name in sorted(group, key=order.__getitem__))
            found.update(dict.fromkeys(group, members))
    return found


def _region(
    circuit: Circuit,
    members: tuple[Amplifier, ...],
    inner: dict[str, None],
    parts: dict[str, None],
    edges: dict[str, None],
) -> Region:
    kept = {}
    ends = dict(edges)
    nets = dict(inner)
    for designator in parts:
        part = circuit.parts[designator]
        if part.kind is PartKind.VOLTAGE_SOURCE and all(net not in inner for net in part.nets):
            continue
        kept[designator] = part
        for net in (*part.nets, *part.control):
            if net not in inner and circuit.net(net) == net:
                ends[net] = None
    for each in members:
        for net in _pins(each):
            if net not in nets:
                ends[net] = None
    held = tuple(net for net in ends if net != circuit.ground and net not in nets)
    return Region(circuit, tuple({**nets, **dict.fromkeys(held)}), kept, members, held)


def region_around(bench: Bench, members: Iterable[Amplifier], nets: Iterable[str] = ()) -> Region:
    """Return the region of a stage whose amplifiers stand in no common loop, or that has none (then from its nets)."""
    listed = tuple(members)
    return _region(bench.circuit, listed, *_reach(bench.circuit, listed, nets, driven_from_outside(bench)))


def region_system(bench: Bench, region: Region) -> System:
    """Write the equations of a region; the nets where it ends are held at 0 V, as small signals see them."""
    return build_system(region, bench.limits, dict.fromkeys(region.edges, 0.0))
