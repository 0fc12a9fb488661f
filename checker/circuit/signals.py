"""Signals: what enters the circuit, on which net, between which extremes, at which frequencies.

They come from independent sources that are no rails and from the intent file, which wins. A source between two nets
that nothing holds is a floating one: its signal is that of its first net against its second.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from .graph import Circuit
from .parts import Part, PartKind, Rail, Signal
from .rails import HeldNet


def find_signals(
    circuit: Circuit,
    grounds: frozenset[str],
    held: Mapping[str, HeldNet],
    rails: Mapping[str, Rail],
    driven: frozenset[str],
) -> dict[str, Signal]:
    """Return the signals by net, sources in netlist order, then declared ones."""
    signals: dict[str, Signal] = {}
    for part in circuit.parts.values():
        if not part.is_fitted:
            continue
        if part.kind is PartKind.VOLTAGE_SOURCE and len(part.pins) == 2:
            signal = _voltage_signal(part, grounds, held, rails)
        elif part.kind is PartKind.CURRENT_SOURCE and len(part.pins) == 2:
            signal = _current_signal(circuit, part, grounds, held, rails, driven)
        else:
            continue
        if signal is not None and signal.net not in signals:
            signals[signal.net] = signal
    _add_declared(circuit, signals)
    return signals


def _voltage_signal(
    part: Part, grounds: frozenset[str], held: Mapping[str, HeldNet], rails: Mapping[str, Rail]
) -> Signal | None:
    plus, minus = part.pins[0].net, part.pins[1].net
    if plus == minus:
        return None
    for net in (plus, minus):
        known = held.get(net)
        if known is not None and known.sources and known.sources[-1] == part.designator:
            if net in rails or (known.is_still and _is_ammeter(part) and len(known.sources) > 1):
                return None
            low, high = known.low, known.high
            if known.is_still and known.volts == 0.0:
                low = high = None
            return Signal(net, low, high, known.frequencies_hz, "source", part.designator)
    if _is_ammeter(part) or (plus in grounds and minus in grounds):
        return None
    drive = part.drive
    if drive is None or drive.dc is None or plus in held or minus in held:
        return None
    frequencies = (drive.frequency_hz,) if drive.frequency_hz is not None else ()
    net, other = (minus, plus) if plus in grounds else (plus, minus)
    return Signal(net, drive.low, drive.high, frequencies, "source", part.designator, other=other)


def _is_ammeter(part: Part) -> bool:
    """True for a source of zero volts that stands for a wire: it measures a current or opens a loop for analysis."""
    drive = part.drive
    return part.value == 0.0 and (drive is None or (drive.ac is None and drive.low == drive.high))


def _current_signal(
    circuit: Circuit,
    part: Part,
    grounds: frozenset[str],
    held: Mapping[str, HeldNet],
    rails: Mapping[str, Rail],
    driven: frozenset[str],
) -> Signal | None:
    drive = part.drive
    if drive is None:
        return None
    stiff = [each.net in grounds or each.net in held or each.net in rails for each in part.pins]
    is_still = drive.ac is None and drive.frequency_hz is None and drive.low == drive.high
    ends = [pin.net for pin, is_stiff in zip(part.pins, stiff, strict=True) if not is_stiff]
    if len(ends) != 1 or ends[0] in driven:
        return None
    if is_still and not drive.dc:
        return None
    # A still current out of a rail biases; one against ground may be a sensor's.
    if is_still and any(each.net in rails for each in part.pins):
        return None
    net = ends[0]
    low, high = drive.low, drive.high
    if part.pins[0].net == net:
        # The current flows from the first net through the source to the second: out of this net.
        low, high = (None if high is None else 0.0 - high), (None if low is None else 0.0 - low)
    frequencies = (drive.frequency_hz,) if drive.frequency_hz is not None else ()
    return Signal(net, low, high, frequencies, "source", part.designator, is_current=True)


def _add_declared(circuit: Circuit, signals: dict[str, Signal]) -> None:
    intent = circuit.intent
    if intent is None:
        return
    for name, wanted in intent.signals.items():
        net = circuit.net(name)
        if net is None:
            continue
        earlier = signals.get(net)
        frequencies = tuple(wanted.frequency) or (earlier.frequencies_hz if earlier is not None else ())
        low = wanted.low if wanted.low is not None else (earlier.low if earlier is not None else None)
        high = wanted.high if wanted.high is not None else (earlier.high if earlier is not None else None)
        declared = Signal(net, low, high, frequencies, "declared", None, bool(wanted.current), wanted.noise)
        if earlier is not None:
            declared = replace(declared, source=earlier.source, other=earlier.other)
        signals[net] = declared
