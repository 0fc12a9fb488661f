"""The condition language: what a condition answers for given figures."""

import math
import subprocess
import sys

import pytest
from subject_doubles import PIN, STAGE, WHERE, Figures, Names, value, verdict

from ampwarden.analysis.figures import Known, Unknown
from ampwarden.rulebook.conditions import Comparison, compile_condition, compile_value, describe_language, prepare

# Quantities: prefixes of the SI brochure (BIPM, 9th edition, table 7), percent, decibels and degrees as plain numbers.


@pytest.mark.parametrize(
    ("text", "expected", "unit"),
    [
        ("10 nF", 1e-8, "F"),
        ("10nF", 1e-8, "F"),
        ("10\u00a0nF", 1e-8, "F"),
        ("4.7 kohm", 4700.0, "ohm"),
        ("4.7 kΩ", 4700.0, "ohm"),
        ("1 Mohm", 1e6, "ohm"),
        ("5 mV", 5e-3, "V"),
        ("2 uA", 2e-6, "A"),
        ("2 µA", 2e-6, "A"),
        ("1.5e3 Hz", 1500.0, "Hz"),
        ("1 %", 0.01, "%"),
        ("60 dB", 60.0, "dB"),
        ("45 deg", 45.0, "deg"),
        ("25 degC", 25.0, "degC"),
        ("-40 degC", -40.0, "degC"),
        ("2 V/us", 2e6, "V/s"),
        ("5 nV/rtHz", 5e-9, "V/rtHz"),
        ("5 nV/√Hz", 5e-9, "V/rtHz"),
        ("10 ppm", 1e-5, ""),
        ("3", 3.0, ""),
        (".5", 0.5, ""),
    ],
)
def test_quantity_is_read_in_si_units(text, expected, unit):
    compiled = compile_value(text, STAGE, WHERE)
    assert compiled.evaluate(Figures()).value == pytest.approx(expected, rel=1e-12)
    assert compiled.unit == unit


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        ("load_ohm * output_a", "V"),
        ("supply_v / load_ohm", "A"),
        ("supply_v ** 2 / load_ohm", "W"),
        ("load_ohm * decoupling_f", "s"),
        ("1 / (2 * pi * load_ohm * decoupling_f)", "Hz"),
        ("supply_v / output_v", ""),
        ("output_a / decoupling_f", "V/s"),
        ("noise * sqrt(bandwidth_hz)", "V"),
        ("sqrt(load_ohm ** 2)", "ohm"),
        ("2 * cmrr_db", "dB"),
        ("db(gain)", "dB"),
        ("temperature_c - 25 degC", "K"),
        ("temperature_c + rise_k", "degC"),
        ("(temperature_c - 25 degC) / (supply_v * output_a)", "K/W"),
        ("mismatch", "%"),
        ("mismatch * 2 V", "V"),
        ("max(supply_v, 0)", "V"),
        ("max(corner_hz)", "Hz"),
        ("count(input_pins)", ""),
        ("supply_v * supply_v", "V^2"),
    ],
)
def test_units_are_carried_through_arithmetic(text, unit):
    assert compile_value(text, STAGE, WHERE).unit == unit


def test_arithmetic_follows_the_usual_order():
    assert value("1 + 2 * 3 ** 2 - 8 / 4 / 2").value == 1 + 2 * 3**2 - 8 / 4 / 2
    assert value("-2 ** 2").value == -4
    assert value("2 ** -1").value == 0.5
    assert value("(1 + 2) * 3").value == 9


def test_corner_frequency_of_an_rc_network():
    # f = 1 / (2 pi R C): 1 kohm with 100 nF gives 1.59 kHz.
    found = value("1 / (2 * pi * load_ohm * decoupling_f)", load_ohm=1e3, decoupling_f=100e-9)
    assert found.value == pytest.approx(1591.549, rel=1e-6)


# Comparison


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("supply_v < 12 V", False),
        ("supply_v <= 12 V", True),
        ("supply_v > 11.9 V", True),
        ("supply_v >= 12.1 V", False),
        ("supply_v == 12 V", True),
        ("supply_v == 12000 mV", True),
        ("supply_v != 12 V", False),
        ("supply_v > 0", True),
        ("0 < supply_v", True),
        ("10 V < supply_v < 15 V", True),
        ("15 V > supply_v > 12 V", False),
        ("supply_v in 10 V .. 15 V", True),
        ("supply_v in 12 V..15 V", True),
        ("supply_v in 0 .. 11 V", False),
        ("supply_v not in 10 V .. 15 V", False),
        ("supply_v not in 12.5 V .. 15 V", True),
        ("supply_v in [5 V, 12 V]", True),
        ("supply_v not in [5 V, 12 V]", False),
    ],
)
def test_comparison(text, expected):
    assert verdict(text, supply_v=12.0).value is expected


def test_rounding_of_a_computed_figure_is_no_difference():
    # 0.1 + 0.2 exceeds 0.3 by one unit in the last place of IEEE 754 double precision.
    assert verdict("a + b <= 0.3", a=0.1, b=0.2).value is True
    assert verdict("a + b > 0.3", a=0.1, b=0.2).value is False
    assert verdict("a + b == 0.3", a=0.1, b=0.2).value is True
    assert verdict("a < b", a=1.0, b=1.000001).value is True


def test_infinite_figures_compare_as_they_should():
    assert verdict("load_ohm > 1 Gohm", load_ohm=math.inf).value is True
    assert verdict("supply_v / load_ohm == 0", supply_v=5.0, load_ohm=math.inf).value is True


@pytest.mark.parametrize(
    ("text", "comparison"),
    [
        ("output_v >= 2 V", Comparison(1.0, 2.0, "V", ">=")),
        ("2 V <= output_v", Comparison(1.0, 2.0, "V", ">=")),
        ("supply_v - output_v <= headroom", Comparison(11.0, 0.5, "V", "<=")),
        ("2 V <= output_v <= 3 V", Comparison(1.0, 2.0, "V", ">=")),
        ("0 V <= output_v <= 500 mV", Comparison(1.0, 0.5, "V", "<=")),
        ("output_v in 2 V .. 3 V", Comparison(1.0, 2.0, "V", ">=")),
        ("output_v in 0 .. 0.5 V", Comparison(1.0, 0.5, "V", "<=")),
        ("output_v not in 0.9 V .. 5 V", Comparison(1.0, 0.9, "V", "<")),
        ("output_v not in 0.95 V .. 1.3 V", Comparison(1.0, 0.95, "V", "<")),
        ("output_v not in 0 V .. 1.1 V", Comparison(1.0, 1.1, "V", ">")),
        ("supply_v > 0 and output_v > 3 V and output_v > 9 V", Comparison(1.0, 3.0, "V", ">")),
        ("a / b < 1 %", Comparison(0.5, 0.01, "%", "<")),
        ("a / b in 0 .. 1 %", Comparison(0.5, 0.01, "%", "<=")),
        ("not supply_v > 10 V", Comparison(12.0, 10.0, "V", "<=")),
        ("not (supply_v > 10 V and output_v > 0.5 V)", Comparison(12.0, 10.0, "V", "<=")),
        ("output_v > 3 V or supply_v > 20 V", Comparison(1.0, 3.0, "V", ">")),
        ('topology == "comparator" or output_v > 3 V', Comparison(1.0, 3.0, "V", ">")),
        ("if(supply_v > 5 V, output_v, supply_v) > 3 V", Comparison(1.0, 3.0, "V", ">")),
        ("if(supply_v > 5 V, output_v > 3 V, supply_v > 3 V)", Comparison(1.0, 3.0, "V", ">")),
    ],
)
def test_false_verdict_names_the_comparison_that_decided(text, comparison):
    found = verdict(text, supply_v=12.0, output_v=1.0, headroom=0.5, a=1.0, b=2.0, topology="voltage-follower")
    assert (found.value, found.comparison) == (False, comparison)


def test_false_verdict_without_figures_has_no_comparison():
    found = verdict('topology == "comparator"', topology="voltage-follower")
    assert (found.value, found.comparison) == (False, None)


# Words, lists, tables, flags


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ('topology == "comparator"', True),
        ("topology == 'COMPARATOR'", True),
        ('topology != "comparator"', False),
        ('topology in ["voltage-follower", "comparator"]', True),
        ('topology in ["voltage-follower"]', False),
        ('topology not in ["voltage-follower",]', True),
        ('"vcc" in nets', True),
        ('"VEE" in nets', False),
        ("name in nets", False),
        ('"IN1" in gains', True),
        ('"IN3" not in gains', True),
        ('gains["in2"] == -2', True),
        ("length(nets) == 2 and length(gains) == 2 and length(corner_hz) == 3", True),
        ("min(corner_hz) >= 10 Hz and max(corner_hz) < 1 MHz", True),
        ("max(gains) == 1 and sum(gains) == -1", True),
        ("p and not q", True),
        ("p == q", False),
        ("p != q", True),
        ("if(q, 1, 2) == 2", True),
        ('if(p, "yes", name) == "yes"', True),
        ("if(p, q, p)", False),
        ("true and not false", True),
    ],
)
def test_words_lists_tables_and_flags(text, expected):
    found = verdict(
        text,
        topology="comparator",
        name="U1A",
        nets=("VCC", "OUT"),
        gains={"IN1": 1.0, "IN2": -2.0},
        corner_hz=(10.0, 1e3, 1e5),
        p=True,
        q=False,
    )
    assert found.value is expected


def test_functions_of_numbers():
    assert value("abs(a)", a=-3.0).value == 3.0
    assert value("min(a, b, 5)", a=7.0, b=6.0).value == 5.0
    assert value("log10(a)", a=1000.0).value == pytest.approx(3.0)
    assert value("db(a)", a=-10.0).value == pytest.approx(20.0)  # a level is that of the magnitude
    assert value("db(a)", a=1 / math.sqrt(2)).value == pytest.approx(-3.0103, abs=1e-4)  # half the power


# Unknown figures: Kleene's strong logic of three values (S. C. Kleene, Introduction to Metamathematics, 1952, § 64)

TRUTH = {"t": True, "f": False, "u": None}
AND = {"tt": True, "tf": False, "tu": None, "ft": False, "ff": False, "fu": False, "ut": None, "uf": False, "uu": None}
OR = {"tt": True, "tf": True, "tu": True, "ft": True, "ff": False, "fu": None, "ut": True, "uf": None, "uu": None}


def _flags(letters):
    return {name: TRUTH[each] for name, each in zip("pq", letters, strict=True) if each != "u"}


@pytest.mark.parametrize("letters", AND)
def test_and_follows_kleene(letters):
    assert verdict("p and q", **_flags(letters)).value is AND[letters]


@pytest.mark.parametrize("letters", OR)
def test_or_follows_kleene(letters):
    assert verdict("p or q", **_flags(letters)).value is OR[letters]


def test_not_follows_kleene():
    assert [verdict("not p", **_flags(each + "t")).value for each in "tfu"] == [False, True, None]


def test_unknown_verdict_tells_every_figure_that_is_missing_once():
    found = verdict("a > 1 and b > 1 and a < 9 and c > 0", c=1.0)
    assert found.value is None
    assert found.unknowns == (
        Unknown("a is not computed", "the part data behind a"),
        Unknown("b is not computed", "the part data behind b"),
    )


def test_decided_verdict_carries_no_unknowns():
    assert verdict("a > 1 and b > 1", b=0.0).unknowns == ()
    assert verdict("a > 1 or b > 1", b=2.0).unknowns == ()


def test_range_is_false_where_one_known_bound_decides():
    assert verdict("a in b .. c", a=5.0, c=4.0).value is False
    assert verdict("a in b .. c", a=5.0, c=6.0).value is None
    assert verdict("b <= a <= c", a=5.0, c=4.0).value is False


@pytest.mark.parametrize(
    ("text", "with_a", "without_a"),
    [
        ("a is known", True, False),
        ("a is unknown", False, True),
        ("a is not known", False, True),
        ("a is not unknown", True, False),
        ("a / b is known", True, False),
        ("(a > 1) is known", True, False),
        ("any(input_pins, gain > a) is known", True, True),
        ("a is known and a > 1", True, False),
        ("a is unknown or a > 1", True, True),
    ],
)
def test_known_tests_are_never_unknown(text, with_a, without_a):
    assert verdict(text, a=2.0, b=1.0).value is with_a
    assert verdict(text, b=1.0).value is without_a


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("a / (b - 2) > 1", "`a / (b - 2)` divides by zero"),
        ("sqrt(a - 9) > 1", "`sqrt(a - 9)` takes the square root of a negative figure"),
        ("log10(a - 1) > 1", "`log10(a - 1)` takes the logarithm of a figure that is not above zero"),
        ("db(a - 1) > 1", "`db(a - 1)` takes the level of a zero in dB"),
        ("c * c > 1", "`c * c` is too large to be computed"),
        ("c ** 9 > 1", "`c ** 9` is too large to be computed"),
        ("min(corner_hz) > 1 Hz", "`min(corner_hz)` has no figures to choose from"),
        ('gains["IN2"] > 1', '`gains["IN2"]` is not known: no figure for IN2'),
    ],
)
def test_arithmetic_without_an_answer_is_unknown_and_says_why(text, reason):
    found = verdict(text, a=1.0, b=2.0, c=1e300, corner_hz=(), gains={"IN1": 1.0})
    assert (found.value, [each.reason for each in found.unknowns]) == (None, [reason])


def test_infinite_less_infinite_is_unknown():
    assert verdict("a - b > 0", a=math.inf, b=math.inf).value is None


@pytest.mark.parametrize("given", [None, math.nan, "text", True, (1.0,)])
def test_figure_that_is_no_number_is_unknown(given):
    assert verdict("a > 1", a=Known(given)).value is None


@pytest.mark.parametrize("text", ["min(gains) > 1", "max(gains) > 1", "sum(gains) > 1", 'gains["IN1"] > 1'])
@pytest.mark.parametrize("given", [None, math.nan, "text", True])
def test_table_with_an_entry_that_is_no_number_is_unknown(text, given):
    assert verdict(text, gains={"IN1": given, "IN2": 2.0}).value is None


@pytest.mark.parametrize("given", [(None,), (math.nan,), ("text",), "text", {"A": 1.0}, 3.0])
def test_list_that_holds_no_numbers_is_unknown(given):
    assert verdict("max(corner_hz) > 1 Hz", corner_hz=given).value is None
    assert verdict("length(corner_hz) > 9", corner_hz=given).value is None


@pytest.mark.parametrize("given", [(1.0,), "text", 3.0, {"A": 1.0}])
def test_list_that_holds_no_words_is_unknown(given):
    assert verdict('"VCC" in nets', nets=given).value is None


def test_value_with_several_unknown_figures_tells_them_as_one():
    assert value("a + b") == Unknown(
        "a is not computed; b is not computed", "the part data behind a, the part data behind b"
    )


# Assumptions


def test_verdict_carries_the_assumptions_it_rests_on():
    reading = Figures(a=Known(1.0, ("5 % tolerance",)), b=Known(2.0, ("no load", "5 % tolerance")), c=3.0)
    assert verdict("a < b and b < c", reading).assumptions == ("5 % tolerance", "no load")
    assert verdict("a > c and b < c", reading).assumptions == ("5 % tolerance",)
    assert verdict("c > 5 or b > c", reading).assumptions == ("no load", "5 % tolerance")
    assert verdict("if(a > 0, c, c) > 1", reading).assumptions == ("5 % tolerance",)


def test_choice_rests_on_the_assumptions_of_its_condition_too():
    reading = Figures(p=Known(True, ("one supply",)), a=Known(2.0, ("5 % tolerance",)))
    assert verdict("if(p, a > 1, b > 1)", reading).assumptions == ("one supply", "5 % tolerance")
    assert value("if(p, a, b)", **reading.given).assumptions == ("one supply", "5 % tolerance")


def test_choice_of_an_unknown_figure_is_unknown():
    reading = Figures(p=Known(False, ("one supply",)), a=2.0)
    assert [each.reason for each in verdict("if(p, a > 1, b > 1)", reading).unknowns] == ["b is not computed"]
    assert [each.reason for each in verdict("if(p, a, b) > 1", reading).unknowns] == ["b is not computed"]
    assert [each.reason for each in verdict("if(q, a, b) > 1", reading).unknowns] == ["q is not computed"]
    assert [each.reason for each in verdict("if(q, a > 1, b > 1)", reading).unknowns] == ["q is not computed"]


# Members

OPEN = Figures(name="IN+", resistance_ohm=math.inf, is_open=True, gain=2.0, nets=("N1",))
HELD = Figures(name="IN-", resistance_ohm=1e4, is_open=False, gain=2.0, nets=("N2",))
DARK = Figures(name="IN3")


@pytest.mark.parametrize(
    ("text", "pins", "expected"),
    [
        ("any(input_pins, is_open)", (HELD, OPEN), True),
        ("any(input_pins, is_open)", (HELD,), False),
        ("any(input_pins, is_open)", (), False),
        ("any(input_pins, is_open)", (HELD, DARK), None),
        ("any(input_pins, is_open)", (DARK, OPEN), True),
        ("all(input_pins, resistance_ohm < 1 Mohm)", (HELD, HELD), True),
        ("all(input_pins, resistance_ohm < 1 Mohm)", (), True),
        ("all(input_pins, resistance_ohm < 1 Mohm)", (DARK, OPEN), False),
        ("all(input_pins, resistance_ohm < 1 Mohm)", (DARK, HELD), None),
        ("count(input_pins) == 3", (DARK, HELD, OPEN), True),
        ("count(input_pins, is_open) == 1", (HELD, OPEN), True),
        ("count(input_pins, is_open) == 1", (HELD, OPEN, DARK), None),
        ("max(input_pins, resistance_ohm) > 1 Gohm", (HELD, OPEN), True),
        ("min(input_pins, resistance_ohm) == 10 kohm", (HELD, OPEN), True),
        ("min(input_pins, resistance_ohm) == 10 kohm", (), None),
        ("min(input_pins, resistance_ohm, not is_open) == 10 kohm", (OPEN, HELD), True),
        ("sum(input_pins, gain) == 4", (HELD, OPEN), True),
        ("sum(input_pins, gain) == 0", (), True),
        ('"IN-" in list(input_pins, name)', (HELD, OPEN), True),
        ("length(list(input_pins, name, is_open)) == 1", (HELD, OPEN), True),
        ('any(input_pins, "N2" in nets)', (OPEN, HELD), True),
    ],
)
def test_questions_about_members(text, pins, expected):
    assert verdict(text, members={"input_pins": pins}).value is expected


def test_inside_a_question_names_are_the_members_first_then_the_subjects():
    pins = {"input_pins": (Figures(gain=5.0),)}
    assert verdict("any(input_pins, gain == 5)", members=pins, gain=1.0).value is True
    assert verdict("any(input_pins, gain == 5 and a == 3)", members=pins, gain=1.0, a=3.0).value is True
    assert verdict("any(input_pins, gain > outer.gain)", members=pins, gain=1.0).value is True


def test_question_inside_a_question_sees_both_levels():
    amplifiers = (Figures({"name": "U1A", "gain": 3.0}, {"input_pins": (OPEN, HELD)}),)
    text = "any(amplifiers, gain == 3 and any(input_pins, is_open and outer.gain == 3 and supply_v > 5 V))"
    assert verdict(text, members={"amplifiers": amplifiers}, supply_v=12.0).value is True


def test_false_question_names_the_members_comparison():
    found = verdict("all(input_pins, resistance_ohm < 1 Mohm)", members={"input_pins": (HELD, OPEN)})
    assert found.comparison == Comparison(math.inf, 1e6, "ohm", "<")


def test_where_no_member_passes_the_nearest_to_the_limit_is_named():
    pins = tuple(Figures(gain=each) for each in (1.0, 9.0, 5.0))
    found = verdict("any(input_pins, gain >= 10)", members={"input_pins": pins})
    assert (found.value, found.comparison) == (False, Comparison(9.0, 10.0, "", ">="))


def test_an_infinite_figure_is_never_the_nearest_to_its_limit():
    pins = tuple(Figures(resistance_ohm=each) for each in (math.inf, 2e6))
    found = verdict("any(input_pins, resistance_ohm < 1 Mohm)", members={"input_pins": pins})
    assert found.comparison == Comparison(2e6, 1e6, "ohm", "<")


def test_list_of_members_keeps_their_order():
    assert value("list(input_pins, name)", members={"input_pins": (OPEN, HELD)}).value == ("IN+", "IN-")


# The compiled thing


def test_names_are_told_in_order_of_appearance_and_members_with_their_relation():
    text = "gain > 1 and any(input_pins, resistance_ohm > 1 Mohm and supply_v > gain * 1 V) and gain < 3"
    assert compile_condition(text, STAGE, WHERE).names == (
        "gain",
        "input_pins",
        "input_pins.resistance_ohm",
        "supply_v",
        "input_pins.gain",
    )


def test_value_tells_unit_and_kind():
    compiled = compile_value("topology", STAGE, WHERE)
    assert (compiled.kind, compiled.unit) == ("word", "")
    assert compile_value("nets", STAGE, WHERE).kind == "words"
    assert compile_value("gain > 3", STAGE, WHERE).kind == "flag"
    assert compile_value("gain > 3", STAGE, WHERE).evaluate(Figures(gain=4.0)) == Known(True)


def test_unit_of_a_name_is_shown_without_its_prefix():
    assert compile_value("x", Names({"x": ("mV", "number")}), WHERE).unit == "V"
    assert compile_value("x", Names({"x": ("nV/rtHz", "number")}), WHERE).unit == "V/rtHz"
    assert compile_value("x", Names({"x": ("ppm", "number")}), WHERE).unit == ""


def test_nothing_is_asked_after_the_first_false():
    reading = Figures(a=0.0, b=1.0)
    assert verdict("a > 1 and b > 1", reading).value is False
    assert reading.asked == ["a"]


def test_condition_may_run_over_lines_with_comments():
    assert verdict("a > 1   # the first\n  and b > 1 # the second", a=2.0, b=2.0).value is True


def test_dotted_and_keyword_like_names_are_names():
    scope = Names({"limits.minimum": ("", "number"), "android": ("", "flag"), "min": ("", "number")})
    assert verdict("android and limits.minimum > min", scope=scope, min=1.0, **{"android": True}).value is None
    figures = {"android": True, "limits.minimum": 2.0, "min": 1.0}
    assert verdict("android and limits.minimum > min", Figures(figures), scope=scope).value is True


def test_member_scope_can_stand_alone():
    assert verdict("is_open", scope=PIN, is_open=True).value is True


def test_reference_names_every_function_and_fits_a_page():
    text = describe_language()
    assert all(
        f"{name}(" in text
        for name in ["abs", "min", "max", "sum", "sqrt", "log10", "db", "length", "if", "any", "all", "count", "list"]
    )
    assert max(map(len, text.splitlines())) <= 120
    assert 30 <= len(text.splitlines()) <= 45


@pytest.mark.parametrize(
    "example",
    [
        "headroom_v < 1.5 V",
        "low <= x <= high",
        "x in low .. high",
        "x not in low .. high",
        'topology in ["comparator", "schmitt-trigger"]',
        'kind == "jfet"',
        '"VCC" in nets',
        'gains["IN1"]',
        '"IN1" in gains',
        "phase_margin_deg is known",
        "phase_margin_deg is unknown",
        "any(input_pins, resistance_ohm > 1 Mohm and outer.gain > 10)",
    ],
)
def test_examples_of_the_reference_compile(example):
    assert example in describe_language()
    volts = dict.fromkeys(("headroom_v", "low", "x", "high"), ("V", "number"))
    types = {**STAGE.types, **volts, "topology": ("", "word"), "kind": ("", "word")}
    compile_value(example, Names(types, STAGE.relations), WHERE)


def test_prepared_conditions_need_no_grammar(tmp_path):
    code = (
        "import sys, os\n"
        "from ampwarden.rulebook.conditions import prepare, compile_condition\n"
        "from subject_doubles import STAGE, WHERE, Figures\n"
        "text = 'any(input_pins, is_open) or supply_v in 3 V .. 5 V'\n"
        "prepare([text, 'this is (no condition'])\n"
        "print(compile_condition(text, STAGE, WHERE).evaluate(Figures(supply_v=4.0)).value, 'lark' in sys.modules)\n"
    )
    path = [each for each in sys.path if each]
    environment = {"AMPWARDEN_CACHE": str(tmp_path), "PYTHONPATH": ":".join(path), "PATH": ""}
    answers = [
        subprocess.run(
            [sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True
        ).stdout.split()
        for _ in range(2)
    ]
    assert answers == [["True", "True"], ["True", "False"]]


def test_evaluation_loads_no_heavy_library(tmp_path):
    code = (
        "import sys\n"
        "from ampwarden.rulebook.conditions import compile_condition\n"
        "print(sorted({'numpy', 'lark', 'networkx', 'pydantic', 'rich', 'scipy'} & set(sys.modules)))\n"
    )
    environment = {"PYTHONPATH": ":".join(each for each in sys.path if each), "PATH": ""}
    done = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_prepare_leaves_the_mistakes_to_be_told_later():
    prepare(["a >", "a > 1"])
    assert verdict("a > 1", a=2.0).value is True
