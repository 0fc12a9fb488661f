"""Junctions and transistors against their published laws."""

import math

import pytest
from analysis.benches import bench_of, figure
from scipy.special import lambertw

VT = 1.380649e-23 * 300.15 / 1.602176634e-19  # kT/q at 27 degC, SI constants


@pytest.mark.parametrize("volts", [0.1, 0.5, 1.0, 5.0, 10.0])
@pytest.mark.parametrize(("saturation", "emission"), [(1e-14, 1.0), (2.5e-9, 1.75)])
def test_diode_behind_a_resistor_carries_what_the_shockley_law_gives(volts, saturation, emission):
    solution = bench_of(f"V1 a 0 {volts}\nR1 a k 1k\nD1 k 0 DX\n.model DX D(IS={saturation} N={emission})\n").solution
    # closed form with the Lambert function: T. Banwell, A. Jayakumar, Electronics Letters 36, 2000 (from memory)
    scale, ohm = emission * VT, 1e3
    argument = saturation * ohm / scale * math.exp((volts + saturation * ohm) / scale)
    current = scale / ohm * lambertw(argument).real - saturation
    assert solution.voltage("k") == pytest.approx(volts - ohm * current, rel=1e-6)


def test_blocked_diode_leaves_its_net_where_the_resistor_holds_it():
    solution = bench_of("V1 a 0 -5\nR1 a k 1k\nD1 k 0 DX\n.model DX D(IS=1e-14)\n").solution
    assert solution.voltage("k") == pytest.approx(-5, abs=1e-6)


def test_zener_holds_its_breakdown_voltage():
    solution = bench_of("V1 a 0 12\nR1 a k 1k\nD1 0 k DZ\n.model DZ D(IS=1e-14 BV=5.1 IBV=5m)\n").solution
    # at 6.9 mA the exponential stands ln(6.9/5) thermal voltages above the stated breakdown
    assert solution.voltage("k") == pytest.approx(5.1 + VT * math.log(6.9 / 5), abs=2e-3)


def test_collector_current_rises_with_collector_voltage_by_the_early_effect():
    def current(volts):
        solution = bench_of(
            f"VB b 0 0.65\nVC c 0 {volts}\nQ1 c b 0 QX\n.model QX NPN(IS=1e-15 BF=100 VAF=50)\n"
        ).solution
        return -solution.current("VC")

    # Ic = Is exp(Vbe/VT) (1 + Vcb/VAF): J. Early, Proc. IRE 40, 1952 (from memory)
    assert current(10.65) / current(0.65) == pytest.approx(1 + 10 / 50, rel=1e-4)
    assert current(0.65) == pytest.approx(1e-15 * math.expm1(0.65 / VT), rel=1e-3)


@pytest.mark.parametrize(("gate", "drain"), [(2.0, 5.0), (3.0, 0.5), (0.5, 5.0)])
def test_field_effect_transistor_follows_the_square_law(gate, drain):
    solution = bench_of(
        f"VG g 0 {gate}\nVD d 0 {drain}\nM1 d g 0 0 MX W=10u L=1u\n.model MX NMOS(VTO=1 KP=100u LAMBDA=0.02)\n"
    ).solution
    gain, over = 100e-6 * 10, gate - 1
    if over <= 0:
        expected = 0.0
    elif drain < over:
        expected = gain * (over - drain / 2) * drain * (1 + 0.02 * drain)
    else:
        expected = gain / 2 * over**2 * (1 + 0.02 * drain)
    # Shichman-Hodges model, IEEE J. Solid-State Circuits SC-3, 1968 (from memory)
    assert -solution.current("VD") == pytest.approx(expected, rel=1e-6, abs=1e-9)


def test_pnp_mirrors_npn():
    npn = bench_of("VB b 0 0.65\nVC c 0 5\nQ1 c b 0 QX\n.model QX NPN(IS=1e-15 BF=80)\n").solution
    pnp = bench_of("VB b 0 -0.65\nVC c 0 -5\nQ1 c b 0 QX\n.model QX PNP(IS=1e-15 BF=80)\n").solution
    assert pnp.current("VC") == pytest.approx(-npn.current("VC"), rel=1e-9)
    assert pnp.current("VB") == pytest.approx(-npn.current("VB"), rel=1e-9)


def test_clipper_swings_to_the_breakdown_of_its_diodes():
    bench = bench_of(
        "V1 in 0 SIN(0 2 1k)\nR1 in n 10k\nR2 n out 100k\nD1 n k DZ\nD2 out k DZ\n"
        ".model DZ D(IS=1e-14 BV=5.1 IBV=1m)\nX1 0 n out OA\n"
    )
    high = figure(bench, "output_high_v")
    # breakdown of one and forward drop of the other at (2 V - ...)/10 k: between 5.6 V and 5.9 V
    assert 5.6 < high < 5.9
    assert figure(bench, "output_low_v") == pytest.approx(-high, rel=1e-6)
