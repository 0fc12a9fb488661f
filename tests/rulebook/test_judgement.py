"""What rules say of a circuit: findings with their facts, the counts, limits, levels, waivers, consequences."""

from datetime import date

import pytest
from rulebook.sheets import DECOUPLED, RAILS, findings, judged, only

from ampwarden.errors import IntentError, UsageError

MISMATCH = "V1 a 0 SIN(0 1 1k)\nV2 b 0 SIN(0 1 1k)\nR1 a n 10k\nR2 n out 10k\nR3 b p 10k\nR4 p 0 8.2k\nX1 p n out OA\n"
NEAR = f"{DECOUPLED}VIN in 0 SIN(0 2 1k)\nR1 g 0 10k\nR2 g out 47k\nU1 out g in VEE 0 f f VCC TL082\n"
UNBIASED = "V1 in 0 SIN(0 0.1 1k)\nC1 in p 100n\nR1 n 0 1k\nR2 n out 9k\nX1 p n out OA\n"


def test_finding_names_part_net_number_limit_and_fix():
    found = only(judged(NEAR), "output-near-rail")
    assert found.level == "warning"
    assert "U1A" in found.parts
    assert "out" in found.nets
    assert found.stage == "U1A"
    # 2 V times 5.7, against 12 V less the headroom of the part
    assert found.measured == pytest.approx(11.4, rel=1e-3)
    assert found.limit < 12
    assert found.unit == "V"
    assert "R2" in found.remedy.text
    assert found.remedy.is_verified
    assert (found.file, found.line) == ("sheet.cir", 12)


def test_verified_remedy_mends_the_sheet():
    found = only(judged(NEAR), "output-near-rail")
    value = found.remedy.text.split("-> ")[1].split(",")[0].replace(" kΩ", "k").replace(" ", "")
    assert findings(judged(NEAR.replace("R2 g out 47k", f"R2 g out {value}")), "output-near-rail") == []


def test_ratio_is_restored_by_the_value_that_the_remedy_gives():
    found = only(judged(MISMATCH, "[tolerance]\nresistor = '0.1 %'\n"), "difference-ratio-mismatch")
    assert "R4 8.20 kΩ -> 10.0 kΩ" in found.remedy.text
    assert found.remedy.is_verified
    # (1 + G)/(4 t) at G = 1 and 0.1 %: 54 dB (A. Sedra, K. Smith, chapter 2)
    assert "54.0 dB" in found.remedy.text
    assert findings(judged(MISMATCH.replace("8.2k", "10k")), "difference-ratio-mismatch") == []


def test_unbiased_input_names_capacitor_and_net_and_is_mended_by_its_remedy():
    found = only(judged(UNBIASED), "input-unbiased")
    assert found.level == "error"
    assert "C1" in found.parts
    assert "p" in found.nets
    assert found.remedy.is_verified
    assert findings(judged(UNBIASED + "R9 p 0 100k\n"), "input-unbiased") == []


def test_every_pair_is_counted_once():
    reviewed = judged(NEAR)
    counts = reviewed.counts
    assert counts.flagged == len([each for each in reviewed.findings if not each.waived])
    assert counts.unevaluated == len(reviewed.unevaluated)
    assert counts.passed > 0


def test_limit_of_the_intent_file_takes_the_place_of_the_rule_s_own():
    clean = NEAR.replace("SIN(0 2 1k)", "SIN(0 1 1k)")
    assert findings(judged(clean), "output-near-rail") == []
    found = judged(clean, "[limits.output-near-rail]\nheadroom = '7 V'\n")
    assert only(found, "output-near-rail").limit == pytest.approx(5.0, abs=1e-3)


def test_level_of_the_intent_file_wins():
    found = judged(NEAR, "[rules]\nlevels = { output-near-rail = 'error' }\n")
    assert only(found, "output-near-rail").level == "error"


def test_rule_that_is_off_says_nothing_and_counts_nothing():
    on, off = judged(NEAR), judged(NEAR, "[rules]\noff = ['output-near-rail']\n")
    assert findings(off, "output-near-rail") == []
    assert off.counts.passed + off.counts.flagged < on.counts.passed + on.counts.flagged


def test_only_and_skip_choose_rules():
    assert {each.rule for each in judged(RAILS + NEAR.replace(DECOUPLED, ""), only=("output-near-rail",)).findings} == {
        "output-near-rail"
    }
    assert findings(judged(NEAR, skip=("output-near-rail",)), "output-near-rail") == []
    with pytest.raises(UsageError, match="no rule is named"):
        judged(NEAR, only=("output-near-rial",))


@pytest.mark.parametrize(
    ("intent", "told"),
    [
        ("[limits.output-near-rial]\nheadroom = '1 V'\n", "output-near-rial"),
        ("[limits.output-near-rail]\nheadrom = '1 V'\n", "headrom"),
        ("[limits.output-near-rail]\nheadroom = '1 kohm'\n", "headroom"),
        ("[rules]\noff = ['nothing-like-it']\n", "nothing-like-it"),
        ("[[waivers]]\nrule = 'no-such-rule'\nwhere = 'U1'\nreason = 'x'\n", "no-such-rule"),
    ],
)
def test_unknown_rule_or_limit_in_the_intent_file_is_an_error_with_the_nearest_name(intent, told):
    with pytest.raises(IntentError) as caught:
        judged(NEAR, intent)
    problem = caught.value.problems[0]
    assert told in problem.what
    assert problem.location.line is not None


WAIVER = "[[waivers]]\nrule = 'output-near-rail'\nwhere = '{}'\nreason = 'clips on purpose'\nby = 'ab'\n{}"


@pytest.mark.parametrize("where", ["U1A", "u1a", "out"])
def test_waived_finding_stays_visible_with_its_reason(where):
    found = judged(NEAR, WAIVER.format(where, "until = 2031-01-01\n"), today=date(2027, 1, 1))
    waived = only(found, "output-near-rail").waived
    assert (waived.reason, waived.by) == ("clips on purpose", "ab")
    assert (found.counts.waived, found.counts.flagged) == (1, judged(NEAR).counts.flagged - 1)


def test_waiver_past_its_day_speaks_up_and_waives_nothing():
    found = judged(NEAR, WAIVER.format("U1A", "until = 2026-01-01\n"), today=date(2026, 1, 2))
    assert only(found, "output-near-rail").waived is None
    assert only(found, "waiver-expired").level == "warning"
    last_day = judged(NEAR, WAIVER.format("U1A", "until = 2026-01-02\n"), today=date(2026, 1, 2))
    assert findings(last_day, "waiver-expired") == []


def test_waiver_without_a_finding_speaks_up_where_its_part_is_on_the_sheet():
    clean = NEAR.replace("SIN(0 2 1k)", "SIN(0 1 1k)")
    assert only(judged(clean, WAIVER.format("U1A", "")), "waiver-unused").level == "note"
    assert findings(judged(clean, WAIVER.format("U77A", "")), "waiver-unused") == []


def test_fingerprint_stays_when_lines_move_and_unrelated_parts_come():
    before = only(judged(NEAR), "output-near-rail")
    after = only(judged("* a remark\nR77 x7 0 1k\nR78 x7 0 2k\n" + NEAR), "output-near-rail")
    assert before.line != after.line
    assert before.fingerprint == after.fingerprint


def test_fingerprints_of_two_stages_differ():
    two = NEAR.replace(
        "U1 out g in VEE 0 f f VCC TL082", "U1 out g in VEE in g2 out2 VCC TL082\nR3 g2 0 10k\nR4 g2 out2 47k"
    )
    found = findings(judged(two), "output-near-rail")
    assert len({each.fingerprint for each in found}) == 2


def test_part_whose_pins_are_not_known_is_named_for_every_rule_that_would_ask_it():
    reviewed = judged(
        "V1 in 0 SIN(0 1 1k)\nXQ in out mystery5 x1 x2 HOUSEAMP99\nR1 out 0 1k\n"
        "R2 mystery5 0 1k\nR3 x1 0 1k\nR4 x2 0 1k\n.subckt HOUSEAMP99 1 2 3 4 5\n.ends\n"
    )
    assert findings(reviewed, "input-unbiased") == []


def test_order_of_findings_does_not_depend_on_the_order_of_rules():
    found = judged(RAILS + NEAR.replace(DECOUPLED, ""))
    assert [each.line for each in found.findings] == sorted(each.line for each in found.findings)
