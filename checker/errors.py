"""Everything that can go wrong outside the circuit itself: locations, problems and the tree of exceptions.

``AmpwardenError``
  ``NetlistError``      the netlist cannot be read            (its author mends it)
    ``IncludeRefused``  asks for a file outside the allowed folders
  ``IntentError``       review.toml is wrong                  (the reviewer mends it)
  ``RulePackError``     a rule, template or part file is wrong (its author mends it)
    ``ConditionError``  inside a condition, with its column
  ``UsageError``        the call is wrong                     (the caller mends it)

A defect of the circuit is never an exception: it is a finding. A check that could not be made is ``Unevaluated``.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Location:
    """A place in a text.

    ``line`` and ``column`` count from 1; ``excerpt`` is the physical line as written, ``length`` the number of
    characters that the caret underlines.
    """

    file: str
    line: int
    column: int | None = None
    excerpt: str | None = None
    length: int = 1

    def __str__(self) -> str:
        """Return ``file:line`` or ``file:line:column``."""
        place = f"{self.file}:{self.line}"
        return place if self.column is None else f"{place}:{self.column}"


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong with a text, said so that its author can mend it.

    ``kind`` is a stable kebab-case word, ``what`` one line that stands alone, ``expected`` and ``cure`` are in trade
    words, ``nearest`` holds up to four close names. ``level`` is ``error`` (the text cannot be used) or ``warning``
    (it was read, but the author should know how).
    """

    kind: str
    what: str
    location: Location | None = None
    level: str = "error"
    expected: str | None = None
    because: str | None = None
    cure: str | None = None
    nearest: tuple[str, ...] = ()


class AmpwardenError(Exception):
    """Base of all errors that ampwarden raises; carries every problem that was met."""

    def __init__(self, problems: Problem | Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = (problems,) if isinstance(problems, Problem) else tuple(problems)
        super().__init__("\n".join(render_problem(problem) for problem in self.problems))


class NetlistError(AmpwardenError):
    """The netlist cannot be read."""


class IncludeRefused(NetlistError):
    """The netlist asks for a file outside the folders it may read."""


class IntentError(AmpwardenError):
    """The intent file review.toml is wrong."""


class RulePackError(AmpwardenError):
    """A rule, topology or part file is wrong."""


class ConditionError(RulePackError):
    """A condition inside a rule file is wrong."""


class UsageError(AmpwardenError):
    """The call itself is wrong."""


def render_problem(problem: Problem) -> str:
    """Return a problem as plain text: headline, excerpt with caret, what was expected, the cure."""
    place = problem.location
    lines = [f"{place}  {problem.what}" if place else problem.what]
    if place is not None and place.excerpt is not None:
        number = str(place.line)
        excerpt = place.excerpt.replace("\t", " ")
        lines.append(f"{number:>5} | {excerpt}")
        if place.column is not None:
            lines.append(f"      | {' ' * (place.column - 1)}{'^' * max(1, place.length)}")
    if problem.expected:
        lines.append(f"  expected  {problem.expected}")
    if problem.because:
        lines.append(f"  because   {problem.because}")
    if problem.nearest:
        lines.append(f"  nearest   {', '.join(problem.nearest)}")
    if problem.cure:
        lines.append(f"  cure      {problem.cure}")
    return "\n".join(lines)
