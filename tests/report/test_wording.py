"""Words of the reports: plurals, lists, stage figures, the verdict."""

from dataclasses import replace

import pytest

from ampwarden.report.lines import labelled, to_ascii, two_sided, wrap, write
from ampwarden.report.wording import MEASURES, fails, figures_of, listing, plural, stage_facts
from ampwarden.rulebook.findings import STAGE_MEASURES


def plain(lines):
    return "".join(write(lines, is_coloured=False, is_ascii=False)).splitlines()


def test_words_for_measures_are_complete_and_in_order():
    assert tuple(word.name for word in MEASURES) == STAGE_MEASURES


@pytest.mark.parametrize(
    ("words", "said"),
    [((), ""), (("a",), "a"), (("a", "b"), "a and b"), (("a", "b", "c"), "a, b and c")],
)
def test_lists_are_joined_as_a_person_would(words, said):
    assert listing(words) == said


def test_long_list_counts_its_rest():
    assert listing(["a", "b", "c", "d"], 2) == "a, b and 2 more"


def test_one_is_singular_and_none_is_plural():
    assert (plural(1, "netlist"), plural(0, "netlist"), plural(2, "box", "boxes")) == (
        "1 netlist",
        "0 netlists",
        "2 boxes",
    )


@pytest.mark.parametrize(
    ("level", "fail_on", "expected"),
    [
        ("error", "error", True),
        ("warning", "error", False),
        ("warning", "warning", True),
        ("note", "warning", False),
        ("note", "note", True),
        ("error", "never", False),
    ],
)
def test_level_that_fails_a_review(level, fail_on, expected):
    assert fails(level, fail_on) is expected


def facts(read, **measures):
    stage = replace(read.stages[0], measures=dict.fromkeys(STAGE_MEASURES) | measures)
    return dict(stage_facts(stage))


def test_ac_coupled_stage_shows_both_gains(read):
    said = facts(read, dc_gain=0.0, midband_gain=-10.0)
    assert said == {"DC gain": "0", "midband gain": "-10.0"}


def test_summing_weights_are_told_by_input(read):
    said = facts(read, dc_gain=-1.0, midband_gain=-1.0, gains={"a": -1.0, "b": -2.5})
    assert said == {"gain": "-1.00", "gain from a": "-1.00", "gain from b": "-2.50"}


def test_single_gain_is_not_repeated_by_its_input(read):
    assert facts(read, dc_gain=-1.0, midband_gain=-1.0, gains={"a": -1.0}) == {"gain": "-1.00"}


def test_extremes_read_as_a_range(read):
    said = facts(read, output_low_v=-2.35, output_high_v=2.35, threshold_low_v=1.0, threshold_high_v=2.0)
    assert said == {"output": "-2.35 V to 2.35 V", "thresholds": "1.00 V to 2.00 V"}


def test_half_a_range_is_told_by_its_own_name(read):
    assert facts(read, output_high_v=2.35) == {"highest output": "2.35 V"}


def test_fraction_of_mismatch_reads_in_percent(read):
    assert facts(read, ratio_mismatch=0.0217) == {"ratio mismatch": "2.17 %"}


def test_measured_value_at_its_limit_has_no_margin(swing):
    assert dict(figures_of(replace(swing, measured=1.5))) == {"measured": "1.50 V", "limit": "1.50 V"}


def test_finding_without_a_number_shows_none(swing):
    assert figures_of(replace(swing, measured=None)) == ()


def test_wrapping_keeps_touching_pieces_in_one_word():
    lines = plain(wrap([("aaa ", ""), ("bbb", "label"), ("ccc", "")], 8))
    assert lines == ["aaa", "bbbccc"]


def test_wrapped_text_hangs_below_its_label():
    assert plain(labelled("why", [("one two three", "")], 22, 2)) == ["  why       one two", "            three"]


def test_place_moves_to_its_own_line_when_there_is_no_room():
    assert plain(two_sided([("a" * 30, "")], ("file.cir:9", "place"), 36)) == ["a" * 30, " " * 26 + "file.cir:9"]


@pytest.mark.parametrize(
    ("text", "ascii"),
    [("4.70 kΩ", "4.70 kohm"), ("10 µF", "10 uF"), ("85 °C", "85 degC"), ("45°", "45 deg"), ("é", "?")],
)
def test_signs_of_the_trade_become_words_in_ascii(text, ascii):
    assert to_ascii(text) == ascii
