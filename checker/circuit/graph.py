"""The circuit: parts and nets as the two sides of a graph, each pin an edge with its name.

``graph`` is a networkx MultiGraph whose nodes are ``("part", designator)`` and ``("net", name)``; edge keys are pin
names. The circuit never changes: :meth:`Circuit.with_changes` makes another one.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from functools import cached_property
from typing import TYPE_CHECKING

from ..errors import Problem
from .parts import Amplifier, Part, PartKind, Rail, Signal, Undetermined

if TYPE_CHECKING:
    import networkx

HUB_PINS = 16  # a net with more pins is a rail in all but name: nothing walks through it

LINK_OHM = 1e-3  # a resistor below this is a link


class Circuit:
    """Parts, nets, rails, signals and amplifiers of one netlist.

    Parameters
    ----------
    parts
        All parts by designator, in the order of the netlist.
    annotate
        Finds rails, signals, amplifiers and problems of a bare circuit; kept so that a changed circuit can be
        annotated again.
    """

    def __init__(
        self,
        *,
        title: str,
        path: str,
        parts: Mapping[str, Part],
        ground: str | None,
        annotate: Callable[[Circuit], None],
    ) -> None:
        self.title = title
        self.path = path
        self.parts: Mapping[str, Part] = dict(parts)
        self.ground = ground
        self.rails: Mapping[str, Rail] = {}
        self.signals: Mapping[str, Signal] = {}
        self.amplifiers: tuple[Amplifier, ...] = ()
        self.undetermined: tuple[Undetermined, ...] = ()
        self.problems: tuple[Problem, ...] = ()
        self.assumptions: tuple[str, ...] = ()
        self._annotate = annotate
        self._pins: dict[str, list[tuple[str, str]]] = {}
        self._held: set[str] = set()
        for designator, part in self.parts.items():
            if not part.is_fitted:
                continue
            for pin in part.pins:
                self._pins.setdefault(pin.net, []).append((designator, pin.name))
        if ground is not None:
            self._pins.setdefault(ground, [])
        annotate(self)
        self._held = self._find_held()

    # nets and parts --------------------------------------------------------------------------------------------------

    @property
    def nets(self) -> tuple[str, ...]:
        """All nets, in the order of their first pin."""
        return tuple(self._pins)

    def pins_on(self, net: str) -> tuple[tuple[str, str], ...]:
        """Return (designator, pin name) of each pin on a net."""
        return tuple(self._pins.get(net, ()))

    def parts_on(self, net: str) -> tuple[Part, ...]:
        """Return the parts on a net, each once."""
        return tuple(
            self.parts[each] for each in dict.fromkeys(designator for designator, _ in self._pins.get(net, ()))
        )

    def degree(self, net: str) -> int:
        """Return the number of pins on a net."""
        return len(self._pins.get(net, ()))

    def part(self, designator: str) -> Part | None:
        """Return a part by its designator in any letter case."""
        found = self.parts.get(designator)
        return found if found is not None else self._folded_parts.get(designator.casefold())

    def net(self, name: str) -> str | None:
        """Return the spelling that stands for a net name in any letter case; ground answers to 0 and GND."""
        if name in self._pins:
            return name
        if name.casefold() in {"0", "gnd"}:
            return self.ground
        return self._folded_nets.get(name.casefold())

    @cached_property
    def _folded_parts(self) -> dict[str, Part]:
        return {designator.casefold(): part for designator, part in self.parts.items()}

    @cached_property
    def _folded_nets(self) -> dict[str, str]:
        return {net.casefold(): net for net in self._pins}

    # questions about nets --------------------------------------------------------------------------------------------

    def is_ground(self, net: str | None) -> bool:
        """True for the ground net."""
        return net is not None and net == self.ground

    def is_rail(self, net: str | None) -> bool:
        """True for a rail (ground is none)."""
        return net in self.rails

    def is_held(self, net: str) -> bool:
        """True when an ideal voltage source holds the net against ground, through other held nets if need be."""
        return net in self._held

    def is_stiff(self, net: str | None) -> bool:
        """True for ground, rails and nets held by a source: nothing that hangs on them moves them."""
        return net is not None and (net == self.ground or net in self.rails or net in self._held)

    def is_hub(self, net: str) -> bool:
        """True for nets with so many pins that nothing should walk through them."""
        return len(self._pins.get(net, ())) > HUB_PINS

    def amplifiers_at(self, net: str) -> tuple[Amplifier, ...]:
        """Return the amplifiers whose output is the net."""
        return tuple(self._outputs.get(net, ()))

    def amplifier(self, name: str) -> Amplifier | None:
        """Return an amplifier by name in any letter case."""
        wanted = name.casefold()
        return next((each for each in self.amplifiers if each.name.casefold() == wanted), None)

    @cached_property
    def _outputs(self) -> dict[str, list[Amplifier]]:
        found: dict[str, list[Amplifier]] = {}
        for amplifier in self.amplifiers:
            found.setdefault(amplifier.output, []).append(amplifier)
        return found

    def _find_held(self) -> set[str]:
        held: set[str] = set()
        if self.ground is None:
            return held
        waiting = [self.ground]
        seen = {self.ground}
        while waiting:
            net = waiting.pop()
            for designator, _ in self._pins.get(net, ()):
                part = self.parts[designator]
                if part.kind is not PartKind.VOLTAGE_SOURCE or len(part.pins) != 2:
                    continue
                other = part.pins[1].net if part.pins[0].net == net else part.pins[0].net
                if other not in seen:
                    seen.add(other)
                    held.add(other)
                    waiting.append(other)
        return held

    # graph and changes -----------------------------------------------------------------------------------------------

    @cached_property
    def graph(self) -> networkx.MultiGraph:
        """The two-sided graph of parts and nets."""
        import networkx

        graph = networkx.MultiGraph()
        graph.add_nodes_from(("net", net) for net in self._pins)
        graph.add_nodes_from(("part", designator) for designator in self.parts)
        graph.add_edges_from(
            (("part", designator), ("net", net), pin) for net, pins in self._pins.items() for designator, pin in pins
        )
        return graph

    def with_changes(
        self, *, replace: Iterable[Part] = (), add: Iterable[Part] = (), remove: Iterable[str] = ()
    ) -> Circuit:
        """Return a circuit with parts replaced, added or removed; rails and amplifiers are found again."""
        gone = set(remove)
        changed = {part.designator: part for part in replace}
        parts = {name: changed.get(name, part) for name, part in self.parts.items() if name not in gone}
        for part in add:
            parts[part.designator] = part
        return Circuit(title=self.title, path=self.path, parts=parts, ground=self.ground, annotate=self._annotate)
