"""The circuit: parts and nets as the two sides of one graph, each pin an edge, with the questions that rooms ask.

Nets and designators are compared without regard to letter case; the first spelling stands for all. The networkx graph
is built on first use; neighbourhood questions are answered from the same adjacency and cost no more than the degree of
the net. What recognition finds (rails, amplifiers, signals) is computed once per circuit.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from ..errors import Problem
from .clues import Clue
from .parts import Amplifier, Part, PartKind, Rail, Signal, Undetermined

if TYPE_CHECKING:
    import networkx

    from ..text import Intent
    from .catalogue import Catalogue

HUB_PINS = 16
"""A net with more pins is a rail in all but name: nothing walks through it."""

LINK_OHM = 1e-3
"""A resistor below this is a link."""


@dataclass(frozen=True, slots=True)
class Findings:
    """What recognition found in a circuit."""

    grounds: frozenset[str]
    rails: Mapping[str, Rail]
    held: Mapping[str, float | None]
    amplifiers: tuple[Amplifier, ...]
    undetermined: tuple[Undetermined, ...]
    signals: Mapping[str, Signal]
    problems: tuple[Problem, ...] = ()
    assumptions: tuple[str, ...] = ()


class Circuit:
    """A flat circuit; read-only. Changed copies come from :meth:`with_changes`."""

    def __init__(
        self,
        *,
        title: str,
        path: str,
        parts: Mapping[str, Part],
        clues: Mapping[str, Clue],
        ground: str | None,
        catalogue: Catalogue,
        intent: Intent | None = None,
        style: str = "simulation",
        problems: tuple[Problem, ...] = (),
        assumptions: tuple[str, ...] = (),
        reasons: Mapping[str, str] | None = None,
    ) -> None:
        self.title = title
        self.path = path
        self.style = style
        self.parts: Mapping[str, Part] = MappingProxyType(dict(parts))
        self.catalogue = catalogue
        self.intent = intent
        self.clues = clues
        self.reasons: Mapping[str, str] = reasons or {}
        self._ground = ground
        self._problems = problems
        self._assumptions = assumptions
        self._pins: dict[str, list[tuple[str, str]]] = {}
        for part in self.parts.values():
            if not part.is_fitted:
                continue
            for pin in part.pins:
                held = self._pins.get(pin.net)
                if held is None:
                    self._pins[pin.net] = [(part.designator, pin.name)]
                else:
                    held.append((part.designator, pin.name))
        if ground is not None:
            self._pins.setdefault(ground, [])
        self._folded_nets: dict[str, str] | None = None
        self._folded_parts: dict[str, str] | None = None
        self._graph: Any = None
        self._findings: Findings | None = None
        self._outputs: dict[str, tuple[Amplifier, ...]] | None = None
        self._by_name: dict[str, Amplifier] | None = None

    # structure

    @property
    def graph(self) -> networkx.MultiGraph:
        """The two-sided graph: nodes ``("part", designator)`` and ``("net", name)``, one edge per pin, key = pin name."""
        if self._graph is None:
            import networkx

            graph = networkx.MultiGraph()
            graph.add_nodes_from(("part", each) for each in self.parts)
            graph.add_nodes_from(("net", each) for each in self._pins)
            graph.add_edges_from(
                (("part", part.designator), ("net", pin.net), pin.name, {})
                for part in self.parts.values()
                if part.is_fitted
                for pin in part.pins
            )
            self._graph = networkx.freeze(graph)
        return self._graph

    @property
    def nets(self) -> tuple[str, ...]:
        """All nets, in order of first mention."""
        return tuple(self._pins)

    def pins_on(self, net: str) -> tuple[tuple[str, str], ...]:
        """Return the pins on a net as (designator, pin name), in netlist order."""
        found = self._pins.get(net)
        if found is None:
            other = self.net(net)
            found = self._pins.get(other, []) if other is not None else []
        return tuple(found)

    def parts_on(self, net: str) -> tuple[Part, ...]:
        """Return the parts with a pin on a net, each once, in netlist order."""
        return tuple(self.parts[each] for each in dict.fromkeys(name for name, _ in self.pins_on(net)))

    def degree(self, net: str) -> int:
        """Return the number of pins on a net."""
        found = self._pins.get(net)
        return len(found) if found is not None else len(self.pins_on(net))

    def part(self, designator: str) -> Part | None:
        """Return the part of a designator in any spelling."""
        found = self.parts.get(designator)
        if found is None:
            if self._folded_parts is None:
                self._folded_parts = {each.lower(): each for each in self.parts}
            known = self._folded_parts.get(designator.lower())
            found = self.parts[known] if known is not None else None
        return found

    def net(self, name: str) -> str | None:
        """Return the circuit's spelling of a net name; None when there is no such net."""
        if name in self._pins:
            return name
        if self._folded_nets is None:
            self._folded_nets = {each.lower(): each for each in self._pins}
        key = name.lower()
        if key in {"0", "gnd"}:
            return self._ground
        return self._folded_nets.get(key)

    # what recognition found

    def _found(self) -> Findings:
        if self._findings is None:
            from .recognize import recognize

            self._findings = recognize(self)
        return self._findings

    @property
    def ground(self) -> str | None:
        """The net at 0 V by definition; None when the netlist has none."""
        return self._ground

    @property
    def grounds(self) -> frozenset[str]:
        """All nets taken as ground: the ground net and separate ones such as AGND."""
        return self._found().grounds

    @property
    def rails(self) -> Mapping[str, Rail]:
        """Rails by net; ground is none of them."""
        return self._found().rails

    @property
    def held(self) -> Mapping[str, float | None]:
        """Nets that ideal voltage sources hold against ground, with their DC voltage where it is known (V)."""
        return self._found().held

    @property
    def amplifiers(self) -> tuple[Amplifier, ...]:
        """All amplifier channels, in netlist order."""
        return self._found().amplifiers

    @property
    def undetermined(self) -> tuple[Undetermined, ...]:
        """Parts that may be amplifiers but whose pin roles are not known."""
        return self._found().undetermined

    @property
    def signals(self) -> Mapping[str, Signal]:
        """Signals by the net that they enter on."""
        return self._found().signals

    @property
    def problems(self) -> tuple[Problem, ...]:
        """What is wrong with the netlist as a circuit; reading went on after each."""
        return (*self._problems, *self._found().problems)

    @property
    def assumptions(self) -> tuple[str, ...]:
        """What had to be assumed, one sentence each."""
        return (*self._assumptions, *self._found().assumptions)

    def amplifiers_at(self, net: str) -> tuple[Amplifier, ...]:
        """Return the amplifiers whose output is this net."""
        if self._outputs is None:
            outputs: dict[str, tuple[Amplifier, ...]] = {}
            for each in self.amplifiers:
                outputs[each.output] = (*outputs.get(each.output, ()), each)
            self._outputs = outputs
        return self._outputs.get(net, ())

    amplifier_at = amplifiers_at

    def amplifier(self, name: str) -> Amplifier | None:
        """Return an amplifier by name in any letter case."""
        if self._by_name is None:
            self._by_name = {each.name.lower(): each for each in self.amplifiers}
        return self._by_name.get(name.lower())

    def is_ground(self, net: str | None) -> bool:
        """True for ground and for separate grounds such as AGND."""
        return net is not None and (net == self._ground or net in self.grounds)

    def is_rail(self, net: str | None) -> bool:
        """True for a rail; ground is none."""
        return net is not None and net in self.rails

    def is_held(self, net: str) -> bool:
        """True when ideal voltage sources hold the net against ground."""
        return net in self._found().held

    def is_stiff(self, net: str | None) -> bool:
        """True for ground, rails and nets held by ideal sources: nothing that hangs on them moves them."""
        if net is None:
            return False
        found = self._found()
        return net == self._ground or net in found.grounds or net in found.rails or net in found.held

    def is_hub(self, net: str) -> bool:
        """True for nets with so many pins that no search walks through them."""
        return self.degree(net) > HUB_PINS

    # changed copies

    def with_changes(
        self, replace: Iterable[Part] = (), add: Iterable[Part] = (), remove: Iterable[str] = ()
    ) -> Circuit:
        """Return a circuit with parts replaced (by designator), added or removed; this one stays as it is.

        A change of values alone keeps what recognition found; any other makes it look again.

        Raises
        ------
        KeyError
            When a part to replace or remove is not there, or one to add is.
        """
        parts = dict(self.parts)
        values_only = True
        for each in replace:
            old = parts[each.designator]
            parts[each.designator] = each
            values_only = values_only and old.pins == each.pins and old.kind is each.kind and _is_plain(old, each)
        for name in remove:
            del parts[self._known(name)]
            values_only = False
        for each in add:
            if self.part(each.designator) is not None and each.designator in parts:
                raise KeyError(each.designator)
            parts[each.designator] = each
            values_only = False
        changed = Circuit(
            title=self.title,
            path=self.path,
            parts=parts,
            clues={name: clue for name, clue in self.clues.items() if name in parts},
            ground=self._ground,
            catalogue=self.catalogue,
            intent=self.intent,
            style=self.style,
            problems=self._problems,
            assumptions=self._assumptions,
            reasons=self.reasons,
        )
        if values_only:
            changed._findings = self._findings
        return changed

    def _known(self, name: str) -> str:
        found = self.part(name)
        if found is None:
            raise KeyError(name)
        return found.designator


def _is_plain(old: Part, new: Part) -> bool:
    """True for a changed value that moves no rail: capacitors, and resistors that stay above or below 100 Ω."""
    if old.kind in (PartKind.CAPACITOR, PartKind.INDUCTOR):
        return True
    if old.kind is not PartKind.RESISTOR or old.value is None or new.value is None:
        return False
    return (old.value > 100) == (new.value > 100)
