"""Independent sources as figures: DC value, extremes over time, frequency.

Meaning of the waveforms: SPICE3 Version 3f3 User's Manual, University of California, Berkeley, May 1993, independent
sources. A small-signal magnitude (``AC 1``) says nothing about how far a signal swings, so it gives no extremes.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

from ..text.netlist import Excitation, Value
from .parts import Drive

Evaluate = Callable[[Value], float | None]


def read_drive(excitation: Excitation, value_of: Evaluate) -> Drive:
    """Return what an independent source does; ``value_of`` evaluates a value or gives None."""
    dc = value_of(excitation.dc) if excitation.dc is not None else None
    ac = value_of(excitation.ac_magnitude) if excitation.ac_magnitude is not None else None
    if excitation.waveform is None:
        if dc is None and ac is not None:
            dc = 0.0
        still = dc if ac is None else None
        return Drive(dc, still, still, None, ac)
    values = [value_of(each) for each in excitation.waveform.values]
    start, low, high, frequency = _extremes(excitation.waveform.kind, values)
    if dc is None:
        dc = start
    elif low is not None and high is not None and not low <= dc <= high:
        # A stated operating point outside the waveform counts as a state that the source takes.
        low, high = min(low, dc), max(high, dc)
    return Drive(dc, low, high, frequency, ac)


def _extremes(
    kind: str, values: Sequence[float | None]
) -> tuple[float | None, float | None, float | None, float | None]:
    """Return start value, lowest, highest, frequency."""

    def at(index: int) -> float | None:
        return values[index] if index < len(values) else None

    first, second = at(0), at(1)
    if kind == "PWL":
        heights = [each for each in values[1::2] if each is not None]
        if not heights or len(heights) < len(values) // 2:
            return (heights[0] if heights else None), None, None, None
        return heights[0], min(heights), max(heights), None
    if first is None or second is None:
        return first, None, None, None
    if kind in {"SIN", "SFFM"}:
        frequency = at(2)
        phase = at(5) if kind == "SIN" else None
        start = first + second * math.sin(math.radians(phase)) if phase else first
        return start, first - abs(second), first + abs(second), _positive(frequency)
    if kind == "PULSE":
        period = _positive(at(6))
        return first, min(first, second), max(first, second), 1 / period if period else None
    if kind == "EXP":
        return first, min(first, second), max(first, second), None
    return None, None, None, None


def _positive(value: float | None) -> float | None:
    return value if value is not None and value > 0 else None
