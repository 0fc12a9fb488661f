"""Computed remedies of the core rules."""

from __future__ import annotations

import math
from collections.abc import Iterator

from ..analysis.figures import Known
from ..circuit.parts import PartKind
from ..quantities import engineering, nearest_preferred, preferred_between
from .remedies import Proposal, change_words, fix, lone_resistor, series_of, two_terminal, with_value
from .scopes import SubjectReading


@fix("add-decoupling")
def add_decoupling(reading: SubjectReading) -> Iterator[Proposal]:
    """Add 100 nF from the supply net to ground for each package on it."""
    bench, subject = reading.bench, reading.subject
    ground = bench.circuit.ground
    if ground is None:
        return
    net = subject.nets[0]
    count = max(1, int(bench.value("package_count", subject) or 1))
    parts = tuple(
        two_terminal(bench, f"C{number}", PartKind.CAPACITOR, net, ground, 100e-9, subject) for number in range(count)
    )
    yield Proposal(f"100 nF from {net} to {ground}", add=parts)


@fix("bias-resistor")
def bias_resistor(reading: SubjectReading) -> Iterator[Proposal]:
    """Add a resistor from the pin to the reference that suits its supplies, large enough for the signal's lowest frequency."""
    from ..analysis.bias import bias_path, input_pin_of
    from ..topology.references import is_reference

    bench = reading.bench
    pin = input_pin_of(reading.subject)
    circuit = bench.circuit
    low, high = (bench.volts(pin.amplifier.supply_minus), bench.volts(pin.amplifier.supply_plus))
    low_v = low.value if isinstance(low, Known) else None
    high_v = high.value if isinstance(high, Known) else None
    target: str | None = circuit.ground
    if low_v is not None and high_v is not None and not low_v < -0.1 * high_v:
        middle = (low_v + high_v) / 2
        target = None
        for net in circuit.nets:
            if circuit.is_rail(net) or circuit.is_ground(net) or not is_reference(circuit, net):
                continue
            volts = bench.volts(net)
            if isinstance(volts, Known) and abs(volts.value - middle) < 0.25 * (high_v - low_v):
                target = net
                break
    if target is None or target == pin.net:
        return
    capacitors = [circuit.parts[name].value for name in bias_path(bench, pin.net).capacitors]
    known = [each for each in capacitors if each]
    frequencies = [each for signal in circuit.signals.values() for each in signal.frequencies_hz if each > 0]
    wanted = 100e3
    if known and frequencies:
        wanted = 10 / (2 * math.pi * min(frequencies) * sum(known))
    data = pin.amplifier.data
    bias = None if data is None else data.input_bias_max_a or data.input_bias_a
    if bias:
        wanted = min(wanted, 20e-3 / bias)
    value = nearest_preferred(
        min(max(wanted, 1e3), 10e6), "E12" if "resistor" not in bench.intent.series else series_of(bench, "resistor")
    )
    part = two_terminal(bench, "R", PartKind.RESISTOR, pin.net, target, value, reading.subject)
    corner = f", corner {engineering(1 / (2 * math.pi * value * sum(known)), 'Hz')}" if known else ""
    error = f", {engineering(bias * value, 'V')} of bias error" if bias else ""
    yield Proposal(f"{engineering(value, 'ohm')} from {pin.net} to {target}{corner}{error}", add=(part,))


@fix("restore-ratio")
def restore_ratio(reading: SubjectReading) -> Iterator[Proposal]:
    """Change one of the four resistors of a difference stage to the preferred value that makes both ratios equal."""
    from ..analysis.stage_gain import stage_of
    from ..analysis.stage_matching import divider_roles

    bench = reading.bench
    stage = stage_of(reading.subject)
    roles = divider_roles(stage)
    values = [stage.values.get(role) for role in roles]
    if any(value is None or not 0 < value < 1e29 for value in values):
        return
    r1, r2, r3, r4 = (float(value) for value in values if value is not None)
    # the reference leg first: it moves the gain least
    wanted = [(roles[3], r3 * r2 / r1), (roles[2], r4 * r1 / r2), (roles[1], r1 * r4 / r3), (roles[0], r2 * r3 / r4)]
    tried = []
    for order, (role, ideal) in enumerate(wanted):
        part = lone_resistor(bench, stage, role)
        if part is None:
            continue
        for series in dict.fromkeys(("E24", series_of(bench, "resistor"))):
            value = nearest_preferred(ideal, series)
            tried.append((round(abs(value / ideal - 1), 6), order, part, value))
    for _, _, part, value in sorted(tried, key=lambda each: each[:2]):
        yield Proposal(change_words(part, value), replace=(with_value(part, value),))


@fix("lower-gain")
def lower_gain(reading: SubjectReading) -> Iterator[Proposal]:
    """Make the feedback resistor smaller, by steps of the preferred series, until the extremes fit between the limits."""
    from ..analysis.stage_gain import stage_of

    bench = reading.bench
    stage = stage_of(reading.subject)
    part = lone_resistor(bench, stage, "feedback")
    gain = bench.value("dc_gain", reading.subject) or bench.value("midband_gain", reading.subject)
    if part is None or part.value is None or not gain:
        return
    low, high = bench.value("output_low_v", reading.subject), bench.value("output_high_v", reading.subject)
    rest = bench.value("output_dc_v", reading.subject)
    room_low, room_high = (reading.bench.value(name, reading.subject) for name in ("rail_low_v", "rail_high_v"))
    if None in (low, high, rest, room_low, room_high):
        return
    assert low is not None
    assert high is not None
    assert rest is not None
    assert room_low is not None
    assert room_high is not None
    headroom = reading.limits.get("headroom")
    top = room_high - (headroom if headroom is not None else bench.value("headroom_high_v", reading.subject) or 0.0)
    bottom = room_low + (headroom if headroom is not None else bench.value("headroom_low_v", reading.subject) or 0.0)
    if not bottom < rest < top:
        return
    share = min(
        (top - rest) / (high - rest) if high > rest else 1.0, (rest - bottom) / (rest - low) if low < rest else 1.0
    )
    noise = bench.value("noise_gain", reading.subject) or 1 + abs(gain)
    is_inverting = gain < 0
    wanted = (
        share * part.value if is_inverting else (share * noise - 1) / (noise - 1) * part.value if noise > 1.001 else 0.0
    )
    if wanted <= 0:
        return
    choices = preferred_between(0.7 * wanted, wanted, series_of(bench, "resistor"))
    for value in reversed(choices[-4:]):
        yield Proposal(change_words(part, value), replace=(with_value(part, value),))


@fix("raise-bias-leg")
def raise_bias_leg(reading: SubjectReading) -> Iterator[Proposal]:
    """Make the resistor from a follower's input to its reference so large that the series resistor takes no share."""
    from ..analysis.stage_gain import stage_of

    bench = reading.bench
    stage = stage_of(reading.subject)
    leg, series = lone_resistor(bench, stage, "bias"), lone_resistor(bench, stage, "noninverting_input")
    if leg is None or series is None or not series.value:
        return
    least = 99 * series.value
    for value in preferred_between(least, 1.6 * least, "E12")[:2]:
        yield Proposal(change_words(leg, value), replace=(with_value(leg, value),))
