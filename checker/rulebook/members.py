"""Questions about related subjects at work: any, all, how many, and a term of each."""

from __future__ import annotations

import math
from collections.abc import Iterable

from ..analysis.figures import Known, Unknown
from .evaluation import Comparison, Missing, Readings, Run, Test, Verdict, decided, merged


def quantified(relation: str, level: int, inner: Test, stop: bool) -> Test:
    """Return the test over all members of a relation: all (``stop`` False) or any (True).

    Where any is false, the member that comes nearest to its limit gives the comparison.
    """

    def test(readings: Readings) -> Verdict:
        seen: list[Verdict] = []

        def verdicts() -> Iterable[Verdict]:
            for member in readings[level].members(relation):
                seen.append(inner((*readings, member)))
                yield seen[-1]

        found = decided(verdicts(), stop)
        if not stop or found.value is not False or len(seen) < 2:
            return found
        compared_members = [each.comparison for each in seen if each.comparison is not None]
        if not compared_members:
            return found
        return Verdict(False, (), min(compared_members, key=_distance), found.assumptions)

    return test


def _distance(comparison: Comparison) -> float:
    """Return how far a figure is from its limit, as a share of the larger of the two."""
    measured, limit = comparison.measured, comparison.limit
    if measured is None or limit is None or math.isinf(measured) or math.isinf(limit):
        return math.inf
    scale = max(abs(measured), abs(limit))
    return abs(measured - limit) / scale if scale else 0.0


def counted(relation: str, level: int, inner: Test | None) -> Run:
    """Return the number of members of a relation, or of those for which the test is true."""

    def run(readings: Readings) -> Known | Missing:
        members = readings[level].members(relation)
        if inner is None:
            return Known(len(members))
        verdicts = [inner((*readings, each)) for each in members]
        unknowns = merged(each.unknowns for each in verdicts if each.value is None)
        if unknowns:
            return Missing(unknowns)
        return Known(sum(each.value is True for each in verdicts), merged(each.assumptions for each in verdicts))

    return run


def gathered(relation: str, level: int, inner: Run, test: Test | None) -> Run:
    """Return a term of each member of a relation (for which the test is true) as a tuple."""

    def run(readings: Readings) -> Known | Missing:
        found: list[Known] = []
        unknowns: tuple[Unknown, ...] = ()
        assumptions: tuple[str, ...] = ()
        for member in readings[level].members(relation):
            inside = (*readings, member)
            if test is not None:
                verdict = test(inside)
                assumptions += verdict.assumptions
                unknowns += verdict.unknowns if verdict.value is None else ()
                if verdict.value is not True:
                    continue
            each = inner(inside)
            if isinstance(each, Missing):
                unknowns += each.unknowns
            else:
                found.append(each)
        if unknowns:
            return Missing(merged((unknowns,)))
        return Known(tuple(each.value for each in found), merged((assumptions, *(each.assumptions for each in found))))

    return run
