"""Terms at work: figures that are read and computed, or found missing with the reason; arithmetic never raises."""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Mapping, Sequence
from math import isfinite
from typing import Any

from ..analysis.figures import Known, Unknown
from .evaluation import Missing, Readings, Run, Test, merged, unknown_of

# Beyond it a whole number has no floating figure to compare it with.
_LARGEST = 10**300


class NoFigure(ArithmeticError):
    """Arithmetic without an answer; the text says why, after the words of the term."""


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
