"""Amplifiers at their limits, comparators, and circuits that have no rest."""

import pytest
from analysis.benches import POWERED, RAILS, bench_of, figure, reason

NO_HEADROOM = "[parts.OPZ]\nkind = 'op-amp'\noutput_low_headroom_v = 0.5\noutput_high_headroom_v = 1.0\n"
OPZ = ".subckt OPZ inp inn vcc vee out\n.ends OPZ\n"


def test_output_stops_at_its_rail_less_headroom():
    bench = bench_of(f"{OPZ}{RAILS}V1 in 0 3\nR1 g 0 1k\nR2 g out 9k\nX1 in g vcc vee out OPZ\n", NO_HEADROOM)
    assert bench.solution.voltage("out") == pytest.approx(11.0)
    negative = bench_of(f"{OPZ}{RAILS}V1 in 0 -3\nR1 g 0 1k\nR2 g out 9k\nX1 in g vcc vee out OPZ\n", NO_HEADROOM)
    assert negative.solution.voltage("out") == pytest.approx(-11.5)


def test_gain_of_a_stage_is_told_even_where_its_rest_is_at_the_rail():
    bench = bench_of(f"{OPZ}{RAILS}V1 in 0 3\nR1 g 0 1k\nR2 g out 9k\nX1 in g vcc vee out OPZ\n", NO_HEADROOM)
    assert figure(bench, "dc_gain") == pytest.approx(10, rel=1e-3)


def test_comparator_with_open_collector_is_pulled_up_or_drawn_down():
    text = (
        "V5 vcc 0 5\nCP vcc 0 100n\nV1 in 0 {}\nVR ref 0 2.5\nR1 vcc out 4.7k\nX1 in ref vcc 0 out LM393\n"
        ".subckt LM393 p m v g o\n.ends\n"
    )
    assert bench_of(text.format(3)).solution.voltage("out") == pytest.approx(5.0)
    assert bench_of(text.format(2)).solution.voltage("out") < 0.7


def test_schmitt_trigger_has_the_thresholds_of_its_divider():
    bench = bench_of(
        f"{OPZ}{RAILS}V1 in 0 SIN(0 5 10)\nR1 p 0 10k\nR2 out p 90k\nX1 p in vcc vee out OPZ\n", NO_HEADROOM
    )
    # common practice, no source: thresholds are a tenth of the output's levels of 11 V and -11.5 V
    assert figure(bench, "threshold_high_v") == pytest.approx(1.1)
    assert figure(bench, "threshold_low_v") == pytest.approx(-1.15)
    assert figure(bench, "hysteresis_v") == pytest.approx(2.25)


def test_bistable_stage_rests_in_either_state():
    bench = bench_of(
        f"{OPZ}{RAILS}V1 in 0 SIN(0 5 10)\nR1 p 0 10k\nR2 out p 90k\nX1 p in vcc vee out OPZ\n", NO_HEADROOM
    )
    assert bench.solution_from("low").voltage("out") == pytest.approx(-11.5)
    assert bench.solution_from("high").voltage("out") == pytest.approx(11.0)


def test_oscillator_is_said_to_have_no_rest():
    bench = bench_of(
        f"{OPZ}{RAILS}R1 p 0 10k\nR2 out p 10k\nR3 out m 10k\nC1 m 0 10n\nX1 p m vcc vee out OPZ\n", NO_HEADROOM
    )
    assert "no state at which it can rest" in reason(bench, "output_dc_v")


def test_levels_of_a_comparator_without_rails_are_not_made_up():
    bench = bench_of("V1 in 0 SIN(0 1 10)\nVR ref 0 0.5\nRL out 0 10k\nX1 in ref out OA\n")
    assert "rails" in reason(bench, "output_dc_v")
    assert "rails" in reason(bench, "output_high_v")


def test_integrator_without_rails_runs_away_and_says_so():
    bench = bench_of("V1 in 0 1\nR1 in n 10k\nC1 n out 100n\nX1 0 n out OA\n")
    assert "feedback" in reason(bench, "output_dc_v")


def test_net_without_dc_path_is_named_and_what_it_moves_is_left_open():
    bench = bench_of("V1 in 0 SIN(0 1 1k)\nC1 in p 100n\nR1 n 0 1k\nR2 n out 9k\nX1 p n out OA\n")
    assert "net p has no DC path" in reason(bench, "output_dc_v")
    assert figure(bench, "midband_gain") == pytest.approx(10, rel=1e-6)


def test_part_without_value_leaves_open_only_what_depends_on_it():
    bench = bench_of(
        "V1 in 0 SIN(0 1 1k)\nR1 in n 1k\nR2 n a {unknown}\nX1 0 n a OA\nR3 a m 1k\nR4 m b 2k\nX2 0 m b OA\n"
    )
    assert "R2" in reason(bench, "dc_gain", "X1")
    assert figure(bench, "dc_gain", "X2") == pytest.approx(-2, rel=1e-6)
    assert "R2" in reason(bench, "output_dc_v", "X2")


def test_assumed_headroom_is_stated():
    bench = bench_of(f"{RAILS}V1 in 0 SIN(0 1 1k)\nX1 in out vcc vee out OPX\n")
    found = bench.figure("headroom_high_v", bench.subject_of_stage("X1"))
    assert found.value == 2.0
    assert "assumed" in found.assumptions[0]


def test_powered_model_is_as_good_as_its_gain():
    assert POWERED  # the model that the bench offers: a gain of a million
    bench = bench_of(f"{RAILS}V1 in 0 SIN(0 0.1 1k)\nR1 in n 1k\nR2 n out 10k\nX1 0 n vcc vee out OPX\n")
    assert figure(bench, "dc_gain") == pytest.approx(-10 / (1 + 11 / 1e6), rel=1e-9)
