"""Element lines to what the parts are: kinds, pin names, models, sources, the marks behind a value."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

from ..text.netlist import ElementLine, Value
from ..text.values import read_value
from .parts import DeviceModel, Drive, PartKind
from .levels import Level

ReadNumber = Callable[[Value | None], float | None]

DIRECT_KINDS: dict[str, PartKind] = {
    "R": PartKind.RESISTOR,
    "C": PartKind.CAPACITOR,
    "L": PartKind.INDUCTOR,
    "K": PartKind.COUPLING,
    "V": PartKind.VOLTAGE_SOURCE,
    "I": PartKind.CURRENT_SOURCE,
    "E": PartKind.VCVS,
    "G": PartKind.VCCS,
    "F": PartKind.CCCS,
    "H": PartKind.CCVS,
    "B": PartKind.BEHAVIOURAL,
    "D": PartKind.DIODE,
    "Q": PartKind.BJT,
    "J": PartKind.JFET,
    "Z": PartKind.JFET,
    "M": PartKind.MOSFET,
    "S": PartKind.SWITCH,
    "W": PartKind.SWITCH,
}

PIN_NAMES: dict[PartKind, tuple[str, ...]] = {
    PartKind.RESISTOR: ("1", "2"),
    PartKind.CAPACITOR: ("1", "2"),
    PartKind.INDUCTOR: ("1", "2"),
    PartKind.VOLTAGE_SOURCE: ("1", "2"),
    PartKind.CURRENT_SOURCE: ("1", "2"),
    PartKind.VCVS: ("1", "2"),
    PartKind.VCCS: ("1", "2"),
    PartKind.CCCS: ("1", "2"),
    PartKind.CCVS: ("1", "2"),
    PartKind.BEHAVIOURAL: ("1", "2"),
    PartKind.DIODE: ("anode", "cathode"),
    PartKind.BJT: ("collector", "base", "emitter", "substrate"),
    PartKind.JFET: ("drain", "gate", "source"),
    PartKind.MOSFET: ("drain", "gate", "source", "bulk"),
    PartKind.SWITCH: ("1", "2"),
}

# Designator classes of IEEE 315 / ASME Y14.44 on a board; None means: read as the simulator's letter.
_BOARD_CLASSES: dict[str, PartKind | None] = {
    "R": None,
    "C": None,
    "L": None,
    "D": None,
    "Q": None,
    "FB": PartKind.INDUCTOR,
    "J": PartKind.CONNECTOR,
    "P": PartKind.CONNECTOR,
    "CN": PartKind.CONNECTOR,
    "X": PartKind.OPAQUE,
    "TP": PartKind.CONNECTOR,
    "SW": PartKind.SWITCH,
    "S": PartKind.SWITCH,
    "JP": PartKind.SWITCH,
}

_CLASS = re.compile(r"[A-Za-z]+")

_TOLERANCE = re.compile(r"^[±]?(\d+(?:\.\d+)?)%$")
_RATING_V = re.compile(r"^(\d+(?:\.\d+)?)(k?)V(?:DC)?$", re.IGNORECASE)
_RATING_W = re.compile(r"^(?:(\d+)/(\d+)|(\d+(?:\.\d+)?)(m?))W$", re.IGNORECASE)
_NOT_FITTED = frozenset({"dnp", "dnf", "nf", "nofit", "dni", "nc", "notfitted", "donotfit", "donotpopulate"})


def board_kind(element: ElementLine) -> PartKind | None:
    """Return the kind of a part by its designator class; None when it is read like a simulator's element."""
    match = _CLASS.match(element.designator)
    name = match.group().upper() if match else ""
    return _BOARD_CLASSES.get(name, PartKind.OPAQUE)


@dataclass(frozen=True, slots=True)
class Marks:
    """What stands behind a value: tolerance (fraction), ratings (V, W), whether the part is fitted."""

    tolerance: float | None = None
    rating_v: float | None = None
    rating_w: float | None = None
    is_fitted: bool = True


def read_marks(element: ElementLine) -> Marks:
    """Read tolerance, ratings and not-fitted marks of a part."""
    tolerance = rating_v = rating_w = None
    is_fitted = True
    for mark in element.marks:
        text = mark.strip()
        if match := _TOLERANCE.match(text):
            tolerance = float(match[1]) / 100
        elif match := _RATING_V.match(text):
            rating_v = float(match[1]) * (1000 if match[2] else 1)
        elif match := _RATING_W.match(text):
            rating_w = float(match[1]) / float(match[2]) if match[1] else float(match[3]) * (1e-3 if match[4] else 1)
        elif re.sub(r"[^a-z]", "", text.lower()) in _NOT_FITTED:
            is_fitted = False
    if element.model is not None and re.sub(r"[^a-z]", "", element.model.lower()) in _NOT_FITTED:
        is_fitted = False
    return Marks(tolerance, rating_v, rating_w, is_fitted)


def device_model(element: ElementLine, level: Level, read: ReadNumber) -> DeviceModel | None:
    """Return the evaluated model of an element, with what it takes over from its base; None when none is defined."""
    if element.model is None:
        return None
    line = level.model(element.model)
    if line is None:
        return None
    params: dict[str, float] = {}
    kind = line.kind
    seen: set[str] = set()
    while line is not None and line.name.lower() not in seen:
        seen.add(line.name.lower())
        for name, written in line.params.items():
            if name not in params and (number := read(written)) is not None:
                params[name] = number
        kind = kind or line.kind
        line = level.model(line.base) if line.base else None
    return DeviceModel(element.model, kind, params)


def drive_of(element: ElementLine, read: ReadNumber) -> Drive:
    """Return what an independent source does: its DC value and the extremes and frequency of its waveform.

    Waveforms follow the SPICE3 manual: SIN(offset amplitude frequency …), PULSE(v1 v2 td tr tf pw per),
    EXP(v1 v2 …), PWL(t1 v1 …), SFFM(offset amplitude carrier …).
    """
    excitation = element.excitation
    if excitation is None:
        return Drive()
    dc = read(excitation.dc)
    ac = read(excitation.ac_magnitude)
    wave = excitation.waveform
    if wave is None:
        return Drive(dc if dc is not None else (0.0 if ac is not None else None), dc, dc, None, ac)
    values = [read(each) for each in wave.values]
    low = high = frequency = None
    rest = dc
    if wave.kind in {"SIN", "SFFM"} and len(values) >= 2 and values[0] is not None and values[1] is not None:
        low, high = values[0] - abs(values[1]), values[0] + abs(values[1])
        frequency = values[2] if len(values) > 2 else None
        rest = values[0]
    elif wave.kind in {"PULSE", "EXP"} and len(values) >= 2 and values[0] is not None and values[1] is not None:
        low, high = min(values[0], values[1]), max(values[0], values[1])
        period = values[6] if wave.kind == "PULSE" and len(values) > 6 else None
        frequency = 1 / period if period else None
        rest = values[0]
    elif wave.kind == "PWL":
        levels = [each for each in values[1::2] if each is not None]
        low, high = (min(levels), max(levels)) if levels else (None, None)
        rest = levels[0] if levels else None
    return Drive(dc if dc is not None else rest, low, high, frequency, ac)


def number_of(text: str | None) -> float | None:
    """Return a value written as text, or None."""
    return None if text is None else read_value(text)
