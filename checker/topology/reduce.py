"""Reduction of a neighbourhood: parallel and series parts become one branch, decorations are set aside.

Two depths are kept. ``full`` has series and parallel parts reduced and keeps every junction: filters are recognized
there. ``plain`` has shunt capacitors of inner nets, clamps and stubs set aside as properties and inner resistive
junctions (T-networks, attenuators) replaced by their star-mesh equivalent: amplifier stages are recognized there.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from ..circuit.graph import Circuit
from .neighbourhood import Edge, Leaf, Neighbourhood


@dataclass(slots=True)
class Reduced:
    """A reduced neighbourhood and the properties that were set aside on the way."""

    place: Neighbourhood
    properties: dict[str, list[str]] = field(default_factory=dict)

    def note(self, name: str, designators: tuple[str, ...]) -> None:
        """Record that parts show a property."""
        held = self.properties.setdefault(name, [])
        held.extend(each for each in designators if each not in held)


def reduce_fully(place: Neighbourhood) -> Reduced:
    """Merge series and parallel parts; every junction of three branches stays."""
    work = Neighbourhood(place.plus, place.minus, place.output, list(place.edges), set(place.inner))
    found = Reduced(work)
    _settle(found)
    return found


def reduce_plainly(circuit: Circuit, place: Neighbourhood) -> Reduced:
    """Reduce as far as amplifier stages need; see the module text."""
    found = reduce_fully(place)
    _set_clamps_aside(circuit, found)
    _settle(found)
    while True:
        if _set_shunts_aside(circuit, found) or _mesh_one(circuit, found) or _fold_coupling(circuit, found):
            _settle(found)
            continue
        break
    return found


def _settle(found: Reduced) -> None:
    """Repeat parallel and series merges and the removal of stubs until nothing changes."""
    place = found.place
    changed = True
    while changed:
        changed = _merge_parallel(place)
        for net in sorted(place.inner):
            touching = place.at(net)
            if not touching:
                place.inner.discard(net)
            elif len(touching) == 1:
                place.edges.remove(touching[0])
                place.inner.discard(net)
                found.note("stub", touching[0].designators)
                changed = True
            elif len(touching) == 2:
                one, two = touching
                place.edges.remove(one)
                place.edges.remove(two)
                place.inner.discard(net)
                ends = one.other(net), two.other(net)
                if ends[0] != ends[1]:
                    place.edges.append(_series(ends, one, two))
                changed = True


def _merge_parallel(place: Neighbourhood) -> bool:
    groups: dict[frozenset[str], list[Edge]] = {}
    for edge in place.edges:
        groups.setdefault(frozenset((edge.one, edge.two)), []).append(edge)
    if len(groups) == len(place.edges):
        return False
    place.edges = [group[0] if len(group) == 1 else _parallel(group) for group in groups.values()]
    return True


def _ordered(leaves: tuple[Leaf, ...]) -> tuple[Leaf, ...]:
    return tuple(sorted(leaves, key=lambda leaf: leaf.part.location.line))


def _series(ends: tuple[str, str], one: Edge, two: Edge) -> Edge:
    ohm = None if one.ohm is None or two.ohm is None else one.ohm + two.ohm
    pieces = (*(one.pieces if one.form == "series" else (one,)), *(two.pieces if two.form == "series" else (two,)))
    meshes = (*one.mesh_parts, *two.mesh_parts)
    return Edge(*ends, "series", _ordered((*one.leaves, *two.leaves)), pieces, ohm, meshes)


def _parallel(group: list[Edge]) -> Edge:
    first = group[0]
    leaves = _ordered(tuple(leaf for edge in group for leaf in edge.leaves))
    pieces = tuple(piece for edge in group for piece in (edge.pieces if edge.form == "parallel" else (edge,)))
    meshes = tuple(each for edge in group for each in edge.mesh_parts)
    return Edge(first.one, first.two, "parallel", leaves, pieces, parallel_ohm([edge.ohm for edge in group]), meshes)


def parallel_ohm(values: list[float | None]) -> float | None:
    """Return the DC resistance of branches side by side; None when one of them is not known."""
    if any(value is None for value in values):
        return None
    known = [value for value in values if value is not None]
    if any(value == 0 for value in known):
        return 0.0
    total = sum(1 / value for value in known if math.isfinite(value))
    return 1 / total if total else math.inf


def _set_clamps_aside(circuit: Circuit, found: Reduced) -> None:
    """Take diodes to rails or ground away from inputs and inner nets, and those between the inputs."""
    place = found.place
    for edge in list(place.edges):
        if "D" not in edge.letters:
            continue
        ends = {edge.one, edge.two}
        if ends == {place.plus, place.minus}:
            kind = "input_clamp"
        elif place.output in ends and place.minus in ends:
            continue
        elif any(_is_quiet(circuit, net) for net in ends) and (
            ends & place.inner or ends & {place.plus, place.minus} - {place.output}
        ):
            kind = "clamp"
        else:
            continue
        place.edges.remove(edge)
        found.note(kind, edge.designators)


def _is_quiet(circuit: Circuit, net: str) -> bool:
    return circuit.is_stiff(net) and net not in circuit.signals


def _set_shunts_aside(circuit: Circuit, found: Reduced) -> bool:
    """Take capacitors (and capacitors with a resistor in series) from inner nets to stiff nets away."""
    place = found.place
    for edge in list(place.edges):
        if "C" not in edge.letters or edge.ohm != math.inf or "D" in edge.letters:
            continue
        ends = (edge.one, edge.two)
        inner = [net for net in ends if net in place.inner]
        stiff = [net for net in ends if _is_quiet(circuit, net)]
        if inner and (stiff or len(inner) == 1 and edge.other(inner[0]) in place.own and len(place.at(inner[0])) > 2):
            if not stiff:
                continue
            place.edges.remove(edge)
            found.note("input_filter", edge.designators)
            return True
    return False


def _mesh_one(circuit: Circuit, found: Reduced) -> bool:
    """Replace one inner junction of resistive branches by the mesh between its neighbours (star-mesh transform)."""
    place = found.place
    for net in sorted(place.inner):
        touching = place.at(net)
        if len(touching) < 3 or len(touching) > 6:
            continue
        if not all(edge.ohm is not None and math.isfinite(edge.ohm) and edge.ohm > 0 for edge in touching):
            continue
        if not all(edge.letters <= {"R", "L"} or edge.form == "mesh" for edge in touching):
            continue
        conductance = [1 / edge.ohm for edge in touching if edge.ohm]
        total = sum(conductance)
        for edge in touching:
            place.edges.remove(edge)
        place.inner.discard(net)
        parts = tuple(each for edge in touching for each in edge.designators)
        for index, one in enumerate(touching):
            for other in range(index + 1, len(touching)):
                two = touching[other]
                ends = one.other(net), two.other(net)
                if ends[0] == ends[1] or (circuit.is_stiff(ends[0]) and circuit.is_stiff(ends[1])):
                    continue
                ohm = total / (conductance[index] * conductance[other])
                leaves = _ordered((*one.leaves, *two.leaves))
                place.edges.append(Edge(*ends, "mesh", leaves, (), ohm, parts))
        found.note("resistor_network", parts)
        return True
    return False


def _fold_coupling(circuit: Circuit, found: Reduced) -> bool:
    """Dissolve an inner net where a coupling capacitor meets resistors: the capacitor goes in series with each of them."""
    place = found.place
    for net in sorted(place.inner):
        touching = place.at(net)
        blocking = [edge for edge in touching if edge.ohm == math.inf and "C" in edge.letters]
        passing = [
            edge for edge in touching if edge.ohm is not None and math.isfinite(edge.ohm) and "D" not in edge.letters
        ]
        if len(blocking) != 1 or len(passing) < 2 or len(blocking) + len(passing) != len(touching) or len(touching) > 6:
            continue
        source = blocking[0].other(net)
        if source in place.own or source in place.inner or circuit.is_stiff(source) and source not in circuit.signals:
            continue
        for edge in touching:
            place.edges.remove(edge)
        place.inner.discard(net)
        for edge in passing:
            end = edge.other(net)
            if not circuit.is_stiff(end) and end != source:
                place.edges.append(_series((end, source), edge, blocking[0]))
        for index, one in enumerate(passing):
            for two in passing[index + 1 :]:
                ends = one.other(net), two.other(net)
                if ends[0] != ends[1] and not (circuit.is_stiff(ends[0]) and circuit.is_stiff(ends[1])):
                    place.edges.append(_series(ends, one, two))
        found.note("coupling_network", tuple(name for edge in touching for name in edge.designators))
        return True
    return False


def capacitance_of(edge: Edge) -> float | None:
    """Return the total capacitance of a branch whose capacitors are side by side or alone; None otherwise."""
    capacitors = [leaf for leaf in edge.leaves if leaf.letter == "C"]
    if not capacitors or any(leaf.value is None for leaf in capacitors):
        return None
    if len(capacitors) == 1:
        return capacitors[0].value
    if edge.form == "parallel" and all(len(piece.leaves) == 1 for piece in edge.pieces if "C" in piece.letters):
        return sum(leaf.value for leaf in capacitors if leaf.value is not None)
    if edge.form == "series" and all(piece.form == "leaf" for piece in edge.pieces):
        return 1 / sum(1 / leaf.value for leaf in capacitors if leaf.value)
    return None
