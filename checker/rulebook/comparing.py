"""Comparisons bound: what may be held against what, and the cure where it may not."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from ..quantities import nearest_names
from . import evaluation as at_work
from .evaluation import Test
from .syntax import Node
from .terms import WORD, Term, compared_unit, goes_with, unit_cure

if TYPE_CHECKING:
    from .binding import Binder


def bind_compare(binder: Binder, node: Node) -> Term | None:
    """Bind a comparison or a chain of two in one direction."""
    operators = node.words
    if len(operators) > 2 or (len(operators) == 2 and not _is_range(operators)):
        cure = "low <= x <= high for a range, else join comparisons with and"
        binder.report(node, "condition-chain", "a chain of comparisons that is no range", cure=cure)
        return None
    terms = _sides(binder, node.parts)
    if terms is None:
        return None
    tests = [
        _pair(binder, node, operator, left, right, measures_right=len(terms) == 3 and index == 0)
        for index, (operator, left, right) in enumerate(zip(operators, terms, terms[1:], strict=False))
    ]
    whole = [each for each in tests if each is not None]
    if len(whole) < len(tests):
        return None
    constant = all(each.is_constant for each in terms)
    return binder.flag(node, whole[0] if len(whole) == 1 else at_work.every(whole), is_constant=constant)


def _sides(binder: Binder, nodes: Sequence[Node]) -> list[Term] | None:
    terms: list[Term | None] = []
    for each in nodes:
        terms.append(binder.bind(each))
        before = terms[-1]
        binder.expects_word = before is not None and before.type.kind in {"word", "words"}
    binder.expects_word = False
    whole = [each for each in terms if each is not None]
    return whole if len(whole) == len(terms) else None


def _pair(binder: Binder, node: Node, operator: str, left: Term, right: Term, *, measures_right: bool) -> Test | None:
    kinds = (left.type.kind, right.type.kind)
    if kinds == ("number", "number"):
        if not check_units(binder, left, right, "compared with"):
            return None
        unit = compared_unit(left.type, right.type)
        turned = measures_right or (left.is_constant and not right.is_constant)
        return at_work.compared(operator, left.run, right.run, unit, measures_right=turned)
    if kinds in {("word", "word"), ("flag", "flag")}:
        if operator not in {"==", "!="}:
            what = f"`{operator}` puts {left.type} in an order it does not have"
            binder.report(node, "condition-kind", what, expected="== or !=")
            return None
        if not (check_word(binder, left, right) and check_word(binder, right, left)):
            return None
        return at_work.related(left.run, right.run, at_work.same_word, wanted=operator == "==")
    _mixed(binder, node, left, right)
    return None


def _mixed(binder: Binder, node: Node, left: Term, right: Term) -> None:
    a, b = binder.words_of(left.node), binder.words_of(right.node)
    what = f"`{a}` is {left.type}, compared with {right.type}"
    kinds = {left.type.kind: a, right.type.kind: b}
    cure = None
    if "words" in kinds and "word" in kinds:
        cure = f"{kinds['word']} in {kinds['words']}"
    elif "numbers" in kinds and "number" in kinds:
        cure = f"min({kinds['numbers']}) or max({kinds['numbers']})"
    elif "map" in kinds:
        cure = f'{kinds["map"]}["…"]'
    elif "word" in kinds and left.node.what == "word":
        cure = "write names without quotes"
    elif "word" in kinds and right.node.what == "word" and "number" in kinds:
        cure = "write a number with its unit, without quotes"
    elif "flag" in kinds and "number" in kinds:
        cure = f"`{kinds['flag']}` stands alone: {kinds['flag']}, or not {kinds['flag']}"
    binder.report(node, "condition-kind", what, cure=cure)


def check_units(binder: Binder, left: Term, right: Term, verb: str) -> bool:
    """Report two numbers whose units do not go together."""
    a, b = left.type, right.type
    if goes_with(a, b):
        plain, level = (a, b) if b.unit == "dB" else (b, a)
        written = right if b.unit == "dB" else left
        other = left if b.unit == "dB" else right
        if not (level.unit == "dB" and written.node.what == "quantity" and plain.unit == "" and not plain.is_zero):
            return True
        name = binder.words_of(other.node)
        if other.is_constant or "db" in name.casefold() or verb != "compared with":
            return True
        what = f"`{name}` is a ratio, {verb} a level in dB"
        binder.report(other.node, "condition-unit", what, cure=f"db({name}), or a limit without dB")
        return False
    right_text, left_text = binder.words_of(right.node), binder.words_of(left.node)
    what = f"`{left_text}` is {a}, {verb} {b}"
    if left.node.what == "quantity" and right.node.what != "quantity":
        cure = unit_cure(b, a, left_text, is_written=True)
    else:
        cure = unit_cure(a, b, right_text, is_written=right.node.what == "quantity")
    binder.report(right.node, "condition-unit", what, expected=str(a), cure=cure)
    return False


def check_word(binder: Binder, figure: Term, written: Term) -> bool:
    """Report a written word that a figure can never be."""
    if written.node.what != "word" or not figure.type.words:
        return True
    word = written.node.words[0][1:-1]
    if at_work.word_among(word, figure.type.words):
        return True
    what = f"`{binder.words_of(figure.node)}` is never `{word}`"
    nearest = nearest_names(word, figure.type.words)
    shown = figure.type.words[:8]
    expected = None if nearest else f"one of {', '.join(shown)}{', …' if len(figure.type.words) > 8 else ''}"
    binder.report(written.node, "condition-word", what, expected=expected, nearest=nearest)
    return False


def bind_within(binder: Binder, node: Node) -> Term | None:
    """Bind x in low .. high and x not in low .. high, bounds included."""
    found = [binder.bind_number(each) for each in node.parts]
    terms = [each for each in found if each is not None]
    if len(terms) < 3:
        return None
    figure, low, high = terms
    pairs = ((figure, low, "compared with"), (figure, high, "compared with"), (low, high, "in one range with"))
    if not all(check_units(binder, *each) for each in pairs):
        return None
    if low.is_constant and high.is_constant:
        bounds = (low.run(()), high.run(()))
        values = [each.value for each in bounds if not isinstance(each, at_work.Missing)]
        if len(values) == 2 and values[0] > values[1]:
            text = binder.words_of(low.node), binder.words_of(high.node)
            what = f"the range {text[0]} .. {text[1]} is empty"
            binder.report(low.node, "condition-range", what, cure=f"{text[1]} .. {text[0]}")
            return None
    unit = compared_unit(figure.type, low.type, high.type)
    constant = all(each.is_constant for each in terms)
    if node.what == "outside":
        return binder.flag(node, at_work.outside(figure.run, low.run, high.run, unit), is_constant=constant)
    tests = (
        at_work.compared(">=", figure.run, low.run, unit, measures_right=False),
        at_work.compared("<=", figure.run, high.run, unit, measures_right=False),
    )
    return binder.flag(node, at_work.every(tests), is_constant=constant)


def bind_among(binder: Binder, node: Node) -> Term | None:
    """Bind membership: a word in a list or a table, a number in a list."""
    terms = _sides(binder, node.parts)
    if terms is None:
        return None
    item, group = terms
    wanted = node.what == "among"
    kinds = (item.type.kind, group.type.kind)
    constant = item.is_constant and group.is_constant
    if kinds in {("word", "words"), ("word", "map")}:
        if not check_word(binder, group, item):
            return None
        if group.node.what == "listing":
            written = [Term(each, WORD, group.run, is_constant=True) for each in group.node.parts]
            if not all([check_word(binder, item, each) for each in written]):
                return None
        return binder.flag(
            node, at_work.related(item.run, group.run, at_work.word_among, wanted=wanted), is_constant=constant
        )
    if kinds == ("number", "numbers"):
        if not check_units(binder, item, group, "looked for in"):
            return None
        return binder.flag(
            node, at_work.related(item.run, group.run, at_work.number_among, wanted=wanted), is_constant=constant
        )
    a, b = binder.words_of(item.node), binder.words_of(group.node)
    cure = None
    if kinds == ("word", "word"):
        cure = f"{a} {'==' if wanted else '!='} {b}, or a list in brackets: [{b}]"
    elif kinds == ("number", "number"):
        cure = f"{a} in low .. high for a range"
    elif kinds[1] == "words":
        cure = f'"…" in {b}'
    what = f"`{a}` is {item.type}, looked for in {group.type}"
    binder.report(node, "condition-kind", what, expected="a word in a list of words, or a number in a range", cure=cure)
    return None


def _is_range(operators: Sequence[str]) -> bool:
    return all(each in {"<", "<="} for each in operators) or all(each in {">", ">="} for each in operators)
