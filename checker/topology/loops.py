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
    import networkx

    graph = networkx.DiGraph()
    graph.add_nodes_from(each.name for each in circuit.amplifiers)
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
                    graph.add_edge(driver.name, each.name)
    groups = networkx.strongly_connected_components(graph)
    return frozenset(name for group in groups if len(group) > 1 for name in group)


def _touches_inner(inner: set[str], one: str, two: str) -> bool:
    return one in inner or two in inner
