"""The functions of the condition language: magnitudes, choices, and questions about related subjects."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from ..quantities import PLAIN, nearest_names
from . import arithmetic
from . import evaluation as at_work
from .comparing import check_units
from .questions import bind_count, bind_list, bind_question, gathered
from .syntax import Node
from .terms import NUMBER, Term, TermType, goes_with, joined, raised

if TYPE_CHECKING:
    from .binding import Binder


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
        raise arithmetic.NoFigure("takes the square root of a negative figure")
    return math.sqrt(value)


def _log10(value: float) -> float:
    if value <= 0:
        raise arithmetic.NoFigure("takes the logarithm of a figure that is not above zero")
    return math.log10(value)


def _decibel(value: float) -> float:
    if value == 0:
        raise arithmetic.NoFigure("takes the level of a zero in dB")
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
            inside = gathered(binder, node)
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
        raise arithmetic.NoFigure("rests on a figure that is not known")
    return values


def _smallest(values: tuple[float, ...]) -> float:
    if not values:
        raise arithmetic.NoFigure("has no figures to choose from")
    return min(values)


def _largest(values: tuple[float, ...]) -> float:
    if not values:
        raise arithmetic.NoFigure("has no figures to choose from")
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
    constant = test.is_constant and first.is_constant and second.is_constant
    if first.test is not None and second.test is not None:
        return binder.flag(node, at_work.chosen_test(test.test, first.test, second.test), is_constant=constant)
    return Term(node, kind, arithmetic.chosen(test.test, first.run, second.run), is_constant=constant)


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
    "any": Function("any(relation, condition)", "true for one member at least", 2, 2, bind_question),
    "all": Function("all(relation, condition)", "true for every member, and of none", 2, 2, bind_question),
    "count": Function("count(relation) or count(relation, condition)", "how many members", 1, 2, bind_count),
    "list": Function(
        "list(relation, word) or list(relation, word, condition)", "a word of each member", 2, 3, bind_list
    ),
}
