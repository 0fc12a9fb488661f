"""Signals: which nets a signal enters by, between which extremes, at which frequencies.

Sources with a waveform or an AC value are signals. A source that gives only a DC value is a reference when the deck
has other signals, or when its net or name says so (ref, bias, mid, com); alone it is the signal. The intent file
wins over both.
"""

from __future__ import annotations

import re

from ..text.intent import Intent
from .graph import Circuit
from .parts import Part, PartKind, Rail, Signal

_REFERENCE = re.compile(r"ref|bias|mid|vcm|vcom|offset|bandgap|half", re.IGNORECASE)


def find_signals(circuit: Circuit, intent: Intent, rails: dict[str, Rail]) -> dict[str, Signal]:
    """Return the signals by net, those of sources in the order of the netlist, then the declared ones."""
    signals: dict[str, Signal] = {}
    sources = [
        part
        for part in circuit.parts.values()
        if part.kind in {PartKind.VOLTAGE_SOURCE, PartKind.CURRENT_SOURCE} and len(part.pins) == 2
    ]
    is_alive = any(_varies(part) for part in sources)
    for part in sources:
        if not _varies(part) and (is_alive or _is_reference(part)):
            continue
        net = _entry(circuit, part)
        if net is None or net in rails or part.drive is None:
            continue
        drive = part.drive
        low, high = drive.low, drive.high
        if part.pins[1].net == net and part.kind is PartKind.VOLTAGE_SOURCE:
            low, high = _negated(high), _negated(low)
        frequencies = (drive.frequency_hz,) if drive.frequency_hz is not None else ()
        signals[net] = Signal(
            net, low, high, frequencies, "source", part.designator, part.kind is PartKind.CURRENT_SOURCE
        )
    for name, declared in intent.signals.items():
        net = circuit.net(name)
        if net is None:
            continue
        held = signals.get(net)
        signals[net] = Signal(
            net,
            declared.low,
            declared.high,
            declared.frequency or (held.frequencies_hz if held else ()),
            "declared",
            held.source if held else None,
            declared.current,
            declared.noise,
        )
    return signals


def _varies(part: Part) -> bool:
    drive = part.drive
    return drive is not None and (drive.ac is not None or drive.frequency_hz is not None or drive.low != drive.high)


def _is_reference(part: Part) -> bool:
    names = (part.designator, *(pin.net for pin in part.pins))
    return any(_REFERENCE.search(name.rsplit("/", 1)[-1]) for name in names)


def _entry(circuit: Circuit, part: Part) -> str | None:
    """Return the net that the source drives: its plus net, or the other one when the plus net is ground."""
    plus, minus = part.pins[0].net, part.pins[1].net
    if plus == minus:
        return None
    return minus if plus == circuit.ground else plus


def _negated(value: float | None) -> float | None:
    return None if value is None else -value
