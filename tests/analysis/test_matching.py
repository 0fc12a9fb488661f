"""Rejection of difference stages against the closed forms and a search over all corners."""

import itertools
import math

import pytest
from analysis.benches import bench_of, figure, reason
from hypothesis import given, settings
from hypothesis import strategies as st


def difference(r1, r2, r3, r4, tolerance=None):
    intent = f"[tolerance]\nresistor = {tolerance!r}\n" if tolerance else ""
    return bench_of(
        f"VA a 0 SIN(0 1 1k)\nVB b 0 SIN(0 1 2k)\nR1 a n {r1}\nR2 n out {r2}\nR3 b p {r3}\nR4 p 0 {r4}\nX1 p n out OA\n",
        intent,
    )


def rejection_db(r1, r2, r3, r4):
    """Differential over common-mode gain, straight from the two dividers."""
    plus = r4 / (r3 + r4) * (1 + r2 / r1)
    minus = -r2 / r1
    return 20 * math.log10(abs((plus - minus) / 2 / (plus + minus)))


def test_four_equal_resistors_make_a_gain_of_one():
    bench = difference(10e3, 10e3, 10e3, 10e3)
    # common practice, no source
    assert figure(bench, "dc_gain") == pytest.approx(1, rel=1e-6)
    assert figure(bench, "ratio_mismatch") == pytest.approx(0, abs=1e-12)
    assert figure(bench, "gains") == {"b": pytest.approx(1, rel=1e-6), "a": pytest.approx(-1, rel=1e-6)}


def test_mismatch_sets_the_nominal_rejection():
    bench = difference(10e3, 10e3, 10e3, 8.2e3)
    assert figure(bench, "cmrr_nominal_db") == pytest.approx(rejection_db(10e3, 10e3, 10e3, 8.2e3), rel=1e-5)
    assert figure(bench, "ratio_mismatch") == pytest.approx(1 / 0.82 - 1, rel=1e-9)


@pytest.mark.parametrize(("gain", "tolerance", "decibel"), [(1, 0.01, 34), (1, 0.001, 54), (100, 0.01, 68)])
def test_worst_case_is_one_plus_gain_over_four_tolerances(gain, tolerance, decibel):
    # (1 + G)/(4 t); the last agrees with A. Sedra, K. Smith, Microelectronic Circuits, exercise 2.15
    bench = difference(10e3, 10e3 * gain, 10e3, 10e3 * gain, tolerance)
    assert figure(bench, "cmrr_worst_db") == pytest.approx(decibel, abs=0.35)


@settings(max_examples=25, deadline=None)
@given(
    st.floats(1e3, 1e5),
    st.floats(0.5, 50),
    st.floats(1e3, 1e5),
    st.floats(0.8, 1.25),
    st.sampled_from([1e-3, 5e-3, 0.01, 0.05]),
)
def test_worst_case_is_the_worst_of_all_corners(r1, gain, r3, off, tolerance):
    values = (r1, r1 * gain, r3, r3 * gain * off)
    if (
        abs(off - 1) < 6 * tolerance
    ):  # between the corners the rejection passes infinity; the corner that hurts most stays
        off = 1.0
        values = (r1, r1 * gain, r3, r3 * gain)
    worst = min(
        rejection_db(*(value * (1 + sign * tolerance) for value, sign in zip(values, signs, strict=True)))
        for signs in itertools.product((-1, 1), repeat=4)
        if abs(rejection_db_safe(values, signs, tolerance)) < 1e3
    )
    assert figure(difference(*values, tolerance), "cmrr_worst_db") == pytest.approx(worst, abs=0.02)


def rejection_db_safe(values, signs, tolerance):
    try:
        return rejection_db(*(value * (1 + sign * tolerance) for value, sign in zip(values, signs, strict=True)))
    except (ZeroDivisionError, ValueError):
        return math.inf


def test_rejection_is_open_without_a_declared_tolerance():
    assert "tolerance" in reason(difference(10e3, 10e3, 10e3, 10e3), "cmrr_worst_db")


def test_offset_is_multiplied_by_the_noise_gain():
    intent = "[parts.OPQ]\nkind = 'op-amp'\noffset_max_v = 1e-3\ninput_bias_a = 0.0\n"
    bench = bench_of(
        ".subckt OPQ inp inn vcc vee out\n.ends\nVP vcc 0 12\nVN vee 0 -12\nV1 in 0 SIN(0 0.1 1k)\n"
        "R1 in n 1k\nR2 n out 9k\nX1 0 n vcc vee out OPQ\n",
        intent,
    )
    assert figure(bench, "offset_v") == pytest.approx(10e-3, rel=1e-3)
