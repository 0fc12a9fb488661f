"""The text report: what it says, that it fits its page, that nothing is dropped."""

import re
from dataclasses import replace

import pytest

from ampwarden.report import Options, find_format
from ampwarden.rulebook.findings import Review, Unevaluated


def text_of(review, **options):
    return "".join(find_format("text")[1](review, Options(**options)))


@pytest.mark.parametrize("width", [60, 80, 120, 200])
def test_no_line_is_wider_than_the_page(whole, width):
    assert max(map(len, text_of(whole, width=width).splitlines()[:-1])) <= width


def test_verdict_is_one_line_on_any_page(whole):
    assert text_of(whole, width=40).splitlines()[-1] == text_of(whole, width=200).splitlines()[-1]


@pytest.mark.parametrize("width", [80, 200])
def test_report_tells_part_net_number_limit_margin_and_fix(whole, width):
    words = " ".join(text_of(whole, width=width).split())
    assert "output of U2A reaches 11.4 V, 0.600 V below rail VCC; the part needs 1.50 V" in words
    assert "measured 600 mV limit 1.50 V margin -900 mV" in words
    assert "R4 47k -> 42.2k (E96), verified" in words
    assert "boards/gauge.cir:9" in words


def test_remedy_that_was_not_computed_says_so(whole):
    assert "add 100 nF from -12V to 0 beside U2, not verified" in text_of(whole, width=200)


def test_finding_stands_below_its_stage(whole):
    text = text_of(whole)
    assert text.index("U2A  non-inverting") < text.index("output-near-rail") < text.index("U4  unrecognized")


def test_finding_of_no_stage_stands_after_the_stages(whole):
    text = text_of(whole)
    assert text.index("U4  unrecognized") < text.index("supply-decoupling-missing")


def test_consequence_is_folded_under_its_cause(whole):
    lines = text_of(whole).splitlines()
    at = next(index for index, line in enumerate(lines) if "follows" in line)
    assert "gain-off" in lines[at]
    assert not any(line.startswith("  note") for line in lines)


def test_consequence_whose_cause_is_not_shown_stands_by_itself(read):
    alone = replace(read, findings=tuple(each for each in read.findings if each.fingerprint == "f4"))
    assert "note     gain-off" in text_of(Review((alone,)))


def test_unrecognized_stage_says_why(whole):
    assert "the feedback ends at a transistor" in " ".join(text_of(whole).split())


def test_waived_finding_shows_reason_name_and_date(whole):
    text = text_of(whole, width=200)
    assert "waived by initials until 2027-06-30: clips on purpose" in text


def test_every_unevaluated_check_is_named_once_under_its_reason(whole):
    text = text_of(whole)
    assert text.count("no frequency is declared for wave") == 1
    assert "slew-rate-exceeded: U2A and U3B" in text
    assert "bias-current-offset: U4" in text


def test_reason_of_a_rule_is_told_once_a_netlist(read, swing):
    twice = replace(read, findings=(swing, replace(swing, fingerprint="other", subject="U9")))
    assert text_of(Review((twice,))).count("because") == 1


def test_counts_are_printed(whole):
    assert "34 passed, 3 flagged, 1 waived, 3 not evaluated" in text_of(whole)


def test_verdict_is_the_last_line_and_names_the_unread_netlist(whole):
    last = text_of(whole).splitlines()[-1]
    expected = "1 error, 1 warning, 1 note in 2 netlists; 1 not read; 1 waived; 3 not evaluated"
    assert last == f"verdict   {expected}"


def test_unread_netlist_shows_each_problem_with_its_place(whole):
    text = text_of(whole)
    assert "boards/torn.cir:14:11  R7: cannot read the value `4..7k`" in text
    assert "boards/torn.cir:15  R8: has one net, needs two" in text


def test_verdict_of_a_clean_netlist_claims_no_more_than_was_checked(clean):
    assert text_of(clean).splitlines()[-1] == "verdict   no findings in 1 netlist"


def test_rail_of_unknown_voltage_is_not_given_one(whole):
    assert "VREF voltage unknown (from its part)" in text_of(whole, width=200)


def test_gain_that_equals_the_midband_gain_is_said_once(whole):
    text = text_of(whole, width=200)
    assert "midband" not in text
    assert re.search(r"figures +gain 5\.70 ", text)


def test_corners_are_listed_in_engineering_notation(whole):
    assert "corner 1.59 kHz, 15.9 kHz" in text_of(whole, width=200)


def test_colour_changes_no_letter(whole):
    plain = text_of(whole)
    coloured = text_of(whole, is_coloured=True)
    assert "\x1b[" in coloured
    assert re.sub(r"\x1b\[[0-9;]*m", "", coloured) == plain


def test_plain_report_holds_no_terminal_codes(whole):
    assert "\x1b" not in text_of(whole)


def test_ascii_report_is_ascii_and_keeps_its_units(read, swing):
    ohm = replace(swing, measured=4700.0, limit=1e-6, unit="ohm")
    text = text_of(Review((replace(read, findings=(ohm,)),)), is_ascii=True)
    assert text.isascii()
    assert "4.70 kohm" in text
    assert "1.00 uohm" in text


def test_name_with_terminal_codes_cannot_steer_the_terminal(read):
    hostile = replace(read, title="board\x1b]0;owned\x07 \x9b2J \u202egnp", findings=())
    text = text_of(Review((hostile,)), is_coloured=True)
    bare = re.sub(r"\x1b\[[0-9;]*m", "", text)
    assert not re.search("[\x00-\x09\x0b-\x1f\x7f-\x9f\u202e]", bare)


def test_long_net_name_is_kept_whole(read, swing):
    name = "X1/X2/" + "n" * 120
    long = replace(swing, message=f"net {name} floats")
    assert name in text_of(Review((replace(read, findings=(long,)),)))


def test_many_subjects_of_one_reason_are_counted(read):
    names = [f"U{index}" for index in range(40)]
    many = replace(read, unevaluated=tuple(Unevaluated("rule-x", name, "no part data") for name in names))
    text = " ".join(text_of(Review((many,))).split())
    assert "U11 and 28 more" in text


def test_empty_review_says_that_nothing_was_reviewed():
    assert text_of(Review(())) == "verdict   nothing to review: no netlist found\n"


def test_review_of_unread_netlists_alone_judges_nothing(whole):
    verdict = text_of(Review(whole.netlists[1:])).splitlines()[-1]
    assert verdict == "verdict   nothing judged; 1 not read"
