"""Conditions bound to names: every term gets its kind and unit, or the rule file's author gets a problem with its cure."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import Any

from ..analysis.figures import Known
from ..errors import Problem
from ..quantities import nearest_names
from . import arithmetic, comparing
from . import evaluation as at_work
from .evaluation import Run, Test
from .functions import FUNCTIONS, bind_call
from .syntax import Node
from .terms import (
    FLAG,
    NUMBER,
    WORD,
    WORDS,
    NameType,
    Scope,
    Term,
    TermType,
    joined,
    multiplied,
    named_type,
    raised,
    read_quantity,
    unit_hint,
)

MAX_EXPONENT = 9
MAX_PROBLEMS = 20


class Binder:
    """Binds the nodes of one text; problems are gathered, a term that has one is None and breeds no others."""

    def __init__(self, text: str, scope: Scope) -> None:
        self.text = text
        self.scopes: list[tuple[Scope, str]] = [(scope, "")]
        self.problems: list[tuple[Problem, int, int]] = []
        self.names: dict[str, None] = {}
        self.levels: set[int] = set()
        self.expects_word = False

    # Places and problems

    def words_of(self, node: Node) -> str:
        """Return the author's own words for a node, on one line."""
        return " ".join(self.text[node.start : node.end].split())

    def report(
        self,
        node: Node,
        kind: str,
        what: str,
        *,
        expected: str | None = None,
        cure: str | None = None,
        nearest: tuple[str, ...] = (),
    ) -> None:
        """Add a problem at a node; once there are many, the rest would only be noise."""
        if len(self.problems) < MAX_PROBLEMS:
            problem = Problem(kind, what, expected=expected, cure=cure, nearest=nearest)
            self.problems.append((problem, node.start, node.end))

    # Entry points

    def bind(self, node: Node) -> Term | None:
        """Bind a node of any kind."""
        return _BINDERS[node.what](self, node)

    def bind_test(self, node: Node) -> Term | None:
        """Bind a node that has to be a condition."""
        if node.what == "name" and self.resolve(node.words[0]) is None and self.relation(node.words[0]) is not None:
            name = node.words[0]
            cure = f"any({name}, …), all({name}, …) or count({name}) > 0"
            self.report(node, "condition-kind", f"`{name}` is a relation, not a condition", cure=cure)
            return None
        term = self.bind(node)
        if term is None or term.test is not None:
            return term
        text = self.words_of(node)
        cures = {
            "number": f"compare it with a limit: {text} > 0",
            "word": f'compare it with a word: {text} == "…"',
            "words": f'"…" in {text}, or length({text}) > 0',
            "numbers": f"min({text}) or max({text}) compared with a limit, or length({text}) > 0",
            "map": f'{text}["…"] compared with a limit, or length({text}) > 0',
        }
        what = f"`{text}` is {term.type}, not a condition"
        self.report(
            node, "condition-kind", what, expected="a comparison or a yes-or-no figure", cure=cures[term.type.kind]
        )
        return None

    def bind_number(self, node: Node) -> Term | None:
        """Bind a node that has to be a number."""
        term = self.bind(node)
        if term is None or term.type.kind == "number":
            return term
        text = self.words_of(node)
        cures = {
            "flag": f"if({text}, …, …) makes a number of it",
            "numbers": f"min({text}), max({text}), sum({text}) or length({text})",
            "map": f'{text}["…"], min({text}) or max({text})',
            "words": f"length({text})",
            "word": "write names without quotes" if node.what == "word" else None,
        }
        what = f"`{text}` is {term.type}, used as a number"
        self.report(node, "condition-kind", what, expected="a number", cure=cures[term.type.kind])
        return None

    # Names

    def resolve(self, name: str) -> tuple[int, str, NameType] | None:
        """Find a figure: of the innermost member first, then outwards; ``outer.`` skips the innermost."""
        start = len(self.scopes) - 1
        while name.startswith("outer.") and start > 0:
            name, start = name.removeprefix("outer."), start - 1
        for level in range(start, -1, -1):
            found = self.scopes[level][0].type_of(name)
            if found is not None:
                return level, name, found
        return None

    def relation(self, name: str) -> tuple[int, Scope] | None:
        """Find a relation, of the innermost member first, then outwards."""
        for level in range(len(self.scopes) - 1, -1, -1):
            found = self.scopes[level][0].related(name)
            if found is not None:
                return level, found
        return None

    def note(self, level: int, name: str) -> None:
        """Remember that a name is used; those of members carry their relation."""
        prefix = self.scopes[level][1]
        self.names.setdefault(f"{prefix}.{name}" if prefix else name)
        self.levels.add(level)

    def name(self, node: Node) -> Term | None:
        """Bind a figure by name."""
        written = node.words[0]
        found = self.resolve(written)
        if found is None and written == "pi":
            return Term(node, NUMBER, arithmetic.constant(math.pi), is_constant=True)
        if found is None:
            self._unknown_name(node, written)
            return None
        level, name, declared = found
        try:
            kind = named_type(declared.kind, declared.unit, declared.words)
        except ValueError as trouble:
            self.report(node, "condition-unit", f"`{name}` is declared with an {trouble}")
            return None
        self.note(level, name)
        run = arithmetic.figure(name, level, kind.kind)
        return Term(node, kind, run, at_work.asked(run) if kind.kind == "flag" else None)

    def _unknown_name(self, node: Node, written: str) -> None:
        known = tuple(dict.fromkeys(each for scope, _ in reversed(self.scopes) for each in scope.known()))
        if self.relation(written) is not None:
            asked = f"count({written}), or any({written}, …) and all({written}, …)"
            self.report(node, "condition-kind", f"`{written}` is a relation, not a figure", cure=asked)
            return
        nearest = nearest_names(written, known)
        cure: str | None = None
        if self.expects_word:
            cure = "put words in quotes"
        elif written in FUNCTIONS:
            cure = f"`{written}` is a function: {written}(…)"
        elif written.casefold() in {"none", "null", "nan", "known", "unknown"}:
            cure = "ask whether a figure is known: name is known"
        elif not nearest and known:
            cure = f"known here: {', '.join(known[:12])}{', …' if len(known) > 12 else ''}"
        self.report(node, "condition-name", f"unknown name `{written}`", nearest=nearest, cure=cure)

    # Written values

    def quantity(self, node: Node) -> Term | None:
        """Bind a number with its unit."""
        text = node.words[0]
        try:
            value, kind = read_quantity(text)
        except ValueError as trouble:
            what, _, near = str(trouble).partition("; known units near it: ")
            cure = unit_hint(text)
            expected = None if cure.startswith("add") else f"a unit such as {near}"
            self.report(node, "condition-unit", f"`{text}`: {what}", expected=expected, cure=cure)
            return None
        if value in (float("inf"), float("-inf")):
            self.report(node, "condition-number", f"`{text}` is too large a number")
            return None
        return Term(node, kind, arithmetic.constant(value), is_constant=True)

    def word(self, node: Node) -> Term | None:
        """Bind a word in quotes."""
        return Term(node, WORD, arithmetic.constant(node.words[0][1:-1]), is_constant=True)

    def truth(self, node: Node) -> Term | None:
        """Bind true or false."""
        run = arithmetic.constant(node.words[0] == "true")
        return Term(node, FLAG, run, at_work.asked(run), is_constant=True)

    def listing(self, node: Node) -> Term | None:
        """Bind a list of words or of numbers."""
        found = [self.bind(each) for each in node.parts]
        terms = [each for each in found if each is not None]
        if len(terms) < len(found):
            return None
        first = terms[0].type
        if first.kind not in {"word", "number"}:
            self.report(terms[0].node, "condition-kind", f"a list cannot hold {first}", expected="words or numbers")
            return None
        for each in terms[1:]:
            if each.type.kind != first.kind:
                self.report(
                    each.node,
                    "condition-kind",
                    f"`{self.words_of(each.node)}` is {each.type} in a list of {first.kind}s",
                )
                return None
            if first.kind == "number":
                if not comparing.check_units(self, terms[0], each, "listed with"):
                    return None
                first = joined(first, each.type)
        runs = [each.run for each in terms]
        kind = WORDS if first.kind == "word" else TermType("numbers", first.unit, first.dimension, first.is_zero)
        run = arithmetic.computed(self.words_of(node), lambda *values: values, runs)
        return Term(node, kind, run, is_constant=all(each.is_constant for each in terms))

    # Logic

    def logic(self, node: Node) -> Term | None:
        """Bind and, or."""
        found = [self.bind_test(each) for each in node.parts]
        tests = [each.test for each in found if each is not None and each.test is not None]
        if len(tests) < len(found):
            return None
        constant = all(each is not None and each.is_constant for each in found)
        return self.flag(node, (at_work.every if node.what == "both" else at_work.some)(tests), is_constant=constant)

    def denial(self, node: Node) -> Term | None:
        """Bind not."""
        term = self.bind_test(node.parts[0])
        if term is None or term.test is None:
            return None
        return self.flag(node, at_work.denied(term.test), is_constant=term.is_constant)

    def known_test(self, node: Node) -> Term | None:
        """Bind is known, is unknown."""
        term = self.bind(node.parts[0])
        if term is None:
            return None
        words = node.words[0].split()
        wanted = (words[-1] == "known") is ("not" not in words)
        if term.is_constant:
            self.report(
                term.node, "condition-constant", f"`{self.words_of(term.node)}` is written out, so it is always known"
            )
            return None
        return self.flag(node, at_work.is_known(term.run, wanted=wanted))

    def flag(self, node: Node, test: Test, *, is_constant: bool = False) -> Term:
        """Return a bound condition."""
        return Term(node, FLAG, arithmetic.answered(test), test, is_constant)

    # Arithmetic

    def sum(self, node: Node) -> Term | None:
        """Bind + and -."""
        terms = self.bind_numbers(node.parts)
        if terms is None:
            return None
        kind = terms[0].type
        first = terms[0]
        for operator, each in zip(node.words, terms[1:], strict=True):
            verb = "added to" if operator == "+" else "less"
            if not comparing.check_units(self, Term(first.node, kind, first.run), each, verb):
                return None
            kind = joined(kind, each.type, is_difference=operator == "-")
        signs = [1 if each == "+" else -1 for each in node.words]
        return self.arithmetic(node, arithmetic.added(signs), terms, kind)

    def product(self, node: Node) -> Term | None:
        """Bind * and /."""
        terms = self.bind_numbers(node.parts)
        if terms is None:
            return None
        kind = terms[0].type
        signs = [1 if each == "*" else -1 for each in node.words]
        for sign, each in zip(signs, terms[1:], strict=True):
            kind = multiplied(kind, each.type, sign)
        kind = TermType(kind.kind, kind.unit, kind.dimension)
        return self.arithmetic(node, arithmetic.multiplied(signs), terms, kind)

    def power(self, node: Node) -> Term | None:
        """Bind ** by a whole number."""
        base = self.bind_number(node.parts[0])
        written = self.words_of(node.parts[1])
        digits = written.removeprefix("-").removeprefix("+").strip()
        if not digits.isdecimal() or int(digits[:3]) > MAX_EXPONENT:
            expected = f"a whole number from -{MAX_EXPONENT} to {MAX_EXPONENT}"
            cure = "sqrt(x) for a square root" if written.strip("( )") in {"0.5", ".5", "1/2", "1 / 2"} else None
            self.report(node.parts[1], "condition-number", f"`{written}` is no exponent", expected=expected, cure=cure)
            return None
        if base is None:
            return None
        exponent = -int(digits) if written.startswith("-") else int(digits)
        return self.arithmetic(node, lambda value: value**exponent, [base], raised(base.type, exponent))

    def sign(self, node: Node) -> Term | None:
        """Bind a sign in front of a number."""
        term = self.bind_number(node.parts[0])
        if term is None:
            return None
        if node.words[0] == "+":
            return Term(node, term.type, term.run, is_constant=term.is_constant)
        return self.arithmetic(node, lambda value: -value, [term], term.type)

    def bind_numbers(self, nodes: Sequence[Node]) -> list[Term] | None:
        """Bind nodes that all have to be numbers."""
        found = [self.bind_number(each) for each in nodes]
        terms = [each for each in found if each is not None]
        return terms if len(terms) == len(found) else None

    def arithmetic(
        self, node: Node, function: Callable[..., Any], terms: Sequence[Term], kind: TermType
    ) -> Term | None:
        """Return the term that computes ``function`` of bound terms; of written numbers it is computed at once."""
        run = arithmetic.computed(self.words_of(node), function, [each.run for each in terms])
        if not all(each.is_constant for each in terms):
            return Term(node, kind, run)
        found = run(())
        if not isinstance(found, Known):
            self.report(node, "condition-number", found.unknowns[0].reason)
            return None
        return Term(node, kind, arithmetic.constant(found.value), is_constant=True)

    def arithmetic_of(self, node: Node, function: Callable[..., Any], runs: Sequence[Run], kind: TermType) -> Term:
        """Return the term that computes ``function`` of terms that are evaluated already."""
        return Term(node, kind, arithmetic.computed(self.words_of(node), function, runs))

    def entry(self, node: Node) -> Term | None:
        """Bind a look-up in a table by name."""
        table, key = self.bind(node.parts[0]), self.bind(node.parts[1])
        if table is None or key is None:
            return None
        text = self.words_of(table.node)
        if table.type.kind != "map":
            cure = f"min({text}), max({text}) or length({text})" if table.type.kind == "numbers" else None
            what = f"`{text}` is {table.type}, not a table"
            self.report(table.node, "condition-kind", what, expected="a table of figures by name", cure=cure)
            return None
        if key.type.kind != "word":
            what = f"`{self.words_of(key.node)}` is {key.type}, looked up in a table"
            self.report(key.node, "condition-kind", what, expected="a word", cure=f'{text}["…"]')
            return None
        kind = TermType("number", table.type.unit, table.type.dimension)
        return Term(node, kind, arithmetic.entry(self.words_of(node), table.run, key.run))

    def call(self, node: Node) -> Term | None:
        """Bind a function."""
        return bind_call(self, node)


_BINDERS: dict[str, Callable[[Binder, Node], Term | None]] = {
    "either": Binder.logic, "both": Binder.logic, "denial": Binder.denial, "known_test": Binder.known_test,
    "compare": comparing.bind_compare, "within": comparing.bind_within, "outside": comparing.bind_within,
    "among": comparing.bind_among, "absent": comparing.bind_among, "sum": Binder.sum,
    "product": Binder.product, "sign": Binder.sign, "power": Binder.power,
    "entry": Binder.entry, "quantity": Binder.quantity, "word": Binder.word, "truth": Binder.truth,
    "name": Binder.name, "call": Binder.call, "listing": Binder.listing,
}  # fmt: skip
