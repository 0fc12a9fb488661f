"""The condition language of rule files: texts are checked when a pack is loaded and evaluated many times after.

A condition reads figures by name and answers true, false or cannot tell. It can only read: there is no assignment, no
loop, no call of anything but the functions of the language. :func:`describe_language` tells how it is written.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

from ..analysis.figures import Figure, Known, Unknown
from ..errors import ConditionError, Location, Problem
from .binding import Binder
from .evaluation import Comparison, Missing, Reading, Run, Test, Verdict
from .syntax import SyntaxTrouble, parse_syntax, place_in, prepare
from .terms import NameType, Scope, Term

__all__ = [
    "Comparison", "Condition", "NameType", "Reading", "Scope", "Value", "Verdict", "compile_condition",
    "compile_value", "describe_language", "prepare",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class Condition:
    """A checked condition. ``names`` are the figures and relations that it reads, members' as ``relation.name``."""

    text: str
    names: tuple[str, ...]
    test: Test

    def evaluate(self, reading: Reading) -> Verdict:
        """Answer the condition for one subject; never raises for any figures."""
        return self.test((reading,))


@dataclass(frozen=True, slots=True)
class Value:
    """A checked expression: ``unit`` is its SI unit (``""`` for a plain number), ``kind`` as of a measure."""

    text: str
    names: tuple[str, ...]
    unit: str
    kind: str
    run: Run

    def evaluate(self, reading: Reading) -> Figure:
        """Compute the value for one subject; several unknown figures are told as one."""
        found = self.run((reading,))
        if isinstance(found, Known):
            return found
        return _one_unknown(found)


def compile_condition(text: str, scope: Scope, where: Location) -> Condition:
    """Check a condition and make it ready to be evaluated.

    Parameters
    ----------
    text
        The condition as the rule file has it.
    scope
        What the names mean for the rule's subject.
    where
        The place of the text in its file; its ``excerpt`` (the line of the key) lets columns be those of the file.

    Raises
    ------
    ConditionError
        With every problem that was met: unknown names, units that do not go together, misspelt syntax.
    """
    term, names = _bound(text, scope, where, as_test=True)
    if term.test is None:
        raise ConditionError(Problem("condition-kind", f"`{text}` is not a condition", where))
    return Condition(text, names, term.test)


def compile_value(text: str, scope: Scope, where: Location) -> Value:
    """Check an expression of any kind, as it stands in a placeholder of a message.

    Raises
    ------
    ConditionError
        As :func:`compile_condition`.
    """
    term, names = _bound(text, scope, where, as_test=False)
    return Value(text, names, term.type.unit, term.type.kind, term.run)


def _bound(text: str, scope: Scope, where: Location, *, as_test: bool) -> tuple[Term, tuple[str, ...]]:
    try:
        node = parse_syntax(text)
    except SyntaxTrouble as trouble:
        place = place_in(text, _with_line(where), trouble.start, trouble.end)
        raise ConditionError(
            Problem(trouble.kind, trouble.what, place, expected=trouble.expected, cure=trouble.cure)
        ) from None
    binder = Binder(text, scope)
    term = binder.bind_test(node) if as_test else binder.bind(node)
    if term is None or binder.problems:
        whole = _with_line(where)
        raise ConditionError(
            replace(each, location=place_in(text, whole, start, end)) for each, start, end in binder.problems
        )
    return term, tuple(binder.names)


def _with_line(where: Location) -> Location:
    """Return the place with the line of the file there; read only for the sake of a message, so never a trouble."""
    if where.excerpt is not None:
        return where
    try:
        rows = Path(where.file).read_text(encoding="utf-8-sig").splitlines()
        return replace(where, excerpt=rows[where.line - 1])
    except (OSError, ValueError, IndexError):
        return where


def _one_unknown(found: Missing) -> Unknown:
    if len(found.unknowns) == 1:
        return found.unknowns[0]
    reasons = dict.fromkeys(each.reason for each in found.unknowns)
    missing = dict.fromkeys(each.missing for each in found.unknowns if each.missing)
    return Unknown("; ".join(reasons), ", ".join(missing) or None)


def describe_language() -> str:
    """Return the reference of the language for the contributor guide, as plain text."""
    from .language import reference

    return reference()
