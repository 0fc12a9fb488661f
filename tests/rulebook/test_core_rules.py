"""The five core rules on circuits that an expert would pass or flag."""

import pytest
from rulebook.sheets import DECOUPLED, findings, judged, only

FOLLOWER = "V1 in 0 SIN(0 1 1k)\n{}X1 p out out OA\n"
DUAL = "VIN in 0 SIN(0 0.5 1k)\nR1 in n 10k\nR2 n o1 47k\nU1 o1 n 0 VEE o1 o2 o2 VCC TL082\n"
RAILS = "VP VCC 0 12\nVN VEE 0 -12\n"


@pytest.mark.parametrize(
    ("capacitors", "flagged"),
    [
        ("", {"VCC", "VEE"}),
        ("C1 VCC 0 100n\n", {"VEE"}),
        ("C1 VCC 0 100n\nC2 VEE 0 100n\n", set()),
        ("C1 VCC VEE 100n\n", set()),
        ("C1 VCC 0 4.7n\nC2 VEE 0 100n\n", {"VCC"}),
        ("C1 VCC 0 4.7n\nC3 VCC 0 6.8n\nC2 VEE 0 10n\n", set()),
        ("C1 VCC a 100n\nR9 a 0 1\nC2 VEE 0 100n\n", set()),
        ("C1 VCC in 100n\nC2 VEE 0 100n\n", {"VCC"}),
    ],
)
def test_decoupling_of_both_supplies(capacitors, flagged):
    found = [
        each
        for each in findings(judged(RAILS + DUAL + capacitors), "supply-decoupling-missing")
        if each.level == "warning"
    ]
    if capacitors.startswith("C1 VCC in"):
        assert {each.subject for each in found} <= flagged  # a held signal net is stiff as well
    else:
        assert {each.subject for each in found} == flagged


def test_one_capacitor_for_two_packages_is_a_note():
    text = RAILS + DUAL + "U2 a a in VEE in b b VCC TL082\nC1 VCC 0 100n\nC2 VEE 0 100n\n"
    found = findings(judged(text), "supply-decoupling-missing")
    assert {each.level for each in found} == {"note"}
    more = judged(text + "C3 VCC 0 100n\nC4 VEE 0 100n\n")
    assert findings(more, "supply-decoupling-missing") == []


@pytest.mark.parametrize(
    ("network", "share"),
    [
        ("R1 in p 1k\n", None),
        ("R1 in p 1k\nR2 p 0 1MEG\n", None),
        ("R1 in p 10k\nR2 p 0 10k\n", 0.5),
        ("C1 in p 10u\nR2 p 0 100k\n", None),
        ("R1 in p 10k\nC1 p 0 10n\n", None),
        ("R1 in p 1k\nR2 p 0 9k\n", 0.9),
    ],
)
def test_follower_passes_its_signal_or_says_how_much(network, share):
    found = findings(judged(FOLLOWER.format(network)), "follower-gain-below-one")
    if share is None:
        assert found == []
    else:
        assert found[0].measured == pytest.approx(share, rel=1e-3)
        assert {"R1", "R2"} <= set(found[0].parts)


@pytest.mark.parametrize(("declared", "is_flagged"), [("0.5", False), ("0.8", True), ("1", True)])
def test_declared_gain_below_one_is_right_only_if_it_is_the_gain(declared, is_flagged):
    text = FOLLOWER.format("R1 in p 10k\nR2 p 0 10k\n")
    found = findings(judged(text, f"[stages.X1]\ngain = {declared}\n"), "follower-gain-below-one")
    assert bool(found) is is_flagged


@pytest.mark.parametrize(
    ("extra", "route"),
    [
        ("C1 in p 1u\n", "error"),
        ("C1 in p 1u\nR1 p 0 1MEG\n", None),
        ("C1 in p 1u\nL1 p 0 1\n", None),
        ("C1 in p 1u\nR1 p q 1MEG\nC2 q 0 1u\n", "error"),
        ("C1 in p 1u\nD1 p 0 DX\n.model DX D\n", "note"),
        ("C1 in p 1u\nR1 p out2 1MEG\nR5 m 0 1k\nR6 m out2 1k\nX2 in m out2 OA\n", None),
    ],
)
def test_path_of_the_bias_current(extra, route):
    found = [each for each in findings(judged(FOLLOWER.format(extra)), "input-unbiased") if each.subject == "IN+ of X1"]
    assert [each.level for each in found] == ([route] if route else [])


def test_input_at_a_connector_is_left_open():
    text = (
        "a board\nU1 OUT1 N1 IN VEE GND O2 O2 VCC TL082\nR1 N1 GND 10k\nR2 N1 OUT1 10k\nC1 VCC GND 100n\n"
        "C2 VEE GND 100n\nJ1 IN GND CONN2\nJ2 VCC GND VEE CONN3\n"
    )
    from ampwarden.pipeline import review_text
    from ampwarden.text import parse_intent

    reviewed = review_text(text, parse_intent("[rails]\nVCC = '12 V'\nVEE = '-12 V'\n"), name="board.net")
    assert findings(reviewed, "input-unbiased") == []
    assert any(each.rule == "input-unbiased" and "J1" in each.reason for each in reviewed.unevaluated)


@pytest.mark.parametrize(("peak", "is_flagged"), [(0.5, False), (1.4, False), (2.0, True)])
def test_output_is_held_against_rail_less_headroom(peak, is_flagged):
    text = f"{DECOUPLED}VIN in 0 SIN(0 {peak} 1k)\nR1 g 0 10k\nR2 g out 47k\nU1 out g in VEE 0 f f VCC TL082\n"
    assert bool(findings(judged(text), "output-near-rail")) is is_flagged


def test_output_without_a_known_signal_is_judged_at_rest_and_the_rest_left_open():
    text = f"{DECOUPLED}R1 g 0 10k\nR2 g out 47k\nR3 in 0 1k\nU1 out g in VEE 0 f f VCC TL082\n"
    reviewed = judged(text)
    assert findings(reviewed, "output-near-rail") == []
    assert any(each.rule == "output-near-rail" for each in reviewed.unevaluated)


def test_comparator_at_its_limits_is_right():
    text = (
        "V1 VCC 0 5\nC1 VCC 0 100n\nVIN in 0 SIN(2.5 1 10)\nVR ref 0 2.5\nR3 VCC out 4.7k\n"
        "X1 in ref VCC 0 out LM393\n.subckt LM393 p m v g o\n.ends\n"
    )
    assert findings(judged(text), "output-near-rail") == []


@pytest.mark.parametrize(("tolerance", "is_flagged"), [("0.1 %", False), ("1 %", False), ("5 %", True)])
def test_rejection_under_tolerance(tolerance, is_flagged):
    text = "V1 a 0 SIN(0 1 1k)\nV2 b 0 SIN(0 1 1k)\nR1 a n 10k\nR2 n out 10k\nR3 b p 10k\nR4 p 0 10k\nX1 p n out OA\n"
    found = findings(judged(text, f"[tolerance]\nresistor = '{tolerance}'\n"), "difference-ratio-mismatch")
    assert bool(found) is is_flagged


def test_rejection_that_the_stage_was_meant_to_have_is_asked_for():
    text = "V1 a 0 SIN(0 1 1k)\nV2 b 0 SIN(0 1 1k)\nR1 a n 10k\nR2 n out 10k\nR3 b p 10k\nR4 p 0 10k\nX1 p n out OA\n"
    found = only(
        judged(text, "[tolerance]\nresistor = '1 %'\n[stages.X1]\nrejection = 60\n"), "difference-ratio-mismatch"
    )
    # (1 + 1)/(4 t) = 1000 wants 0.05 %
    assert "0.05 %" in found.remedy.text
    assert found.measured == pytest.approx(34, abs=0.3)


@pytest.mark.parametrize(
    "stage", ["R1 in n 10k\nR2 n out 1k\nX1 0 n out OA\n", "R1 in n 10k\nR2 n out 47k\nX1 0 n out OA\n"]
)
def test_inverting_stage_may_attenuate(stage):
    assert findings(judged(f"V1 in 0 SIN(0 1 1k)\n{stage}"), "follower-gain-below-one") == []
