"""Questions about related subjects bound: the names of a relation's members, and the terms that speak of them."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..quantities import nearest_names
from . import members
from .evaluation import Run
from .syntax import Node
from .terms import NUMBER, WORDS, Term, TermType

if TYPE_CHECKING:
    from .binding import Binder

# A question about members inside one about members is asked once for each pair; deeper ones would cost too much.
MAX_QUANTIFIERS = 2


class _Members:
    """The names of a relation's members, in force while the terms inside a question are bound."""

    def __init__(self, binder: Binder, node: Node) -> None:
        self.binder = binder
        self.node = node
        self.relation = ""
        self.level = -1

    def enter(self) -> bool:
        binder, first = self.binder, self.node.parts[0]
        if first.what != "name":
            what = f"`{binder.words_of(first)}` is no relation"
            binder.report(first, "condition-relation", what, expected="a relation's name")
            return False
        self.relation = first.words[0]
        found = binder.relation(self.relation)
        if found is None:
            known = [each for scope, _ in reversed(binder.scopes) for each in scope.known() if scope.related(each)]
            what = f"unknown relation `{self.relation}`"
            if binder.resolve(self.relation) is not None:
                what = f"`{self.relation}` is a figure, not a relation"
            cure = f"relations here: {', '.join(dict.fromkeys(known))}" if known else "this subject has no relations"
            nearest = nearest_names(self.relation, known)
            binder.report(first, "condition-relation", what, nearest=nearest, cure=None if nearest else cure)
            return False
        if len(binder.scopes) > MAX_QUANTIFIERS:
            what = f"questions about members nested deeper than {MAX_QUANTIFIERS}"
            binder.report(first, "condition-too-deep", what, cure="ask the inner question in a measure of the member")
            return False
        self.level, scope = found
        binder.note(self.level, self.relation)
        prefix = binder.scopes[self.level][1]
        binder.scopes.append((scope, f"{prefix}.{self.relation}" if prefix else self.relation))
        return True

    def bind(self, node: Node, *, as_test: bool) -> Term | None:
        """Bind a term of a member; one that does not speak of the member is a mistake."""
        binder = self.binder
        own = len(binder.scopes) - 1
        held, binder.levels = binder.levels, set()
        before = len(binder.problems)
        term = binder.bind_test(node) if as_test else binder.bind(node)
        speaks, binder.levels = own in binder.levels, held | binder.levels
        if term is not None and not speaks and len(binder.problems) == before:
            what = f"`{binder.words_of(node)}` does not speak of the {self.relation}"
            names = ", ".join(binder.scopes[own][0].known()[:10])
            cure = f"count({self.relation}) asks how many there are" if as_test else None
            expected = f"a figure of each member: {names}"
            binder.report(node, "condition-relation", what, expected=expected, cure=cure)
            return None
        return term

    def leave(self) -> None:
        own = len(self.binder.scopes) - 1
        self.binder.levels.discard(own)
        self.binder.scopes.pop()


def bind_question(binder: Binder, node: Node) -> Term | None:
    """Bind any and all."""
    asked = _Members(binder, node)
    if not asked.enter():
        return None
    term = asked.bind(node.parts[1], as_test=True)
    asked.leave()
    if term is None or term.test is None:
        return None
    return binder.flag(node, members.quantified(asked.relation, asked.level, term.test, node.words[0] == "any"))


def bind_count(binder: Binder, node: Node) -> Term | None:
    """Bind count."""
    asked = _Members(binder, node)
    if not asked.enter():
        return None
    test = None
    if len(node.parts) == 2:
        term = asked.bind(node.parts[1], as_test=True)
        if term is None:
            asked.leave()
            return None
        test = term.test
    asked.leave()
    return Term(node, NUMBER, members.counted(asked.relation, asked.level, test))


def gathered(binder: Binder, node: Node) -> tuple[Term, Run] | None:
    """Bind the term (and the test) that is gathered over the members of a relation."""
    asked = _Members(binder, node)
    if not asked.enter():
        return None
    term = asked.bind(node.parts[1], as_test=False)
    test = asked.bind(node.parts[2], as_test=True) if len(node.parts) == 3 else None
    asked.leave()
    if term is None or (len(node.parts) == 3 and test is None):
        return None
    return term, members.gathered(asked.relation, asked.level, term.run, test.test if test else None)


def bind_list(binder: Binder, node: Node) -> Term | None:
    """Bind list: a word of each member of a relation."""
    inside = gathered(binder, node)
    if inside is None:
        return None
    term, run = inside
    if term.type.kind not in {"word", "number"}:
        what = f"`{binder.words_of(term.node)}` is {term.type}, listed for each member"
        binder.report(term.node, "condition-kind", what, expected="a word or a number")
        return None
    kind = WORDS if term.type.kind == "word" else TermType("numbers", term.type.unit, term.type.dimension)
    return Term(node, kind, run)
