"""Extremes over the signals: superposition, correlation, coupling, clipping."""

import math

import pytest
from analysis.benches import bench_of, figure, reason


def test_extremes_of_an_inverting_stage_change_places():
    bench = bench_of("V1 in 0 PWL(0 -0.2 1 0.5)\nR1 in n 10k\nR2 n out 47k\nX1 0 n out OA\n")
    # common practice, no source: 0.5 V times -4.7 is -2.35 V
    assert figure(bench, "output_low_v") == pytest.approx(-2.35, rel=1e-6)
    assert figure(bench, "output_high_v") == pytest.approx(0.94, rel=1e-6)


def test_signals_of_several_inputs_add_by_their_worst_signs():
    bench = bench_of("V1 a 0 PWL(0 0 1 1)\nV2 b 0 PWL(0 -2 1 3)\nR1 a n 10k\nR2 b n 20k\nR3 n out 10k\nX1 0 n out OA\n")
    assert figure(bench, "output_low_v") == pytest.approx(-1 - 1.5, rel=1e-6)
    assert figure(bench, "output_high_v") == pytest.approx(1.0, rel=1e-6)


def test_one_signal_on_both_inputs_of_a_difference_stage_cancels():
    bench = bench_of(
        "V1 in 0 PWL(0 -5 1 5)\nR1 in n 10k\nR2 n out 10k\nR3 in p 10k\nR4 p 0 10k\nX1 p n out OA\nRL out 0 10k\n"
    )
    found = bench.extremes.of_net("out")
    assert found.low == pytest.approx(0, abs=1e-6)
    assert found.high == pytest.approx(0, abs=1e-6)


def test_declared_range_wins_over_the_source():
    bench = bench_of(
        "V1 in 0 SIN(0 1 1k)\nR1 in n 1k\nR2 n out 2k\nX1 0 n out OA\n",
        "[signals.in]\nlow = '-0.1 V'\nhigh = '0.3 V'\n",
    )
    assert figure(bench, "output_low_v") == pytest.approx(-0.6, rel=1e-6)
    assert figure(bench, "output_high_v") == pytest.approx(0.2, rel=1e-6)


def test_swing_counts_at_its_own_frequency():
    bench = bench_of("V1 in 0 SIN(0 1 10k)\nR1 in n 10k\nR2 n out 10k\nC1 n out 1.5915n\nX1 0 n out OA\n")
    # the corner is at 10 kHz: the swing comes out at 1/sqrt(2)
    assert figure(bench, "output_high_v") == pytest.approx(1 / math.sqrt(2), rel=1e-4)


def test_coupled_signal_swings_around_the_bias():
    bench = bench_of(
        "V5 vcc 0 5\nV1 in 0 SIN(0 0.1 1k)\nC1 in p 1u\nR3 vcc p 100k\nR4 p 0 100k\nR1 n a 1k\nC2 a 0 100u\nR2 n out 9k\nX1 p n out OA\n"
    )
    assert figure(bench, "output_dc_v") == pytest.approx(2.5, rel=1e-6)
    assert figure(bench, "output_high_v") == pytest.approx(3.5, rel=1e-3)
    assert figure(bench, "output_low_v") == pytest.approx(1.5, rel=1e-3)


def test_extremes_are_open_without_a_signal_and_name_what_is_missing():
    bench = bench_of("R1 in n 1k\nR2 n out 2k\nX1 0 n out OA\n")
    assert "signal" in reason(bench, "output_high_v") or "declare" in reason(bench, "output_high_v")


def test_extremes_are_open_where_a_source_does_not_say_how_far_it_goes():
    bench = bench_of("V1 in 0 AC 1\nR1 in n 1k\nR2 n out 2k\nX1 0 n out OA\n")
    assert "in" in reason(bench, "output_high_v")


def test_integrator_without_frequency_is_left_open():
    bench = bench_of(
        "V1 in 0 DC 0\nR1 in n 10k\nC1 n out 100n\nR2 n out 100MEG\nX1 0 n out OA\n",
        "[signals.in]\nlow = -1\nhigh = 1\n",
    )
    assert "integrates" in reason(bench, "output_high_v")


def test_common_mode_of_a_follower_is_its_signal():
    bench = bench_of("V1 in 0 SIN(1 0.5 1k)\nX1 in out out OA\n")
    assert figure(bench, "input_cm_low_v") == pytest.approx(0.5)
    assert figure(bench, "input_cm_high_v") == pytest.approx(1.5)


def test_output_current_feeds_load_and_feedback():
    bench = bench_of("V1 in 0 PWL(0 0 1 1)\nR1 in n 1k\nR2 n out 10k\nRL out 0 2k\nX1 0 n out OA\n")
    # at -10 V: 5 mA in the load and 1 mA in the feedback
    assert figure(bench, "output_current_a") == pytest.approx(6e-3, rel=1e-6)


def test_sensor_of_current_moves_the_output_by_the_transresistance():
    bench = bench_of("I1 0 n PWL(0 0 1 2u)\nR1 n out 1MEG\nX1 0 n out OA\n")
    assert figure(bench, "transresistance_ohm") == pytest.approx(-1e6, rel=1e-6)
    assert figure(bench, "output_low_v") == pytest.approx(-2, rel=1e-6)
