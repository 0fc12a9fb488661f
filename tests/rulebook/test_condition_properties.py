"""Properties of the condition language: random conditions against an independent reading of them, and rubbish."""

import math
from fractions import Fraction

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from subject_doubles import STAGE, WHERE, Figures, value, verdict

from ampwarden.analysis.figures import Known, Unknown
from ampwarden.errors import ConditionError
from ampwarden.rulebook.conditions import Comparison, Verdict, compile_condition, compile_value


def mistakes_in(text, compiling=compile_condition):
    """The problems that a text is told to have, none when it compiles."""
    try:
        compiling(text, STAGE, WHERE)
    except ConditionError as trouble:
        return trouble.problems
    return ()


QUICK = settings(max_examples=150, deadline=None)

# Random conditions: each is a pair of its text and a function that answers it another way, in exact fractions and
# three-valued logic written out. Figures are small whole numbers, or unknown.


class Undefined(ArithmeticError):
    """No answer: an unknown figure, or a division by zero."""


def _lookup(name):
    def read(figures):
        if figures.get(name) is None:
            raise Undefined
        return Fraction(figures[name])

    return read


def _binary(sign, left, right):
    def compute(figures):
        a, b = left[1](figures), right[1](figures)
        if sign == "+":
            return a + b
        if sign == "-":
            return a - b
        if sign == "*":
            return a * b
        if b == 0:
            raise Undefined
        return a / b

    return f"({left[0]} {sign} {right[0]})", compute


def _strict(function, *terms):
    return lambda figures: function(*[term[1](figures) for term in terms])


ATOMS = st.one_of(
    st.sampled_from("abc").map(lambda name: (name, _lookup(name))),
    st.integers(0, 9).map(lambda number: (str(number), lambda figures, number=number: Fraction(number))),
)
TERMS = st.recursive(
    ATOMS,
    lambda inner: st.one_of(
        st.tuples(st.sampled_from("+-*/"), inner, inner).map(lambda each: _binary(*each)),
        inner.map(lambda each: (f"-({each[0]})", _strict(lambda x: -x, each))),
        inner.map(lambda each: (f"abs({each[0]})", _strict(abs, each))),
        st.tuples(inner, inner).map(lambda each: (f"max({each[0][0]}, {each[1][0]})", _strict(max, *each))),
        inner.map(lambda each: (f"({each[0]}) ** 2", _strict(lambda x: x * x, each))),
    ),
    max_leaves=6,
)
COMPARE = {
    "<": lambda a, b: a < b,
    "<=": lambda a, b: a <= b,
    ">": lambda a, b: a > b,
    ">=": lambda a, b: a >= b,
    "==": lambda a, b: a == b,
    "!=": lambda a, b: a != b,
}


def _settled(answer):
    def settle(figures):
        try:
            return answer(figures)
        except Undefined:
            return None

    return settle


def _comparison(sign, left, right):
    return f"{left[0]} {sign} {right[0]}", _settled(_strict(COMPARE[sign], left, right))


def _both(left, right):
    def answer(figures):
        values = (left[1](figures), right[1](figures))
        return False if False in values else None if None in values else True

    return f"({left[0]}) and ({right[0]})", answer


def _either(left, right):
    def answer(figures):
        values = (left[1](figures), right[1](figures))
        return True if True in values else None if None in values else False

    return f"({left[0]}) or ({right[0]})", answer


def _denied(inner):
    def answer(figures):
        found = inner[1](figures)
        return None if found is None else not found

    return f"not ({inner[0]})", answer


def _known(term):
    def answer(figures):
        try:
            term[1](figures)
        except Undefined:
            return False
        return True

    return f"{term[0]} is known", answer


LEAVES = st.tuples(st.sampled_from(list(COMPARE)), TERMS, TERMS).map(lambda each: _comparison(*each))
CONDITIONS = st.recursive(
    LEAVES | st.sampled_from("abc").map(lambda name: _known((name, _lookup(name)))),
    lambda inner: st.one_of(
        st.tuples(inner, inner).map(lambda each: _both(*each)),
        st.tuples(inner, inner).map(lambda each: _either(*each)),
        inner.map(_denied),
    ),
    max_leaves=6,
)
FIGURES = st.fixed_dictionaries({name: st.none() | st.integers(-5, 5) for name in "abc"})


@QUICK
@given(CONDITIONS, FIGURES)
def test_condition_answers_as_exact_three_valued_arithmetic_does(condition, figures):
    text, answer = condition
    mistakes = mistakes_in(text)
    if mistakes:
        # Only a division of written numbers by zero is refused at load.
        assert all("divides by zero" in each.what for each in mistakes)
        return
    compiled = compile_condition(text, STAGE, WHERE)
    given_figures = {name: float(number) for name, number in figures.items() if number is not None}
    found = compiled.evaluate(Figures(given_figures))
    assert found.value is answer(figures)
    assert bool(found.unknowns) is (found.value is None)


@QUICK
@given(CONDITIONS, FIGURES)
def test_not_turns_every_answer_and_its_comparison(condition, figures):
    given_figures = {name: float(number) for name, number in figures.items() if number is not None}
    try:
        plain = compile_condition(condition[0], STAGE, WHERE).evaluate(Figures(given_figures))
    except ConditionError:
        return
    turned = compile_condition(f"not ({condition[0]})", STAGE, WHERE).evaluate(Figures(given_figures))
    assert turned.value is (None if plain.value is None else not plain.value)
    if plain.comparison is not None:
        assert turned.comparison is not None
        assert (turned.comparison.measured, turned.comparison.limit) == (
            plain.comparison.measured,
            plain.comparison.limit,
        )


@QUICK
@given(CONDITIONS, FIGURES)
def test_comparison_of_a_decided_verdict_agrees_with_it(condition, figures):
    given_figures = {name: float(number) for name, number in figures.items() if number is not None}
    try:
        found = compile_condition(condition[0], STAGE, WHERE).evaluate(Figures(given_figures))
    except ConditionError:
        return
    held = found.comparison
    if found.value is None or held is None:
        return
    assert held.measured is not None
    assert held.limit is not None
    if not math.isclose(held.measured, held.limit, rel_tol=1e-6, abs_tol=1e-6):
        assert COMPARE[held.operator](held.measured, held.limit) is found.value


@QUICK
@given(
    st.floats(1e-3, 999.0),
    st.sampled_from([("k", 1e3), ("M", 1e6), ("m", 1e-3), ("u", 1e-6), ("n", 1e-9), ("p", 1e-12), ("", 1.0)]),
    st.sampled_from(["V", "A", "ohm", "F", "H", "Hz", "W", "s"]),
)
def test_prefix_scales_a_quantity(number, prefix, unit):
    found = value(f"{number:.6f} {prefix[0]}{unit}")
    assert found.value == pytest.approx(float(f"{number:.6f}") * prefix[1], rel=1e-12)


@QUICK
@given(st.floats(allow_nan=False), st.floats(allow_nan=False), st.sampled_from(list(COMPARE)))
def test_comparison_turned_round_is_the_same(a, b, sign):
    turned = {"<": ">", "<=": ">=", ">": "<", ">=": "<=", "==": "==", "!=": "!="}[sign]
    assert verdict(f"a {sign} b", a=a, b=b).value is verdict(f"b {turned} a", a=a, b=b).value


@QUICK
@given(st.floats(-1e9, 1e9), st.floats(-1e9, 1e9), st.floats(-1e9, 1e9))
def test_range_is_two_comparisons_and_its_opposite_the_other(x, low, high):
    inside = verdict("a in b .. c", a=x, b=low, c=high).value
    assert inside is verdict("b <= a and a <= c", a=x, b=low, c=high).value
    assert inside is verdict("b <= a <= c", a=x, b=low, c=high).value
    assert verdict("a not in b .. c", a=x, b=low, c=high).value is (not inside)


@QUICK
@given(st.lists(st.none() | st.integers(0, 3), max_size=5))
def test_any_and_all_are_or_and_and_over_the_members(numbers):
    members = {"input_pins": tuple(Figures({} if each is None else {"gain": float(each)}) for each in numbers)}
    answers = [None if each is None else each > 1 for each in numbers]
    any_ = True if True in answers else None if None in answers else False
    all_ = False if False in answers else None if None in answers else True
    assert verdict("any(input_pins, gain > 1)", members=members).value is any_
    assert verdict("all(input_pins, gain > 1)", members=members).value is all_
    counted = value("count(input_pins, gain > 1)", members=members)
    assert counted == (Known(answers.count(True)) if None not in answers else counted)
    assert isinstance(counted, Unknown) is (None in answers)


# No figure makes a condition raise

ANY_FIGURE = st.one_of(
    st.none(),
    st.floats(),
    st.integers(),
    st.booleans(),
    st.text(max_size=3),
    st.lists(st.floats() | st.none() | st.text(max_size=2), max_size=3).map(tuple),
    st.dictionaries(st.text(max_size=2), st.floats() | st.none() | st.text(max_size=1), max_size=2),
    st.just(Unknown("not computed")),
)
EVERY_OPERATION = (
    "a + b * c - a / b > c ** 3 or a ** -2 < 1",
    "sqrt(a) > log10(b) or db(c) > 1 or abs(a) == b",
    "min(a, b, c) < max(a, b) or sum(corner_hz) > 1 Hz or min(gains) > 0 or max(corner_hz) > min(corner_hz)",
    "a in b .. c or a not in b .. c or a in [b, c, 1] or b <= a < c",
    'name in nets or "x" in gains or gains[name] > a or length(nets) > length(corner_hz) + length(gains)',
    "if(p, a, b) > c or p == q or name != topology or p and not q",
    "any(input_pins, gain > a and is_open) or all(input_pins, name in nets)",
    "count(input_pins, gain > 1) > a or max(input_pins, gain) > 1 or length(list(input_pins, name)) > b",
    "a is known and (a / b) is unknown and corner_hz is known and nets is known and gains is known",
)
NAMES = ("a", "b", "c", "p", "q", "name", "topology", "nets", "gains", "corner_hz", "gain", "is_open")


@QUICK
@given(st.sampled_from(EVERY_OPERATION), st.dictionaries(st.sampled_from(NAMES), ANY_FIGURE))
@example(EVERY_OPERATION[0], {"a": 10**400, "b": 10**400, "c": 10**200})
@example(EVERY_OPERATION[0], {"a": math.inf, "b": -math.inf, "c": 1e308})
@example(EVERY_OPERATION[1], {"a": 10**400, "b": 10**400, "c": 10**400})
@example(EVERY_OPERATION[2], {"corner_hz": (10**400, 1.0), "a": 1.0})
@example(EVERY_OPERATION[3], {"a": 10**400, "b": 1.0, "c": 2.0})
def test_no_figures_make_a_condition_raise(text, figures):
    members = {"input_pins": (Figures(figures), Figures({}))}
    found = compile_condition(text, STAGE, WHERE).evaluate(Figures(figures, members))
    assert isinstance(found, Verdict)
    assert found.value in (True, False, None)
    assert found.comparison is None or isinstance(found.comparison, Comparison)


# Rubbish is told as a mistake, quickly

PIECES = st.sampled_from(
    [*NAMES, "input_pins", "supply_v", "and", "or", "not", "in", "is", "known", "is known", "true", "if", "any", "all"]
    + ["count", "min", "max", "(", ")", "[", "]", ",", "..", "<", "<=", "==", "!=", "+", "-", "*", "**", "/", "=", "!"]
    + [
        "1",
        "2.5",
        "10 nF",
        "5 V",
        "1 %",
        '"x"',
        "'",
        '"',
        "#",
        "\n",
        "outer.",
        ".",
        "Ω",
        "µ",
        "\u2212",
        "{",
        "\\",
        "\0",
    ]
)


@settings(max_examples=400, deadline=None)
@given(st.lists(PIECES, max_size=14).map(" ".join) | st.text(max_size=40))
def test_any_text_compiles_or_is_told_as_a_mistake(text):
    mistakes = mistakes_in(text, compile_value)
    for each in mistakes:
        assert each.location is not None
        assert each.location.line >= WHERE.line
        assert each.location.column is not None
        assert 1 <= each.location.column <= len(text) + 1
    if not mistakes:
        assert isinstance(compile_value(text, STAGE, WHERE).evaluate(Figures()), Known | Unknown)


@pytest.mark.parametrize(
    "unit",
    [
        "a + ",
        "a and ",
        "(",
        "not ",
        "-",
        "[",
        "min(",
        "any(input_pins, ",
        "1 V/",
        "a ** ",
        '"',
        "a in ",
        "if(p, ",
        "a[",
        "#",
    ],
)
def test_longest_text_is_read_or_refused(unit):
    text = (unit * 4000)[:3990] + "gain"
    if not mistakes_in(text):
        assert compile_condition(text, STAGE, WHERE).evaluate(Figures()).value is None


@pytest.mark.parametrize("count", [1, 10, 300])
def test_each_figure_is_asked_for_once_for_each_mention(count):
    reading = Figures(a=0.0)
    assert compile_condition(" and ".join(["a < 1"] * count), STAGE, WHERE).evaluate(reading).value is True
    assert len(reading.asked) == count
