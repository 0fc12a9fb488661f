"""Conditions at work: closures that read figures and answer true, false or cannot tell, without ever raising.

Logic is three-valued (Kleene): false and unknown is false, true or unknown is true, whatever else meets an unknown
figure cannot be told and carries the figure's reason. Figures that differ by less than a part in 10^9 are equal.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Protocol, TypeAlias

from ..analysis.figures import Figure, Known, Unknown

# Rounding of a computed figure, far below any tolerance of a part.
ROUNDING = 1e-9


class Reading(Protocol):
    """What names are while a rule is applied to one subject."""

    def figure(self, name: str) -> Figure:
        """Return the figure of that name."""

    def members(self, relation: str) -> tuple[Reading, ...]:
        """Return the related subjects."""


@dataclass(frozen=True, slots=True)
class Comparison:
    """The comparison that decided: a figure, the limit it was held against, their SI unit, the operator."""

    measured: float | None
    limit: float | None
    unit: str
    operator: str


@dataclass(frozen=True, slots=True)
class Verdict:
    """The answer of a condition: true, false, or None with the unknown figures that stand in the way.

    ``comparison`` is the one that decided, None where no figures were compared; ``assumptions`` are those of the
    figures that the answer rests on.
    """

    value: bool | None
    unknowns: tuple[Unknown, ...] = ()
    comparison: Comparison | None = None
    assumptions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Missing:
    """A term that has no value, with every figure that is unknown in it."""

    unknowns: tuple[Unknown, ...]


Readings: TypeAlias = tuple[Reading, ...]
Run: TypeAlias = Callable[[Readings], "Known | Missing"]
Test: TypeAlias = Callable[[Readings], Verdict]

TRUE = Verdict(True)
FALSE = Verdict(False)
_MIRRORED = {"<": ">", "<=": ">=", ">": "<", ">=": "<=", "==": "==", "!=": "!="}
_DENIED = {"<": ">=", "<=": ">", ">": "<=", ">=": "<", "==": "!=", "!=": "=="}


def merged(groups: Iterable[tuple[Any, ...]]) -> tuple[Any, ...]:
    """Return all entries once, in the order in which they are met."""
    return tuple(dict.fromkeys(each for group in groups for each in group))


def unknown_of(found: Iterable[Known | Missing]) -> Missing:
    """Return all that is unknown in some terms, each figure once."""
    return Missing(merged(each.unknowns for each in found if isinstance(each, Missing)))


def asked(run_flag: Run) -> Test:
    """Return a yes-or-no figure as a test."""

    def test(readings: Readings) -> Verdict:
        found = run_flag(readings)
        if isinstance(found, Missing):
            return Verdict(None, found.unknowns)
        if found.assumptions:
            return Verdict(found.value, (), None, found.assumptions)
        return TRUE if found.value else FALSE

    return test


def is_close(left: float, right: float) -> bool:
    """Tell whether two figures are equal but for rounding."""
    return left == right or math.isclose(left, right, rel_tol=ROUNDING)


def _less(left: float, right: float) -> bool:
    return left < right and not is_close(left, right)


def _at_most(left: float, right: float) -> bool:
    return left <= right or is_close(left, right)


_HOLDS: dict[str, Callable[[float, float], bool]] = {
    "<": _less,
    "<=": _at_most,
    ">": lambda left, right: _less(right, left),
    ">=": lambda left, right: _at_most(right, left),
    "==": is_close,
    "!=": lambda left, right: not is_close(left, right),
}


def compared(sign: str, left: Run, right: Run, unit: str, *, measures_right: bool) -> Test:
    """Return the comparison of two numbers; ``measures_right`` when the limit is the left one."""
    shown = _MIRRORED[sign] if measures_right else sign
    holds = _HOLDS[sign]

    def test(readings: Readings) -> Verdict:
        a, b = left(readings), right(readings)
        if isinstance(a, Missing) or isinstance(b, Missing):
            return Verdict(None, unknown_of((a, b)).unknowns)
        measured, limit = (b.value, a.value) if measures_right else (a.value, b.value)
        assumptions = merged((a.assumptions, b.assumptions)) if a.assumptions or b.assumptions else ()
        return Verdict(holds(a.value, b.value), (), Comparison(measured, limit, unit, shown), assumptions)

    return test


def related(left: Run, right: Run, relation: Callable[[Any, Any], bool], *, wanted: bool) -> Test:
    """Return a test of two terms that are not numbers, such as a word and a list."""

    def test(readings: Readings) -> Verdict:
        a, b = left(readings), right(readings)
        if isinstance(a, Missing) or isinstance(b, Missing):
            return Verdict(None, unknown_of((a, b)).unknowns)
        value = relation(a.value, b.value) is wanted
        if a.assumptions or b.assumptions:
            return Verdict(value, (), None, merged((a.assumptions, b.assumptions)))
        return TRUE if value else FALSE

    return test


def same_word(left: Any, right: Any) -> bool:
    """Compare two words without regard to letter case, or two flags."""
    return bool(left.casefold() == right.casefold() if isinstance(left, str) else left is right)


def word_among(word: str, words: Iterable[str]) -> bool:
    """Look for a word without regard to letter case."""
    folded = word.casefold()
    return any(str(each).casefold() == folded for each in words)


def number_among(number: float, numbers: Iterable[float]) -> bool:
    """Look for a figure, rounding allowed for."""
    return any(is_close(number, each) for each in numbers)


def is_known(run: Run, *, wanted: bool) -> Test:
    """Return the test that a term has a value (``wanted``) or has none."""
    return lambda readings: TRUE if isinstance(run(readings), Known) is wanted else FALSE


def denied(inner: Test) -> Test:
    """Return the opposite of a test; its comparison is turned round too."""

    def test(readings: Readings) -> Verdict:
        found = inner(readings)
        if found.value is None:
            return found
        held = found.comparison
        if held is not None:
            held = Comparison(held.measured, held.limit, held.unit, _DENIED[held.operator])
        return Verdict(not found.value, (), held, found.assumptions)

    return test


def decided(verdicts: Iterable[Verdict], stop: bool) -> Verdict:
    """Fold verdicts: the first that equals ``stop`` decides (False for and, True for or)."""
    unknowns: tuple[Unknown, ...] = ()
    assumptions: tuple[str, ...] = ()
    comparison: Comparison | None = None
    for each in verdicts:
        if each.value is stop:
            return each
        if each.value is None:
            unknowns += each.unknowns
            continue
        if comparison is None:
            comparison = each.comparison
        if each.assumptions:
            assumptions += each.assumptions
    if unknowns:
        return Verdict(None, merged((unknowns,)))
    if comparison is None and not assumptions:
        return FALSE if stop else TRUE
    return Verdict(not stop, (), comparison, merged((assumptions,)))


def outside(measured: Run, low: Run, high: Run, unit: str) -> Test:
    """Return the test that a figure lies outside a range; where it lies inside, the nearer bound is the limit."""
    above = compared(">=", measured, low, unit, measures_right=False)
    below = compared("<=", measured, high, unit, measures_right=False)
    base = denied(every((above, below)))

    def test(readings: Readings) -> Verdict:
        verdict = base(readings)
        if verdict.value is not False:
            return verdict
        x, a, b = measured(readings), low(readings), high(readings)
        if isinstance(x, Missing) or isinstance(a, Missing) or isinstance(b, Missing):
            return verdict
        if abs(b.value - x.value) < abs(x.value - a.value):
            return Verdict(False, (), Comparison(x.value, b.value, unit, ">"), verdict.assumptions)
        return verdict

    return test


def every(tests: Sequence[Test]) -> Test:
    """Return the conjunction of tests; nothing is asked after the first that is false."""
    return lambda readings: decided((each(readings) for each in tests), False)


def some(tests: Sequence[Test]) -> Test:
    """Return the disjunction of tests; nothing is asked after the first that is true."""
    return lambda readings: decided((each(readings) for each in tests), True)


def chosen_test(test: Test, first: Test, second: Test) -> Test:
    """Return the first condition where the test is true, the second where it is false."""

    def choose(readings: Readings) -> Verdict:
        verdict = test(readings)
        if verdict.value is None:
            return verdict
        found = (first if verdict.value else second)(readings)
        if found.value is None or not verdict.assumptions:
            return found
        assumptions = merged((verdict.assumptions, found.assumptions))
        return Verdict(found.value, (), found.comparison, assumptions)

    return choose
