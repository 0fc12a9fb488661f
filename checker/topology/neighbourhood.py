"""The surroundings of an amplifier as branches: what its pins see, walked out to the first net that decides.

Starting from the amplifier's own nets, two-terminal parts are followed through inner nets. A walk ends at a net that
decides what hangs on it: ground, a rail, a net held by a source, a signal's net, an output, another amplifier's input,
a transistor's terminal, a connector, a hub. Inner nets are those that only two-terminal parts meet. The cost is
bounded by the number of parts that stand between the amplifier and those ends, whatever the size of the circuit.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

from ..circuit.graph import LINK_OHM, Circuit
from ..circuit.parts import Amplifier, Part, PartKind
from .references import is_bypassed_divider

REACH = 5  # steps from the amplifier's own nets: two behind the deepest template net

TWO_TERMINAL = {
    PartKind.RESISTOR: "R",
    PartKind.CAPACITOR: "C",
    PartKind.INDUCTOR: "L",
    PartKind.DIODE: "D",
    PartKind.CURRENT_SOURCE: "I",
    PartKind.VOLTAGE_SOURCE: "V",
}


@dataclass(frozen=True, slots=True)
class Leaf:
    """One part of a branch, as the templates see it: its letter, designator and value."""

    letter: str
    part: Part

    @property
    def value(self) -> float | None:
        """Value of the part."""
        return self.part.value


@dataclass(slots=True)
class Edge:
    """A reduced branch between two nets: ``form`` is leaf, series, parallel or mesh; ``ohm`` its DC resistance."""

    one: str
    two: str
    form: str
    leaves: tuple[Leaf, ...]
    pieces: tuple[Edge, ...] = ()
    ohm: float | None = None
    mesh_parts: tuple[str, ...] = ()

    @property
    def letters(self) -> frozenset[str]:
        """Letters of the parts of the branch."""
        return frozenset(leaf.letter for leaf in self.leaves)

    @property
    def designators(self) -> tuple[str, ...]:
        """Designators of the parts of the branch."""
        return tuple(dict.fromkeys([*(leaf.part.designator for leaf in self.leaves), *self.mesh_parts]))

    @property
    def key(self) -> tuple[frozenset[str], frozenset[str]]:
        """What makes the branch the same in the surroundings of two amplifiers: its ends and its parts."""
        return frozenset((self.one, self.two)), frozenset(self.designators)

    def other(self, net: str) -> str:
        """Return the far end seen from ``net``."""
        return self.two if self.one == net else self.one


@dataclass(slots=True)
class Neighbourhood:
    """Branches around an amplifier; ``inner`` are the nets that may still be reduced away."""

    plus: str
    minus: str
    output: str
    edges: list[Edge] = field(default_factory=list)
    inner: set[str] = field(default_factory=set)
    links: dict[str, str] = field(default_factory=dict)

    @property
    def own(self) -> frozenset[str]:
        """The amplifier's own nets."""
        return frozenset((self.plus, self.minus, self.output))

    def at(self, net: str) -> list[Edge]:
        """Return the branches that end on a net."""
        return [edge for edge in self.edges if net in {edge.one, edge.two}]


def stops_walk(circuit: Circuit, net: str) -> bool:
    """True for nets whose voltage something else decides: nothing behind them matters to the amplifier."""
    return (
        circuit.is_stiff(net)
        or circuit.is_hub(net)
        or net in circuit.signals
        or bool(circuit.amplifiers_at(net))
        or is_bypassed_divider(circuit, net)
    )


def is_inner(circuit: Circuit, net: str) -> bool:
    """True for nets that only two-terminal parts meet: they can be reduced away."""
    if stops_walk(circuit, net):
        return False
    return all(circuit.parts[designator].kind in TWO_TERMINAL for designator, _ in circuit.pins_on(net))


def survey(circuit: Circuit, amplifiers: Iterable[Amplifier], *, reach: int = REACH) -> Neighbourhood:
    """Collect the branches around one amplifier (or several that make one stage; the first gives the own nets)."""
    listed = tuple(amplifiers)
    first = listed[0]
    place = Neighbourhood(first.plus, first.minus, first.output)
    starts = [net for each in listed for net in (each.plus, each.minus, each.output)]
    seen_parts: set[str] = set()
    depth = {net: 0 for net in dict.fromkeys(starts)}
    waiting = list(depth)
    position = 0
    while position < len(waiting):
        net = waiting[position]
        position += 1
        if depth[net] > 0 and stops_walk(circuit, net):
            continue
        if depth[net] == 0 and (circuit.is_stiff(net) or circuit.is_hub(net)):
            continue
        for designator, _ in circuit.pins_on(net):
            part = circuit.parts[designator]
            letter = TWO_TERMINAL.get(part.kind)
            if letter is None or designator in seen_parts or len(part.pins) != 2 or not part.is_fitted:
                continue
            seen_parts.add(designator)
            one, two = part.pins[0].net, part.pins[1].net
            if one == two:
                continue
            place.edges.append(Edge(one, two, "leaf", (Leaf(letter, part),), ohm=_leaf_ohm(part)))
            other = two if one == net else one
            if other not in depth and depth[net] < reach:
                depth[other] = depth[net] + 1
                waiting.append(other)
    place.inner = {net for net in depth if 0 < depth[net] < reach and is_inner(circuit, net)}
    return place


def _leaf_ohm(part: Part) -> float | None:
    if part.kind is PartKind.RESISTOR:
        if part.value is None:
            return None
        return max(part.value, 0.0) if abs(part.value) > LINK_OHM else 0.0
    if part.kind is PartKind.INDUCTOR:
        return 0.0
    if part.kind in {PartKind.CAPACITOR, PartKind.CURRENT_SOURCE}:
        return float("inf")
    return None
