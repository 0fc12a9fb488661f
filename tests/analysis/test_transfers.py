"""Transfers, poles, bandwidth and margins against closed forms and scipy.signal."""

import math

import numpy as np
import pytest
from analysis.benches import bench_of, figure, reason
from scipy import signal

OPG = ".subckt OPG inp inn vcc vee out\n.ends OPG\n"
RAILS = "VP vcc 0 12\nVN vee 0 -12\nCP vcc 0 100n\nCN vee 0 100n\n"
ONE_POLE = "[parts.OPG]\nkind = 'op-amp'\ngbw_hz = 1e6\nopen_loop_gain_db = 120\n"


def test_inverting_gain_with_finite_open_loop_gain():
    # -R2/R1 / (1 + (1 + R2/R1)/A): A. Sedra, K. Smith, Microelectronic Circuits, example 2.1
    bench = bench_of("V1 in 0 SIN(0 1 1k)\nR1 in n 1k\nR2 n out 100k\nX1 0 n out OA A=1e4\n")
    assert figure(bench, "dc_gain") == pytest.approx(-100 / (1 + 101 / 1e4), rel=1e-9)


@pytest.mark.parametrize("order", [("R1", "R2"), ("R2", "R1")])
def test_sallen_key_low_pass_is_the_butterworth_that_scipy_designs(order):
    corner = 1e3
    # unity gain, R equal: C1 = 2Q/(wR), C2 = 1/(2Q wR) with Q = 1/sqrt(2); R. Sallen, E. Key, 1955 (from memory)
    w, ohm, q = 2 * math.pi * corner, 10e3, 1 / math.sqrt(2)
    bench = bench_of(
        f"V1 in 0 SIN(0 1 2k)\n{order[0]} in a {ohm}\n{order[1]} a p {ohm}\nC1 a out {2 * q / (w * ohm)}\n"
        f"C2 p 0 {1 / (2 * q * w * ohm)}\nX1 p out out OA\n"
    )
    assert figure(bench, "corner_hz") == (pytest.approx(corner, rel=1e-6),)
    assert figure(bench, "quality") == pytest.approx(q, rel=1e-6)
    numerator, denominator = signal.butter(2, w, analog=True)
    _, expected = signal.freqs(numerator, denominator, [2 * math.pi * 2e3])
    assert figure(bench, "signal_gain") == pytest.approx(abs(expected[0]), rel=1e-6)
    assert figure(bench, "bandwidth_hz") == pytest.approx(corner, rel=1e-3)


def test_bandwidth_of_a_one_pole_amplifier_is_its_product_over_the_noise_gain():
    bench = bench_of(f"{OPG}{RAILS}V1 in 0 SIN(0 0.1 1k)\nR1 in n 1k\nR2 n out 9k\nX1 0 n vcc vee out OPG\n", ONE_POLE)
    # common practice: GBW / (1 + R2/R1), not over the signal gain
    assert figure(bench, "bandwidth_hz") == pytest.approx(1e6 / 10, rel=1e-3)
    assert figure(bench, "noise_gain") == pytest.approx(10, rel=1e-6)
    assert figure(bench, "phase_margin_deg") == pytest.approx(90, abs=0.1)
    assert figure(bench, "crossover_hz") == pytest.approx(1e5, rel=2e-3)


def test_capacitor_at_the_inverting_node_takes_the_phase_that_its_pole_takes():
    bench = bench_of(
        f"{OPG}{RAILS}V1 in 0 SIN(0 0.1 1k)\nR1 in n 10k\nR2 n out 10k\nC1 n 0 1n\nX1 0 n vcc vee out OPG\n", ONE_POLE
    )
    # T = A(s) * 0.5/(1 + s*C*(R1||R2)), A(s) = 1e6*2*pi/s above its first pole; crossover where |T| = 1
    pole = 1 / (2 * math.pi * 1e-9 * 5e3)
    crossover = math.sqrt((-(pole**2) + math.sqrt(pole**4 + 4 * (0.5e6 * pole) ** 2)) / 2)
    assert figure(bench, "crossover_hz") == pytest.approx(crossover, rel=5e-3)
    assert figure(bench, "phase_margin_deg") == pytest.approx(90 - math.degrees(math.atan(crossover / pole)), abs=0.3)


def test_margin_sees_the_load_through_the_output_resistance_of_a_model():
    text = (
        ".subckt OPR p m o\nE1 x 0 p m 1e6\nR1 x y 1k\nC1 y 0 159.155u\nE2 z 0 y 0 1\nR2 z o 100\n.ends\n"
        "V1 in 0 SIN(0 0.1 1k)\nX1 in out out OPR\n{}\n"
    )
    free, loaded = bench_of(text.format("RL out 0 1MEG")), bench_of(text.format("CL out 0 100n"))
    assert figure(free, "phase_margin_deg") == pytest.approx(90, abs=0.5)
    # one pole at 1 Hz, second at 1/(2 pi 100 ohm 100 nF) = 15.9 kHz, product 1 MHz
    pole = 1 / (2 * math.pi * 100 * 100e-9)
    crossover = math.sqrt((-(pole**2) + math.sqrt(pole**4 + 4 * (1e6 * pole) ** 2)) / 2)
    assert figure(loaded, "phase_margin_deg") == pytest.approx(math.degrees(math.atan(pole / crossover)), abs=0.5)


def test_coupling_capacitor_blocks_dc_and_passes_the_band():
    bench = bench_of("V1 in 0 SIN(0 0.1 1k)\nC1 in p 1u\nR3 p 0 100k\nR1 n 0 1k\nR2 n out 9k\nX1 p n out OA\n")
    assert figure(bench, "dc_gain") == 0.0
    assert figure(bench, "midband_gain") == pytest.approx(10, rel=1e-6)
    assert figure(bench, "corner_hz") == (pytest.approx(1 / (2 * math.pi * 100e3 * 1e-6), rel=1e-6),)


def test_signal_gain_over_a_band_is_the_smallest_at_its_ends():
    bench = bench_of(
        "V1 in 0 SIN(0 0.1 1k)\nR1 in n 1k\nR2 n out 10k\nC1 n out 1n\nX1 0 n out OA\n",
        "[signals.in]\nlow = -0.1\nhigh = 0.1\nfrequency = ['20 Hz', '100 kHz']\n",
    )
    corner = 1 / (2 * math.pi * 10e3 * 1e-9)
    assert figure(bench, "signal_gain") == pytest.approx(10 / math.hypot(1, 1e5 / corner), rel=1e-6)


def test_bandwidth_is_left_open_where_nothing_is_known_to_limit_it():
    bench = bench_of("V1 in 0 SIN(0 0.1 1k)\nR1 in n 1k\nR2 n out 10k\nX1 0 n out OA\n")
    assert "gain-bandwidth" in reason(bench, "bandwidth_hz")
    assert "bandwidth of X1 is not known" in reason(bench, "phase_margin_deg")


@pytest.mark.parametrize("seed", range(12))
def test_random_filter_agrees_with_its_transfer_function_at_many_frequencies(seed):
    from ampwarden.analysis.stage_response import stage_transfer

    rng = np.random.default_rng(seed)
    r1, r2 = 10 ** rng.uniform(3, 5, 2)
    c1, c2 = 10 ** rng.uniform(-9, -7, 2)
    bench = bench_of(f"V1 in 0 SIN(0 1 1k)\nR1 in a {r1}\nR2 a p {r2}\nC1 a out {c1}\nC2 p 0 {c2}\nX1 p out out OA\n")
    transfer = stage_transfer(bench, bench.stages[0], ideal=True)
    hertz = np.geomspace(1, 1e6, 25)
    _, expected = signal.freqs([1], [r1 * r2 * c1 * c2, (r1 + r2) * c2, 1], 2 * math.pi * hertz)
    assert transfer.at(hertz) == pytest.approx(expected, rel=1e-6, abs=1e-8)


def test_figures_of_a_stage_do_not_change_when_unrelated_stages_stand_beside_it():
    alone = "V1 in 0 SIN(0 0.1 1k)\nR1 in n 1k\nR2 n out 10k\nC1 n out 1n\nX1 0 n out OA\n"
    others = "".join(
        f"VB{i} i{i} 0 SIN(0 1 1k)\nRB{i} i{i} m{i} 1k\nRC{i} m{i} o{i} {i + 1}k\nXB{i} 0 m{i} o{i} OA\n"
        for i in range(40)
    )
    one, many = bench_of(alone), bench_of(alone + others)
    for name in ("dc_gain", "midband_gain", "signal_gain", "noise_gain", "bandwidth_hz", "corner_hz", "output_high_v"):
        assert figure(many, name) == pytest.approx(figure(one, name), rel=1e-6)
