"""Conditions at work: closures that read figures and answer true, false or cannot tell, without ever raising.

Logic is three-valued (Kleene): false and unknown is false, true or unknown is true, whatever else meets an unknown
figure cannot be told and carries the figure's reason. Figures that differ by less than a part in 10^9 are equal.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from math import isfinite
from typing import Any, Protocol, TypeAlias

from ..analysis.figures import Figure, Known, Unknown

# Rounding of a computed figure, far below any tolerance of a part.
ROUNDING = 1e-9

# Beyond it a whole number has no floating figure to compare it with.
_LARGEST = 10**300


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


class NoFigure(ArithmeticError):
    """Arithmetic without an answer; the text says why, after the words of the term."""


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


# Reading figures ------------------------------------------------------------------------------------------------


def _number(value: Any) -> float | None:
    if isinstance(value, bool) or not isinstance(value, int | float):
        value = getattr(value, "item", lambda: None)()  # a numpy scalar
        if isinstance(value, bool) or not isinstance(value, int | float):
            return None
    if isinstance(value, int):
        return value if abs(value) < _LARGEST else None
    return None if math.isnan(value) else value


def _flag(value: Any) -> bool | None:
    if not isinstance(value, bool):
        value = getattr(value, "item", lambda: None)()
    return value if isinstance(value, bool) else None


def _word(value: Any) -> str | None:
    return value if isinstance(value, str) else None


def _words(value: Any) -> tuple[str, ...] | None:
    if isinstance(value, str) or not isinstance(value, tuple | list | set | frozenset):
        return None
    words = tuple(sorted(value) if isinstance(value, set | frozenset) else value)
    return words if all(isinstance(each, str) for each in words) else None


def _numbers(value: Any) -> tuple[float, ...] | None:
    if isinstance(value, str | Mapping) or not hasattr(value, "__iter__"):
        return None
    found = [_number(each) for each in value]
    numbers = tuple(each for each in found if each is not None)
    return numbers if len(numbers) == len(found) else None


def _map(value: Any) -> Mapping[str, Any] | None:
    return value if isinstance(value, Mapping) else None


_SETTLE: dict[str, Callable[[Any], Any]] = {
    "number": _number, "flag": _flag, "word": _word, "words": _words, "numbers": _numbers, "map": _map,
}  # fmt: skip


def constant(value: Any) -> Run:
    """Return the term that is always ``value``."""
    known = Known(value)
    return lambda readings: known


def figure(name: str, level: int, kind: str) -> Run:
    """Return the term that reads a figure of the subject at ``level`` (0 the rule's own)."""
    settle = _SETTLE[kind]
    missing = Missing((Unknown(f"`{name}` is not known"),))

    def run(readings: Readings) -> Known | Missing:
        found = readings[level].figure(name)
        if isinstance(found, Unknown):
            return Missing((found,))
        value = settle(found.value)
        if value is None:
            return missing
        return found if value is found.value else Known(value, found.assumptions)

    return run


# Arithmetic -----------------------------------------------------------------------------------------------------


def computed(text: str, function: Callable[..., Any], runs: Sequence[Run]) -> Run:
    """Return the term ``function`` of other terms; ``text`` is how the rule's author wrote it."""

    def answer(found: Sequence[Known]) -> Known | Missing:
        try:
            result = function(*[each.value for each in found])
            if result.__class__ is int:
                float(result)
            elif result.__class__ is float and not isfinite(result):
                _check_infinite(result, [each.value for each in found])
        except NoFigure as trouble:
            return Missing((Unknown(f"`{text}` {trouble}"),))
        except ZeroDivisionError:
            return Missing((Unknown(f"`{text}` divides by zero"),))
        except (OverflowError, ValueError):
            return Missing((Unknown(f"`{text}` is too large to be computed"),))
        for each in found:
            if each.assumptions:
                return Known(result, merged(one.assumptions for one in found))
        return Known(result)

    def run(readings: Readings) -> Known | Missing:
        found = [each(readings) for each in runs]
        known = [each for each in found if each.__class__ is Known]
        return answer(known) if len(known) == len(found) else unknown_of(found)

    return run


def unknown_of(found: Iterable[Known | Missing]) -> Missing:
    """Return all that is unknown in some terms, each figure once."""
    return Missing(merged(each.unknowns for each in found if isinstance(each, Missing)))


def _check_infinite(result: float, values: Sequence[Any]) -> None:
    if math.isnan(result):
        raise NoFigure("has no definite value: it sets one infinite figure against another")
    for each in values:
        group = each.values() if isinstance(each, Mapping) else each if isinstance(each, tuple) else (each,)
        if any(math.isinf(one) for one in group if isinstance(one, float)):
            return
    raise OverflowError


def added(signs: Sequence[int]) -> Callable[..., float]:
    """Return the function that adds its arguments, from the second on with the given signs."""
    return _folded([operator.add if sign > 0 else operator.sub for sign in signs])


def multiplied(signs: Sequence[int]) -> Callable[..., float]:
    """Return the function that multiplies (sign 1) and divides (-1) its arguments from the left."""
    return _folded([operator.mul if sign > 0 else operator.truediv for sign in signs])


def _folded(steps: Sequence[Callable[[float, float], float]]) -> Callable[..., float]:
    if len(steps) == 1:
        return steps[0]

    def fold(*values: float) -> float:
        total = values[0]
        for step, value in zip(steps, values[1:], strict=True):
            total = step(total, value)
        return total

    return fold


def entry(text: str, table: Run, key: Run) -> Run:
    """Return the term that looks a name up in a table; letter case makes no difference."""

    def run(readings: Readings) -> Known | Missing:
        held, wanted = table(readings), key(readings)
        if isinstance(held, Missing) or isinstance(wanted, Missing):
            return unknown_of((held, wanted))
        folded = wanted.value.casefold()
        for name, value in held.value.items():
            if str(name).casefold() == folded:
                number = _number(value)
                if number is None:
                    break
                return Known(number, merged((held.assumptions, wanted.assumptions)))
        return Missing((Unknown(f"`{text}` is not known: no figure for {wanted.value}"),))

    return run


def chosen(test: Test, first: Run, second: Run) -> Run:
    """Return the first term where the test is true, the second where it is false."""

    def run(readings: Readings) -> Known | Missing:
        verdict = test(readings)
        if verdict.value is None:
            return Missing(verdict.unknowns)
        found = (first if verdict.value else second)(readings)
        if isinstance(found, Missing) or not verdict.assumptions:
            return found
        return Known(found.value, merged((verdict.assumptions, found.assumptions)))

    return run


def answered(test: Test) -> Run:
    """Return a condition as a term, true or false."""

    def run(readings: Readings) -> Known | Missing:
        verdict = test(readings)
        return Missing(verdict.unknowns) if verdict.value is None else Known(verdict.value, verdict.assumptions)

    return run


# Tests ----------------------------------------------------------------------------------------------------------


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


# Related subjects -----------------------------------------------------------------------------------------------


def quantified(relation: str, level: int, inner: Test, stop: bool) -> Test:
    """Return the test over all members of a relation: all (``stop`` False) or any (True)."""
    return lambda readings: decided((inner((*readings, each)) for each in readings[level].members(relation)), stop)


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
