"""Feedback that closes over several amplifiers: strongly connected groups of the output-to-input graph."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..circuit.graph import Circuit

if TYPE_CHECKING:
    from .match import Matcher


def amplifiers_in_loops(circuit: Circuit, matcher: Matcher) -> frozenset[str]:
    """Return the amplifiers whose output reaches one of their own inputs through another amplifier."""
    if len(circuit.amplifiers) < 2:
        return frozenset()
    drivers: dict[str, set[str]] = {each.name: set() for each in circuit.amplifiers}
    for each in circuit.amplifiers:
        place = matcher.reduction(each, "full").place
        sources = {each.plus, each.minus}
        for net in (each.plus, each.minus):
            sources.update(edge.other(net) for edge in place.at(net))
        sources.update(
            end
            for edge in place.edges
            for end in (edge.one, edge.two)
            if _touches_inner(place.inner, edge.one, edge.two)
        )
        for net in sorted(sources):
            for driver in circuit.amplifiers_at(net):
                if driver.name != each.name:
                    drivers[each.name].add(driver.name)
    looped = without_ends(drivers)
    if not looped:
        return frozenset()
    import networkx

    graph = networkx.DiGraph()
    graph.add_edges_from((driver, name) for name in looped for driver in drivers[name] if driver in looped)
    groups = networkx.strongly_connected_components(graph)
    return frozenset(name for group in groups if len(group) > 1 for name in group)


def _touches_inner(inner: set[str], one: str, two: str) -> bool:
    return one in inner or two in inner


def without_ends(drivers: dict[str, set[str]]) -> set[str]:
    """Return what is left when all that nothing drives has been taken away, again and again: the loops and what they feed."""
    left = {name: set(each) for name, each in drivers.items()}
    driven: dict[str, list[str]] = {}
    for name, each in drivers.items():
        for driver in each:
            driven.setdefault(driver, []).append(name)
    waiting = [name for name, each in left.items() if not each]
    while waiting:
        gone = waiting.pop()
        left.pop(gone, None)
        for name in driven.get(gone, ()):
            left[name].discard(gone)
            if not left[name]:
                waiting.append(name)
    return set(left)
