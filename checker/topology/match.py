"""The matcher: one template against the surroundings of one amplifier.

Nets of the template are bound one by one, starting from the amplifier's own pins; each branch line then looks only at
the branches of a net that is already bound. A match must account for every branch at the inputs of each of its
amplifiers: what no line explains forbids the match, so that a doubtful circuit stays unrecognized. Cost per template
is bounded by the few branches at the amplifier's pins.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

from ..circuit.graph import Circuit
from ..circuit.parts import Amplifier
from .neighbourhood import Edge, survey
from .reduce import Reduced, reduce_fully, reduce_plainly
from .references import is_reference
from .templates import AmplifierLine, BranchLine, Template

_ENTRY = "in"
_REFERENCE = "ref"
_ANY = "any"
_CLASSES = {_ENTRY, _REFERENCE, _ANY}


@dataclass(slots=True)
class Match:
    """A template that fits: nets and amplifiers by their template names, branches by role."""

    template: Template
    nets: dict[str, str] = field(default_factory=dict)
    amplifiers: dict[str, Amplifier] = field(default_factory=dict)
    roles: dict[str, list[Edge]] = field(default_factory=dict)
    entries: list[str] = field(default_factory=list)
    references: list[str] = field(default_factory=list)
    reductions: list[Reduced] = field(default_factory=list)

    def copy(self) -> Match:
        """Return a copy that can be bound further."""
        return Match(
            self.template,
            dict(self.nets),
            dict(self.amplifiers),
            {role: list(edges) for role, edges in self.roles.items()},
            list(self.entries),
            list(self.references),
            list(self.reductions),
        )


class Matcher:
    """Holds the reductions of a circuit's amplifiers, each made once, and tries templates on them."""

    def __init__(self, circuit: Circuit) -> None:
        self.circuit = circuit
        self.trials = 0
        self._reductions: dict[tuple[str, str], Reduced] = {}
        self._kinds: dict[str, str] = {}
        self._by_pin: dict[str, list[tuple[Amplifier, str]]] = {}
        for each in circuit.amplifiers:
            for pin in ("plus", "minus", "output"):
                self._by_pin.setdefault(getattr(each, pin), []).append((each, pin))

    def reduction(self, amplifier: Amplifier, depth: str) -> Reduced:
        """Return the reduced surroundings of an amplifier."""
        key = amplifier.name, depth
        found = self._reductions.get(key)
        if found is None:
            place = survey(self.circuit, (amplifier,))
            found = reduce_fully(place) if depth == "full" else reduce_plainly(self.circuit, place)
            self._reductions[key] = found
        return found

    def net_kind(self, net: str) -> str:
        """Return what a net is to a template: ref, in (a signal can come from there), virtual, inner."""
        known = self._kinds.get(net)
        if known is None:
            known = self._kinds[net] = self._judge_net(net)
        return known

    def _judge_net(self, net: str) -> str:
        circuit = self.circuit
        if net in circuit.signals:
            return _ENTRY
        if is_reference(circuit, net):
            return _REFERENCE
        if circuit.amplifiers_at(net):
            return _ENTRY
        pins = self._by_pin.get(net, ())
        if any(pin == "minus" for _, pin in pins):
            return "virtual"
        return _ENTRY

    # matching --------------------------------------------------------------------------------------------------------

    def match(self, template: Template, amplifier: Amplifier) -> Match | None:
        """Return the first way in which a template fits an amplifier, or None."""
        self.trials += 1
        if template.kinds and amplifier.kind not in template.kinds:
            return None
        first = template.amplifiers[0]
        for bound in self._bind_amplifier(Match(template), first, amplifier):
            for found in self._bind_lines(bound, template.branches):
                if self._is_complete(found):
                    return found
        return None

    def _bind_amplifier(self, match: Match, line: AmplifierLine, amplifier: Amplifier) -> Iterator[Match]:
        nets = dict(match.nets)
        reduction = self.reduction(amplifier, match.template.depth)
        for name, net in ((line.output, amplifier.output), (line.minus, amplifier.minus), (line.plus, amplifier.plus)):
            if name in _CLASSES or _is_entry_name(name):
                continue
            if nets.setdefault(name, net) != net:
                return
        distinct = {name: net for name, net in nets.items() if not _is_entry_name(name)}
        if len(set(distinct.values())) != len(distinct):
            return
        bound = match.copy()
        bound.nets = nets
        bound.amplifiers[line.name] = amplifier
        bound.reductions.append(reduction)
        yield bound

    def _bind_lines(self, match: Match, waiting: tuple[BranchLine, ...]) -> Iterator[Match]:
        """Bind the branch lines, always one that hangs on a net already bound."""
        if not waiting:
            yield from self._bind_others(match)
            return
        line = next((each for each in waiting if each.one in match.nets or each.two in match.nets), None)
        if line is None:
            bound_one = False
            for bound in self._bind_next_amplifier(match):
                bound_one = True
                yield from self._bind_lines(bound, waiting)
            if not bound_one and all(each.least == 0 for each in waiting):
                yield from self._bind_others(match)
            return
        rest = tuple(each for each in waiting if each is not line)
        start = line.one if line.one in match.nets else line.two
        end = line.two if start == line.one else line.one
        net = match.nets[start]
        candidates = [edge for edge in self._edges_at(match, net) if self._fits(match, line, edge, net, end)]
        if line.most > 1:
            if len(candidates) < line.least:
                return
            bound = match.copy()
            for edge in candidates:
                self._take(bound, line, edge, net, end)
            yield from self._bind_lines(bound, rest)
            return
        for edge in candidates:
            bound = match.copy()
            self._take(bound, line, edge, net, end)
            yield from self._bind_lines(bound, rest)
        if line.least == 0:
            yield from self._bind_lines(match, rest)

    def _bind_others(self, match: Match) -> Iterator[Match]:
        if len(match.amplifiers) == len(match.template.amplifiers):
            yield match
            return
        for bound in self._bind_next_amplifier(match):
            yield from self._bind_others(bound)

    def _bind_next_amplifier(self, match: Match) -> Iterator[Match]:
        """Bind one further amplifier of the template, found at a net that is already bound."""
        for line in match.template.amplifiers:
            if line.name in match.amplifiers:
                continue
            for name, pin in ((line.minus, "minus"), (line.output, "output"), (line.plus, "plus")):
                if name not in match.nets:
                    continue
                taken = {each.name for each in match.amplifiers.values()}
                for amplifier, its_pin in self._by_pin.get(match.nets[name], ()):
                    if its_pin == pin and amplifier.name not in taken:
                        yield from self._bind_amplifier(match, line, amplifier)
                return

    def _edges_at(self, match: Match, net: str) -> list[Edge]:
        for reduction in match.reductions:
            if net in reduction.place.own:
                return reduction.place.at(net)
        for amplifier, _ in self._by_pin.get(net, ()):
            return self.reduction(amplifier, match.template.depth).place.at(net)
        for reduction in match.reductions:
            found = reduction.place.at(net)
            if found:
                return found
        return []

    def _fits(self, match: Match, line: BranchLine, edge: Edge, net: str, end: str) -> bool:
        if not _KINDS[line.letter](edge):
            return False
        if edge.key in {used.key for edges in match.roles.values() for used in edges}:
            return False
        other = edge.other(net)
        if end in match.nets:
            return match.nets[end] == other
        if end == _REFERENCE:
            return self.net_kind(other) == _REFERENCE
        if _is_entry_name(end):
            return (
                other not in self._own_nets(match)
                and self.net_kind(other) == _ENTRY
                and other not in match.nets.values()
            )
        if end in self._later_pins(match):
            return bool(self._by_pin.get(other)) and other not in match.nets.values()
        return other not in match.nets.values() and self._may_be_inner(match, other)

    def _may_be_inner(self, match: Match, net: str) -> bool:
        return self.net_kind(net) != _REFERENCE and net not in self.circuit.signals and net not in self._own_nets(match)

    def _later_pins(self, match: Match) -> set[str]:
        waiting = [each for each in match.template.amplifiers if each.name not in match.amplifiers]
        return {name for each in waiting for name in (each.plus, each.minus, each.output)}

    def _own_nets(self, match: Match) -> set[str]:
        return {net for each in match.amplifiers.values() for net in (each.plus, each.minus, each.output)}

    def _take(self, match: Match, line: BranchLine, edge: Edge, net: str, end: str) -> None:
        other = edge.other(net)
        match.roles.setdefault(line.role, []).append(edge)
        if end == _REFERENCE:
            match.references.append(other)
        elif _is_entry_name(end):
            match.entries.append(other)
            if end != _ENTRY:
                match.nets[end] = other
        else:
            match.nets.setdefault(end, other)

    # completeness ----------------------------------------------------------------------------------------------------

    def _is_complete(self, match: Match) -> bool:
        """Account for every branch at the inputs of each amplifier."""
        for line in match.template.amplifiers:
            amplifier = match.amplifiers[line.name]
            for name, net in ((line.minus, amplifier.minus), (line.plus, amplifier.plus)):
                if not self._pin_explained(match, name, net):
                    return False
        return True

    def _pin_explained(self, match: Match, name: str, net: str) -> bool:
        used = {edge.key for edges in match.roles.values() for edge in edges}
        own = self._own_nets(match)
        rest = [edge for edge in self._edges_at(match, net) if edge.key not in used]
        if name == _ANY:
            feedback = {each.output for each in match.amplifiers.values()}
            if net in feedback or any(edge.other(net) in feedback for edge in rest):
                return False
            self._note_any(match, net, rest)
            return True
        if name == _REFERENCE:
            return self._rests_on_reference(match, net, rest)
        if _is_entry_name(name):
            return self._takes_signal(match, name, net, rest, own)
        if name == match.template.amplifiers[0].output:
            return True
        if self.circuit.amplifiers_at(net) and not any(net == each.output for each in match.amplifiers.values()):
            return True
        return not rest

    def _note_any(self, match: Match, net: str, rest: list[Edge]) -> None:
        """Record what drives a pin about which the template asks nothing."""
        if self.net_kind(net) == _REFERENCE:
            match.references.append(net)
        elif net in self.circuit.signals or self.circuit.amplifiers_at(net) or not rest:
            match.entries.append(net)
        else:
            ends = [edge.other(net) for edge in rest]
            entries = [end for end in ends if self.net_kind(end) != _REFERENCE]
            match.entries.extend(entries)
            match.references.extend([net] if not entries else [])

    def _rests_on_reference(self, match: Match, net: str, rest: list[Edge]) -> bool:
        if self.net_kind(net) == _REFERENCE:
            match.references.append(net)
            return True
        if not rest or net in self.circuit.signals or self.circuit.amplifiers_at(net):
            return False
        for edge in rest:
            other = edge.other(net)
            if self.net_kind(other) != _REFERENCE or other in self._own_nets(match) or "D" in edge.letters:
                return False
        if all(edge.ohm == math.inf for edge in rest):
            return False
        for edge in rest:
            match.roles.setdefault("bias" if edge.ohm != math.inf else "bias_bypass", []).append(edge)
            match.references.append(edge.other(net))
        return True

    def _takes_signal(self, match: Match, name: str, net: str, rest: list[Edge], own: set[str]) -> bool:
        if name in match.nets and match.nets[name] != net:
            return False
        inner = [edge for edge in rest if edge.other(net) in own]
        if inner:
            return False
        if net in self.circuit.signals or (self.circuit.amplifiers_at(net) and self.net_kind(net) == _ENTRY):
            self._enter(match, name, net)
            return True
        if self.net_kind(net) == _REFERENCE:
            return False
        entries = [edge for edge in rest if self.net_kind(edge.other(net)) in {_ENTRY, "virtual"}]
        legs = [edge for edge in rest if self.net_kind(edge.other(net)) == _REFERENCE]
        if len(entries) + len(legs) != len(rest) or any("D" in edge.letters for edge in rest):
            return False
        if not entries and all(edge.ohm != math.inf for edge in legs) and legs and not self._is_open(net):
            return False
        if len(entries) > 1:
            return False
        if not entries:
            if not self._is_open(net):
                return False
            self._enter(match, name, net)
        for edge in entries:
            match.roles.setdefault("noninverting_input", []).append(edge)
            self._enter(match, name, edge.other(net))
        for edge in legs:
            role = "bias" if edge.ohm != math.inf else "input_capacitor"
            match.roles.setdefault(role, []).append(edge)
            match.references.append(edge.other(net))
        return True

    def _is_open(self, net: str) -> bool:
        """True when something outside the two-terminal parts can drive the net: a connector, a port, another part."""
        from ..circuit.parts import PartKind

        for designator, _ in self.circuit.pins_on(net):
            kind = self.circuit.parts[designator].kind
            if kind in {
                PartKind.CONNECTOR,
                PartKind.OPAQUE,
                PartKind.BJT,
                PartKind.MOSFET,
                PartKind.JFET,
                PartKind.SWITCH,
                PartKind.REGULATOR,
            }:
                return True
            if kind in {PartKind.VCVS, PartKind.BEHAVIOURAL, PartKind.CCVS, PartKind.VCCS, PartKind.CCCS}:
                return True
        return False

    def _enter(self, match: Match, name: str, net: str) -> None:
        match.entries.append(net)
        if name != _ENTRY:
            match.nets[name] = net


def _is_entry_name(name: str) -> bool:
    return name == _ENTRY or (name.startswith(_ENTRY) and name[2:].isdigit())


def _passes_dc(edge: Edge) -> bool:
    return edge.letters <= {"R", "L", "C"} and edge.ohm != math.inf and bool(edge.letters & {"R", "L"})


def _blocks_dc(edge: Edge) -> bool:
    return edge.letters <= {"R", "C", "L"} and "C" in edge.letters and edge.ohm == math.inf


def _is_junction(edge: Edge) -> bool:
    return "D" in edge.letters and "I" not in edge.letters


_KINDS: dict[str, Callable[[Edge], bool]] = {
    "R": _passes_dc,
    "C": _blocks_dc,
    "Z": lambda edge: _passes_dc(edge) or _blocks_dc(edge),
    "D": _is_junction,
    "I": lambda edge: "I" in edge.letters or (_is_junction(edge) and edge.letters <= {"D", "R", "C"}),
    "X": lambda edge: True,
}
