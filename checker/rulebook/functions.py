"""The functions of the condition language: magnitudes, choices, and questions about related subjects."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from ..quantities import PLAIN, nearest_names
from . import evaluation as at_work
from .comparing import check_units
from .syntax import Node
from .terms import NUMBER, WORDS, Term, TermType, goes_with, joined, raised

if TYPE_CHECKING:
    from .binding import Binder

# A question about members inside one about members is asked once for each pair; deeper ones would cost too much.
MAX_QUANTIFIERS = 2


@dataclass(frozen=True, slots=True)
class Function:
    """A function: how it is written, what it does, how many arguments it takes, how a call is bound."""

    usage: str
    text: str
    fewest: int
    most: int
    bind: Callable[[Binder, Node], Term | None]


def bind_call(binder: Binder, node: Node) -> Term | None:
    """Bind a call of a function by its name."""
    name = node.words[0]
    function = FUNCTIONS.get(name)
    if function is None:
        nearest = nearest_names(name, FUNCTIONS)
        what, cure = f"unknown function `{name}`", None
        if binder.resolve(name) is not None:
            what, cure = f"`{name}` is a figure, not a function", f"write {name} without brackets, or {name} * (…)"
        elif not nearest:
            cure = f"functions: {', '.join(FUNCTIONS)}"
        binder.report(_head(node), "condition-function", what, nearest=nearest, cure=cure)
        return None
    if not function.fewest <= len(node.parts) <= function.most:
        what = f"`{name}` with {len(node.parts)} argument{'' if len(node.parts) == 1 else 's'}"
        binder.report(_head(node), "condition-arguments", what, expected=function.usage)
        return None
    return function.bind(binder, node)


def _head(node: Node) -> Node:
    return Node(node.what, node.start, node.start + len(node.words[0]))


# Numbers --------------------------------------------------------------------------------------------------------


def _magnitude(binder: Binder, node: Node) -> Term | None:
    term = binder.bind_number(node.parts[0])
    if term is None:
        return None
    return binder.arithmetic(node, abs, [term], term.type)


def _root(binder: Binder, node: Node) -> Term | None:
    term = binder.bind_number(node.parts[0])
    if term is None:
        return None
    return binder.arithmetic(node, _sqrt, [term], raised(term.type, 0.5))


def _sqrt(value: float) -> float:
    if value < 0:
        raise at_work.NoFigure("takes the square root of a negative figure")
    return math.sqrt(value)


def _log10(value: float) -> float:
    if value <= 0:
        raise at_work.NoFigure("takes the logarithm of a figure that is not above zero")
    return math.log10(value)


def _decibel(value: float) -> float:
    if value == 0:
        raise at_work.NoFigure("takes the level of a zero in dB")
    return 20.0 * math.log10(abs(value))


def _logarithm(binder: Binder, node: Node) -> Term | None:
    name = node.words[0]
    term = binder.bind_number(node.parts[0])
    if term is None:
        return None
    text = binder.words_of(term.node)
    if term.type.dimension != PLAIN:
        what = f"`{text}` is {term.type}, of which no logarithm is taken"
        cure = f"divide it by a reference: {name}({text} / (1 {term.type.unit}))"
        binder.report(term.node, "condition-unit", what, expected="a plain number, such as a gain", cure=cure)
        return None
    if name == "db" and term.type.unit == "dB":
        binder.report(term.node, "condition-unit", f"`{text}` is a level in dB already", cure=f"write {text} alone")
        return None
    kind = TermType("number", "dB" if name == "db" else "")
    return binder.arithmetic(node, _decibel if name == "db" else _log10, [term], kind)


def _extreme(binder: Binder, node: Node) -> Term | None:
    """Bind min, max and sum: of numbers, of a list or table, or of a term of each member of a relation."""
    name = node.words[0]
    function = _COLLECTIVE[name]
    first = node.parts[0]
    if len(node.parts) in {2, 3} and first.what == "name" and binder.resolve(first.words[0]) is None:
        relation = binder.relation(first.words[0])
        if relation is not None:
            inside = _inside(binder, node)
            if inside is None:
                return None
            term, run = inside
            if term.type.kind != "number":
                what = f"`{binder.words_of(term.node)}` is {term.type}, used as a number"
                binder.report(term.node, "condition-kind", what, expected="a number")
                return None
            return binder.arithmetic_of(node, function, [run], term.type)
    if len(node.parts) == 1:
        single = binder.bind(first)
        if single is None:
            return None
        if single.type.kind not in {"numbers", "map"}:
            text = binder.words_of(first)
            what = f"`{text}` is {single.type}, nothing to take the {name} of"
            cure = f"{name}({text}, …)" if single.type.kind == "number" else None
            binder.report(first, "condition-kind", what, expected="a list or table of figures", cure=cure)
            return None
        kind = TermType("number", single.type.unit, single.type.dimension)
        return binder.arithmetic(node, lambda group: function(_figures(group)), [single], kind)
    terms = binder.bind_numbers(node.parts)
    if terms is None:
        return None
    kind = terms[0].type
    for each, after in zip(terms, terms[1:], strict=False):
        if not check_units(binder, Term(each.node, kind, each.run), after, "together with"):
            return None
        kind = joined(kind, after.type)
    return binder.arithmetic(node, lambda *values: function(values), terms, kind)


def _figures(group: Any) -> tuple[float, ...]:
    values = tuple(group.values()) if isinstance(group, Mapping) else tuple(group)
    if any(isinstance(each, bool) or not isinstance(each, int | float) or math.isnan(each) for each in values):
        raise at_work.NoFigure("rests on a figure that is not known")
    return values


def _smallest(values: tuple[float, ...]) -> float:
    if not values:
        raise at_work.NoFigure("has no figures to choose from")
    return min(values)


def _largest(values: tuple[float, ...]) -> float:
    if not values:
        raise at_work.NoFigure("has no figures to choose from")
    return max(values)


def _total(values: tuple[float, ...]) -> float:
    return sum(values)


_COLLECTIVE: dict[str, Callable[[tuple[float, ...]], float]] = {"min": _smallest, "max": _largest, "sum": _total}


def _length(binder: Binder, node: Node) -> Term | None:
    term = binder.bind(node.parts[0])
    if term is None:
        return None
    if term.type.kind not in {"words", "numbers", "map"}:
        text = binder.words_of(term.node)
        what = f"`{text}` is {term.type}, which has no length"
        binder.report(term.node, "condition-kind", what, expected="a list or a table")
        return None
    return binder.arithmetic(node, len, [term], NUMBER)


def _choice(binder: Binder, node: Node) -> Term | None:
    test = binder.bind_test(node.parts[0])
    first, second = binder.bind(node.parts[1]), binder.bind(node.parts[2])
    if test is None or test.test is None or first is None or second is None:
        return None
    if first.type.kind != second.type.kind or first.type.kind in {"numbers", "map"}:
        what = f"`{binder.words_of(first.node)}` is {first.type}, the other choice {second.type}"
        binder.report(node, "condition-kind", what, expected="two numbers, two words or two conditions")
        return None
    kind = first.type
    if kind.kind == "number":
        if not goes_with(first.type, second.type):
            check_units(binder, first, second, "an alternative to")
            return None
        kind = joined(first.type, second.type)
    else:
        kind = TermType(kind.kind)
    run = at_work.chosen(test.test, first.run, second.run)
    constant = test.is_constant and first.is_constant and second.is_constant
    return Term(node, kind, run, at_work.asked(run) if kind.kind == "flag" else None, constant)


# Related subjects -----------------------------------------------------------------------------------------------


class _Members:
    """The names of a relation's members, in force while the terms inside a question are bound."""

    def __init__(self, binder: Binder, node: Node) -> None:
        self.binder = binder
        self.node = node
        self.relation = ""
        self.level = -1

    def enter(self) -> bool:
        binder, first = self.binder, self.node.parts[0]
        name = self.node.words[0]
        if first.what != "name":
            what = f"`{binder.words_of(first)}` is no relation"
            binder.report(first, "condition-relation", what, expected=FUNCTIONS[name].usage)
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


def _question(binder: Binder, node: Node) -> Term | None:
    """Bind any and all."""
    members = _Members(binder, node)
    if not members.enter():
        return None
    term = members.bind(node.parts[1], as_test=True)
    members.leave()
    if term is None or term.test is None:
        return None
    return binder.flag(node, at_work.quantified(members.relation, members.level, term.test, node.words[0] == "any"))


def _number_of(binder: Binder, node: Node) -> Term | None:
    """Bind count."""
    members = _Members(binder, node)
    if not members.enter():
        return None
    test = None
    if len(node.parts) == 2:
        term = members.bind(node.parts[1], as_test=True)
        if term is None:
            members.leave()
            return None
        test = term.test
    members.leave()
    return Term(node, NUMBER, at_work.counted(members.relation, members.level, test))


def _inside(binder: Binder, node: Node) -> tuple[Term, at_work.Run] | None:
    """Bind the term (and the test) that is gathered over the members of a relation."""
    members = _Members(binder, node)
    if not members.enter():
        return None
    term = members.bind(node.parts[1], as_test=False)
    test = members.bind(node.parts[2], as_test=True) if len(node.parts) == 3 else None
    members.leave()
    if term is None or (len(node.parts) == 3 and test is None):
        return None
    return term, at_work.gathered(members.relation, members.level, term.run, test.test if test else None)


def _list(binder: Binder, node: Node) -> Term | None:
    """Bind list: a word of each member of a relation."""
    inside = _inside(binder, node)
    if inside is None:
        return None
    term, run = inside
    if term.type.kind not in {"word", "number"}:
        what = f"`{binder.words_of(term.node)}` is {term.type}, listed for each member"
        binder.report(term.node, "condition-kind", what, expected="a word or a number")
        return None
    kind = WORDS if term.type.kind == "word" else TermType("numbers", term.type.unit, term.type.dimension)
    return Term(node, kind, run)


FUNCTIONS: dict[str, Function] = {
    "abs": Function("abs(x)", "magnitude", 1, 1, _magnitude),
    "min": Function("min(x, y, …), min(list) or min(relation, x)", "the smallest", 1, 99, _extreme),
    "max": Function("max(x, y, …), max(list) or max(relation, x)", "the largest", 1, 99, _extreme),
    "sum": Function("sum(list) or sum(relation, x)", "the total, 0 of none", 1, 99, _extreme),
    "sqrt": Function("sqrt(x)", "square root, of the unit too", 1, 1, _root),
    "log10": Function("log10(x)", "logarithm of a plain number", 1, 1, _logarithm),
    "db": Function("db(x)", "level of a ratio's magnitude, 20 * log10", 1, 1, _logarithm),
    "length": Function("length(list)", "how many a list or table holds", 1, 1, _length),
    "if": Function("if(condition, x, y)", "x where the condition is true, else y", 3, 3, _choice),
    "any": Function("any(relation, condition)", "true for one member at least", 2, 2, _question),
    "all": Function("all(relation, condition)", "true for every member, and of none", 2, 2, _question),
    "count": Function("count(relation) or count(relation, condition)", "how many members", 1, 2, _number_of),
    "list": Function("list(relation, word) or list(relation, word, condition)", "a word of each member", 2, 3, _list),
}
