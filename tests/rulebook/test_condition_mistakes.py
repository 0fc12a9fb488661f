"""What the author of a wrong condition is told: the place, what is wrong, the nearest right thing, the cure."""

import pytest
from subject_doubles import STAGE, WHERE, Names

from ampwarden.errors import ConditionError, Location, RulePackError, render_problem
from ampwarden.rulebook.conditions import compile_condition, compile_value


def problems_of(text, where=WHERE, scope=STAGE):
    with pytest.raises(ConditionError) as caught:
        compile_condition(text, scope, where)
    assert isinstance(caught.value, RulePackError)
    return caught.value.problems


# text, the column and length of the mark, what is said, the cure or the nearest name (None: nothing is expected there)
MISTAKES = [
    # names
    ("suply_v > 5 V", 1, 7, "unknown name `suply_v`", "supply_v"),
    ("gain > 1 and bandwith_hz > 1 kHz", 14, 11, "unknown name `bandwith_hz`", "bandwidth_hz"),
    ("topology == comparator", 13, 10, "unknown name `comparator`", "put words in quotes"),
    ("gain == null", 9, 4, "unknown name `null`", "name is known"),
    ("abs > 3", 1, 3, "unknown name `abs`", "abs(…)"),
    ('topology == "comparater"', 13, 12, "`topology` is never `comparater`", "comparator"),
    ('topology in ["comparator", "folower"]', 28, 9, "`topology` is never `folower`", None),
    ("if(zzz, a, b) > 1", 4, 3, "unknown name `zzz`", "known here"),
    ("if(p, zzz, b) > 1", 7, 3, "unknown name `zzz`", "known here"),
    ('topology == "comparator" and zzz > 1', 30, 3, "unknown name `zzz`", "known here"),
    ("zzz > 1", 1, 3, "unknown name `zzz`", "known here: topology, name, gain"),
    ("outer.gain > 1", 1, 10, "unknown name `outer.gain`", None),
    # units
    ("supply_v > 5", 12, 1, "`supply_v` is a voltage (V), compared with a plain number", "5 V"),
    ("5 > supply_v", 5, 8, "`5` is a plain number, compared with a voltage (V)", "5 V"),
    ("supply_v > 5 ohm", 12, 5, "compared with a resistance (ohm)", "such as 1 V"),
    ("supply_v + output_a > 5 V", 12, 8, "added to a current (A)", "multiply `output_a` by a resistance"),
    ("supply_v - 5 > 0", 12, 1, "`supply_v` is a voltage (V), less a plain number", "5 V"),
    ("delay_s > bandwidth_hz", 11, 12, "compared with a frequency (Hz)", "1 / bandwidth_hz"),
    ("supply_v in 1 .. 5 V", 13, 1, "compared with a plain number", "1 V"),
    ("supply_v in [1 V, 5 ohm]", 19, 5, "listed with a resistance (ohm)", None),
    ("rate < 2 V", 8, 3, "`rate` is a slew rate (V/s), compared with a voltage (V)", None),
    ("gain > 60 dB", 1, 4, "`gain` is a ratio, compared with a level in dB", "db(gain)"),
    ("cmrr_db > 45 deg", 11, 6, "compared with an angle in degrees", None),
    ("load_ohm > 10k", 12, 3, "unknown unit `k`", "kohm"),
    ("load_ohm > 4k7", 12, 3, "unknown unit `k7`", "kohm"),
    ("load_ohm > 3 meg", 12, 5, "unknown unit `meg`", "Mohm"),
    ("gain > 2 a", 8, 3, "unknown unit `a`", "write *"),
    ("supply_v > 5 V/load_ohm", 12, 12, "unknown unit `load_ohm`", "blanks around /"),
    ("log10(supply_v) > 1", 7, 8, "of which no logarithm is taken", "log10(supply_v / (1 V))"),
    ("db(cmrr_db) > 1", 4, 7, "is a level in dB already", "cmrr_db alone"),
    ("max(gain, supply_v) > 1", 11, 8, "together with a voltage (V)", None),
    ("if(p, gain, supply_v) > 1", 13, 8, "an alternative to a voltage (V)", None),
    # kinds
    ("gain", 1, 4, "`gain` is a plain number, not a condition", "gain > 0"),
    ("gain > 1 and a", 14, 1, "`a` is a plain number, not a condition", "a > 0"),
    ("topology", 1, 8, "`topology` is a word, not a condition", "=="),
    ("p + 1 > 0", 1, 1, "`p` is a yes-or-no figure, used as a number", "if(p"),
    ("p == 1", 1, 6, "`p` is a yes-or-no figure, compared with a plain number", "stands alone"),
    ("topology > 3", 1, 12, "`topology` is a word, compared with a plain number", None),
    ('gain > "gain"', 1, 13, "compared with a word", "without quotes"),
    ('"gain" > 3', 1, 10, '`"gain"` is a word, compared with a plain number', "names without quotes"),
    ('"gain" + 1 > 3', 1, 6, '`"gain"` is a word, used as a number', "names without quotes"),
    ("corner_hz[1] > 3 Hz", 1, 9, "not a table", "min(corner_hz)"),
    ('topology < "comparator"', 1, 23, "an order it does not have", None),
    ('nets == "VCC"', 1, 13, "`nets` is a list of words, compared with a word", '"VCC" in nets'),
    ("corner_hz > 10 Hz", 1, 17, "`corner_hz` is a list of figures", "min(corner_hz)"),
    ("gains > 1", 1, 9, "`gains` is a table of figures by name", 'gains["…"]'),
    ('nets["VCC"] > 1', 1, 4, "not a table", None),
    ("gains[1] > 1", 7, 1, "looked up in a table", 'gains["…"]'),
    ('topology in "comparator"', 1, 24, "looked for in a word", '["comparator"]'),
    ("3 in nets", 1, 9, "`3` is a plain number, looked for in a list of words", '"…" in nets'),
    ("supply_v in headroom", 1, 20, "looked for in a voltage", "supply_v in low .. high"),
    ("supply_v in corner_hz", 13, 9, "looked for in a list of figures, each a frequency (Hz)", None),
    ("topology in nets in nets", 18, 2, "`in` is out of place", None),
    ("length(gain) > 1", 8, 4, "has no length", None),
    ("min(gain) > 1", 5, 4, "nothing to take the min of", "min(gain, …)"),
    ("[1, 'a'] is known", 5, 3, "in a list of numbers", None),
    ("3 V is known", 1, 3, "always known", None),
    # functions and relations
    ("sine(gain) > 1", 1, 4, "unknown function `sine`", None),
    ("zzz(gain) > 1", 1, 3, "unknown function `zzz`", "functions: abs, min"),
    ("gain(3) > 1", 1, 4, "`gain` is a figure, not a function", "without brackets"),
    ("abs(gain, a) > 1", 1, 3, "`abs` with 2 arguments", None),
    ("sqrt() > 1", 1, 4, "`sqrt` with 0 arguments", None),
    ("any(input_pins)", 1, 3, "`any` with 1 argument", None),
    ("any(inputpins, is_open)", 5, 9, "unknown relation `inputpins`", "input_pins"),
    ("any(nets, is_open)", 5, 4, "`nets` is a figure, not a relation", "input_pins"),
    ("any(1 + 2, is_open)", 5, 5, "is no relation", None),
    ("any(input_pins, p)", 17, 1, "does not speak of the input_pins", "count(input_pins)"),
    ("length(list(input_pins, name, gain)) > 1", 31, 4, "is a plain number, not a condition", "gain > 0"),
    ("any(input_pins, is_opn)", 17, 6, "unknown name `is_opn`", "is_open"),
    ("input_pins > 1", 1, 10, "`input_pins` is a relation, not a figure", "count(input_pins)"),
    ("p and input_pins", 7, 10, "`input_pins` is a relation, not a condition", "any(input_pins"),
    ("any(amplifiers, any(input_pins, any(amplifiers, gain > 1)))", 37, 10, "nested deeper than 2", None),
    # numbers
    ("gain ** 0.5 > 1", 9, 3, "`0.5` is no exponent", "sqrt(x)"),
    ("gain ** a > 1", 9, 1, "`a` is no exponent", None),
    ("gain ** 10 > 1", 9, 2, "`10` is no exponent", None),
    ("1 / (2 - 2) > gain", 1, 11, "divides by zero", None),
    ("gain in 5 .. 1", 9, 1, "the range 5 .. 1 is empty", "1 .. 5"),
    ("1 < gain > 0", 1, 12, "a chain of comparisons that is no range", "low <= x <= high"),
    ("1 < gain < 3 < 5", 1, 16, "a chain of comparisons that is no range", None),
    # syntax
    ("gain = 1", 6, 1, "`=` is no comparison", "write =="),
    ("gain => 1", 6, 2, "`=>` is no comparison", "write >="),
    ("gain <> 1", 7, 1, "`>` is out of place", None),
    ("p && q", 3, 2, "`&&`", "write and"),
    ("p || q", 3, 2, "`||`", "write or"),
    ("!p", 1, 1, "`!`", "write not"),
    ("gain ^ 2 > 1", 6, 1, "`^`", "write **"),
    ("gain ≤ 2", 6, 1, "`≤`", "write <="),
    ("gain is 2", 6, 2, "`is` asks only whether a figure is known", "=="),
    ("gain if p else a", 6, 2, "`if` stands before its condition", "if(condition"),
    ("gain >", 7, 1, "ends too early", None),
    ("gain > and p", 8, 3, "`and` is out of place", None),
    ("(gain > 1", 1, 1, "`(` is not closed", "close it with )"),
    ('gains["IN1" > 1', 6, 1, "`[` is not closed", "close it with ]"),
    ("gain > 1)", 9, 1, "`)` closes nothing", None),
    ('topology == "comparator', 13, 11, "not closed", 'close it with "'),
    ("gain a > 1", 6, 1, "`a` is out of place", None),
    ("gain ,a > 1", 6, 1, "`,` is out of place", None),
    ("gain > 1.2.3", 11, 1, "`.` is out of place", None),
    ("", 1, 1, "the condition is empty", None),
    ("   ", 1, 1, "the condition is empty", None),
]


@pytest.mark.parametrize(("text", "column", "length", "what", "help_"), MISTAKES, ids=[each[0] for each in MISTAKES])
def test_mistake_is_told_with_its_place_and_cure(text, column, length, what, help_):
    first = problems_of(text)[0]
    assert what in first.what
    assert (first.location.line, first.location.column, first.location.length) == (7, column, length)
    assert first.level == "error"
    if help_ is not None:
        assert help_ in f"{first.cure} {' '.join(first.nearest)}"


@pytest.mark.parametrize("text", [each[0] for each in MISTAKES])
def test_problem_is_worded_for_a_reader(text):
    for problem in problems_of(text):
        said = " ".join(filter(None, (problem.what, problem.cure, problem.expected)))
        assert not problem.what.endswith(".")
        assert "COMPARE" not in said
        assert "NAME" not in said
        assert "Token" not in said
        assert "None" not in said
        assert not any(word in said for word in ("please", "illegal", "oops", "invalid"))
        assert problem.kind.replace("-", "").islower()


@pytest.mark.parametrize(("text", "expected"), [("gain >", "figure by name"), ("gain > ,", "figure by name")])
def test_a_missing_term_is_expected_in_trade_words(text, expected):
    assert expected in problems_of(text)[0].expected


@pytest.mark.parametrize("text", ["gain gain", "(gain > 1", "gain @ 1", "gain = 1"])
def test_a_missing_operator_is_expected_in_trade_words(text):
    assert "comparison" in problems_of(text)[0].expected


def test_every_mistake_of_a_condition_is_told_at_once():
    kinds = [each.what for each in problems_of("suply_v > 5 V and gain > 3 V or topolgy == 'comparator'")]
    assert len(kinds) == 3


def test_one_mistake_breeds_no_others():
    assert len(problems_of("abs(suply_v) + 3 V > 5 V and p")) == 1


def test_place_is_that_of_the_rule_file_when_its_line_is_known():
    row = "require = 'suply_v > 5 V'"
    place = problems_of("suply_v > 5 V", Location("x.toml", 12, excerpt=row))[0].location
    assert (place.file, place.line, place.column, place.excerpt) == ("x.toml", 12, 12, row)


def test_place_in_a_placeholder_is_that_of_the_message():
    row = 'message = "{gain} of {suply_v} for {subject}"'
    place = problems_of("suply_v", Location("x.toml", 3, excerpt=row))[0].location
    assert place.column == row.index("suply_v") + 1


def test_line_is_read_from_the_rule_file_when_it_is_not_given(tmp_path):
    file = tmp_path / "some-rule.toml"
    file.write_text("name = 'some-rule'\nrequire = 'suply_v > 5 V'\nwhen = 'gain >'\n", encoding="utf-8")
    place = problems_of("suply_v > 5 V", Location(str(file), 2))[0].location
    assert (place.line, place.column, place.excerpt) == (2, 12, "require = 'suply_v > 5 V'")
    place = problems_of("gain >", Location(str(file), 3))[0].location
    assert (place.line, place.column) == (3, 15)


def test_place_falls_back_to_the_condition_where_the_line_holds_it_in_another_spelling():
    row = 'require = "suply_v > 5 V and topology == \\"comparator\\""'
    text = 'suply_v > 5 V and topology == "comparator"'
    place = problems_of(text, Location("x.toml", 3, excerpt=row))[0].location
    assert (place.column, place.excerpt) == (1, text)


def test_place_in_a_text_of_many_lines_counts_them():
    text = "gain > 1\nand suply_v > 5 V"
    place = problems_of(text, Location("x.toml", 12))[0].location
    assert (place.line, place.column, place.excerpt) == (13, 5, "and suply_v > 5 V")
    # TOML 1.0: a newline right behind the opening quotes of a multi-line string is trimmed
    place = problems_of(text, Location("x.toml", 12, excerpt='require = """'))[0].location
    assert (place.line, place.column) == (14, 5)


def test_problem_is_drawn_with_a_caret_under_the_mistake():
    drawn = render_problem(problems_of("supply_v > 5 ohm")[0]).splitlines()
    assert drawn[1].endswith("supply_v > 5 ohm")
    assert drawn[2].index("^") == drawn[1].index("5 ohm")
    assert drawn[2].count("^") == len("5 ohm")


@pytest.mark.parametrize("text", ["(" * 61 + "gain" + ")" * 61 + " > 1", "not " * 200 + "p", "-" * 200 + "gain > 1"])
def test_depth_is_bounded(text):
    assert problems_of(text)[0].kind == "condition-too-deep"


def test_brackets_in_words_and_comments_do_not_count():
    compile_condition(f"topology == name or name == '{'(' * 80}' # {'[' * 80}", STAGE, WHERE)


def test_depth_below_the_bound_compiles_and_evaluates():
    text = "(" * 59 + "gain" + ")" * 59 + " > 1 and " + "not " * 50 + "p"
    compile_condition(text, STAGE, WHERE)


def test_length_is_bounded():
    text = " and ".join(["gain > 1"] * 400)
    assert problems_of(text)[0].kind == "condition-too-long"


def test_wide_condition_within_the_bounds_compiles():
    compile_condition(" and ".join(["gain > 1"] * 300), STAGE, WHERE)
    compile_condition(" + ".join(["a"] * 900) + " > 1", STAGE, WHERE)


def test_unit_that_a_name_is_declared_with_is_checked():
    problem = problems_of("x > 1", scope=Names({"x": ("parsec", "number")}))[0]
    assert "parsec" in problem.what


def test_nothing_but_the_functions_of_the_language_can_be_called():
    for text in ("__import__('os') == 'x'", "open('x') == 'x'", "gain.__class__ == 'x'", "exec('x') == 'x'"):
        assert problems_of(text)[0].kind in {"condition-function", "condition-name"}


def test_value_may_be_of_any_kind_but_its_names_are_checked():
    with pytest.raises(ConditionError):
        compile_value("suply_v", STAGE, WHERE)
    with pytest.raises(ConditionError):
        compile_value("input_pins", STAGE, WHERE)
