"""One element line to one :class:`Part`: kind, named pins, value in SI units, what the line states beside it.

``BUILDERS`` maps the letter of a simulation deck to the function that builds its part. Pins of two-terminal parts are
``1`` and ``2``. Controlling nets of sources and switches are no pins: no current flows there; ``control`` names them.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

from ..errors import Problem
from ..text.expressions import FUNCTIONS, ExpressionError
from ..text.netlist import ElementLine, Value
from .drives import read_drive
from .marks import read_marks
from .parts import DeviceModel, Part, PartKind, Pin
from .scopes import Frame

GROUND_NAMES = frozenset({"0", "gnd"})


@dataclass(slots=True)
class NetNames:
    """Net spellings of a whole circuit: the first spelling met stands for all, ``0`` and ``GND`` are one net."""

    globals: frozenset[str] = frozenset()
    spelling: dict[str, str] = field(default_factory=dict)
    ground: str | None = None

    def canonical(self, name: str) -> str:
        """Return the spelling that stands for a full net name."""
        key = name.lower()
        if key in GROUND_NAMES:
            if self.ground is None:
                self.ground = name
            return self.ground
        return self.spelling.setdefault(key, name)


@dataclass(slots=True)
class Level:
    """One level of the hierarchy while it is expanded: prefix of its names, scope, nets that its ports stand for."""

    names: NetNames
    frame: Frame
    prefix: str = ""
    ports: dict[str, str] = field(default_factory=dict)
    multiplier: float = 1.0
    problems: list[Problem] = field(default_factory=list)
    nets: dict[str, str] = field(default_factory=dict)

    def net(self, name: str) -> str:
        """Return the circuit's net for a name written at this level."""
        known = self.nets.get(name)
        if known is None:
            key = name.lower()
            if key in self.ports:
                known = self.ports[key]
            elif not self.prefix or key in GROUND_NAMES or key in self.names.globals:
                known = self.names.canonical(name)
            else:
                known = self.names.canonical(self.prefix + name)
            self.nets[name] = known
        return known

    def value(self, element: ElementLine, value: Value | None) -> float | None:
        """Evaluate a value; what cannot be evaluated becomes a problem and None."""
        if value is None or isinstance(value, float):
            return value
        try:
            return self.frame.value(value)
        except ExpressionError as trouble:
            text = getattr(value, "text", str(value))
            self.problems.append(
                Problem(
                    "value-not-computable",
                    f"{self.prefix}{element.designator}: cannot compute `{text}`: {trouble}",
                    element.location,
                    level="warning",
                    because="everything that depends on this value is left uncomputed",
                    cure="define the parameter with .param, or write a number",
                )
            )
            return None

    def params(self, element: ElementLine) -> dict[str, float]:
        """Evaluate the ``name=value`` pairs of a line; words that are no figures are left out."""
        found: dict[str, float] = {}
        for name, value in element.params.items():
            if isinstance(value, float):
                found[name] = value
                continue
            try:
                found[name] = self.frame.value(value)
            except ExpressionError:
                continue
        return found

    def model(self, element: ElementLine) -> DeviceModel | None:
        """Return the evaluated model of a line; None when it is not defined."""
        return self.frame.model(element.model) if element.model is not None else None


Builder = Callable[[ElementLine, Level], Part]


def _pins(element: ElementLine, level: Level, names: Iterable[str]) -> tuple[Pin, ...]:
    return tuple(Pin(name, level.net(net)) for name, net in zip(names, element.nets, strict=False))


def _times(value: float | None, multiplier: float, power: int) -> float | None:
    if value is None or multiplier == 1.0 or multiplier <= 0:
        return value
    return value * multiplier if power > 0 else value / multiplier


def _passive(element: ElementLine, level: Level) -> Part:
    letter = element.letter
    kind, power = {
        "R": (PartKind.RESISTOR, -1),
        "C": (PartKind.CAPACITOR, 1),
        "L": (PartKind.INDUCTOR, -1),
    }[letter]
    value = level.value(element, element.value)
    model: DeviceModel | None = None
    params: dict[str, float] = {}
    if element.params:
        params = level.params(element)
    marks = read_marks(element.marks, params, element.value_text if value is None else None, letter)
    if value is None:
        value = marks.value
    if element.model is not None:
        model = level.model(element)
        if model is not None:
            value = _value_by_model(letter, value, model, params)
    multiplier = level.multiplier * params.get("m", 1.0) if params else level.multiplier
    return Part(
        level.prefix + element.designator,
        kind,
        (Pin("1", level.net(element.nets[0])), Pin("2", level.net(element.nets[1]))),
        element.location,
        value=_times(value, multiplier, power),
        model=model,
        part_name=element.model,
        params=params,
        tolerance=marks.tolerance,
        rating_v=marks.rating_v,
        rating_w=marks.rating_w,
        marks=marks.words,
        is_fitted=marks.is_fitted,
    )


def _value_by_model(letter: str, value: float | None, model: DeviceModel, params: dict[str, float]) -> float | None:
    """Value of a resistor or capacitor with a model: the model's own, else sheet value and geometry, times its factor."""
    own = letter.lower()
    found = value
    if found is None and own in model.params and letter != "R":
        found = model.params[own]
    if found is None and letter == "R":
        sheet, length, width = model.params.get("rsh"), params.get("l"), params.get("w", model.params.get("defw"))
        if sheet is not None and length is not None and width:
            found = sheet * length / width
        elif "res" in model.params:
            found = model.params["res"]
    if found is not None and value is not None:
        found *= model.params.get(own, 1.0)
    return found


def _coupling(element: ElementLine, level: Level) -> Part:
    return Part(
        level.prefix + element.designator,
        PartKind.COUPLING,
        (),
        element.location,
        value=level.value(element, element.value),
        control=tuple(level.prefix + each for each in element.coupled),
    )


def _independent(element: ElementLine, level: Level) -> Part:
    is_voltage = element.letter == "V"
    kind = PartKind.VOLTAGE_SOURCE if is_voltage else PartKind.CURRENT_SOURCE
    drive = None
    if element.excitation is not None:
        drive = read_drive(element.excitation, lambda value: level.value(element, value))
    value = drive.dc if drive is not None else level.value(element, element.value)
    if not is_voltage and level.multiplier != 1.0:
        value = _times(value, level.multiplier, 1)
    return Part(
        level.prefix + element.designator,
        kind,
        _pins(element, level, "12"),
        element.location,
        value=value,
        drive=drive,
        params=level.params(element) if element.params else {},
    )


_CONTROLLED = {
    "E": PartKind.VCVS,
    "G": PartKind.VCCS,
    "F": PartKind.CCCS,
    "H": PartKind.CCVS,
    "B": PartKind.BEHAVIOURAL,
}


def _controlled(element: ElementLine, level: Level) -> Part:
    control = element.control
    kind = _CONTROLLED[element.letter]
    value: float | None = None
    coefficients: tuple[float, ...] = ()
    expression: str | None = None
    names: tuple[str, ...] = ()
    marks: tuple[str, ...] = ()
    if control is not None:
        value = level.value(element, control.gain)
        found = [level.value(element, each) for each in control.coefficients]
        if found and None not in found:
            coefficients = tuple(each for each in found if each is not None)
        if control.sources:
            names = tuple(level.prefix + each for each in control.sources)
        else:
            names = tuple(level.net(each) for each in control.nets)
        is_one = control.form == "poly" and len(coefficients) == 2 and len(names) == (1 if control.sources else 2)
        if is_one and coefficients[0] == 0.0:
            value, coefficients = coefficients[1], ()
        if control.expression is not None:
            expression, read_nets = rewrite_expression(control.expression.text, level)
            if not names:
                names = read_nets
            marks = (control.form,)
        if control.output:
            marks = (*marks, control.output)
    if element.letter in "GF" and level.multiplier != 1.0:
        value = _times(value, level.multiplier, 1)
        coefficients = tuple(each * level.multiplier for each in coefficients)
    return Part(
        level.prefix + element.designator,
        kind,
        _pins(element, level, "12"),
        element.location,
        value=value,
        control=names,
        coefficients=coefficients,
        expression=expression,
        marks=marks,
        params=level.params(element) if element.params else {},
    )


_PROBE = re.compile(r"\bv\s*\(\s*([^(),\s]+)\s*(?:,\s*([^(),\s]+)\s*)?\)", re.IGNORECASE)
_PROBE_CURRENT = re.compile(r"\bi\s*\(\s*([^(),\s]+)\s*\)", re.IGNORECASE)
_NAME = re.compile(r"(?<![\w.])[A-Za-z_][\w.]*(?!\s*\()")


def rewrite_expression(text: str, level: Level) -> tuple[str, tuple[str, ...]]:
    """Put the circuit's nets into the ``V(…)`` of an expression and figures in place of parameters.

    Returns
    -------
    tuple
        The rewritten text and the nets that it reads, in order of first mention.
    """
    nets: dict[str, None] = {}
    kept: list[str] = []

    def keep(written: str) -> str:
        kept.append(written)
        return f"\0{len(kept) - 1}\0"

    def probe(match: re.Match[str]) -> str:
        ends = [level.net(each) for each in match.groups() if each is not None]
        for each in ends:
            nets.setdefault(each)
        return keep(f"V({','.join(ends)})")

    def current(match: re.Match[str]) -> str:
        return keep(f"I({level.prefix}{match[1]})")

    text = _PROBE.sub(probe, text)
    text = _PROBE_CURRENT.sub(current, text)

    def parameter(match: re.Match[str]) -> str:
        name = match.group().lower()
        if name in FUNCTIONS:
            return match.group()
        try:
            value = level.frame.find(name)
        except ExpressionError:
            value = None
        return match.group() if value is None else f"({value!r})"

    text = _NAME.sub(parameter, text)
    return re.sub("\0(\\d+)\0", lambda match: kept[int(match[1])], text), tuple(nets)


_DEVICE_PINS: dict[str, tuple[PartKind, tuple[str, ...]]] = {
    "D": (PartKind.DIODE, ("anode", "cathode")),
    "Q": (PartKind.BJT, ("collector", "base", "emitter", "substrate")),
    "J": (PartKind.JFET, ("drain", "gate", "source")),
    "Z": (PartKind.JFET, ("drain", "gate", "source")),
    "M": (PartKind.MOSFET, ("drain", "gate", "source", "bulk")),
}


def _device(element: ElementLine, level: Level) -> Part:
    kind, names = _DEVICE_PINS[element.letter]
    params = level.params(element) if element.params else {}
    area = level.value(element, element.value)
    multiplier = level.multiplier * params.get("m", 1.0)
    if multiplier != 1.0 and multiplier > 0:
        area = (1.0 if area is None else area) * multiplier
    model = level.model(element)
    if model is None and element.model is not None:
        level.problems.append(
            Problem(
                "model-undefined",
                f"{level.prefix}{element.designator}: no .model defines `{element.model}`",
                element.location,
                level="warning",
                because=f"the {kind} is computed with the default parameters of its kind, or not at all",
                cure="include the library that defines it",
            )
        )
    marks = read_marks(element.marks, params, None, element.letter)
    return Part(
        level.prefix + element.designator,
        kind,
        _pins(element, level, names),
        element.location,
        value=area,
        model=model,
        part_name=element.model,
        params=params,
        tolerance=marks.tolerance,
        rating_v=marks.rating_v,
        rating_w=marks.rating_w,
        marks=marks.words,
        is_fitted=marks.is_fitted,
    )


def _switch(element: ElementLine, level: Level) -> Part:
    control = element.control
    names: tuple[str, ...] = ()
    if control is not None and control.sources:
        names = tuple(level.prefix + each for each in control.sources)
    elif control is not None:
        names = tuple(level.net(each) for each in control.nets)
    return Part(
        level.prefix + element.designator,
        PartKind.SWITCH,
        _pins(element, level, "12"),
        element.location,
        model=level.model(element),
        part_name=element.model,
        control=names,
    )


def opaque(element: ElementLine, level: Level, kind: PartKind = PartKind.OPAQUE, names: Iterable[str] = ()) -> Part:
    """Keep a part that the analysis cannot use, with its pins numbered or named."""
    pin_names = tuple(names) or tuple(str(index) for index in range(1, len(element.nets) + 1))
    marks = read_marks(element.marks, {}, None, element.letter)
    return Part(
        level.prefix + element.designator,
        kind,
        _pins(element, level, unique_names(pin_names)),
        element.location,
        part_name=element.model,
        params=level.params(element) if element.params else {},
        marks=marks.words,
        is_fitted=marks.is_fitted,
    )


def unique_names(names: Iterable[str]) -> tuple[str, ...]:
    """Number repeated pin names from the second on: ``RG``, ``RG2``."""
    seen: dict[str, int] = {}
    found = []
    for name in names:
        count = seen[name] = seen.get(name, 0) + 1
        found.append(name if count == 1 else f"{name}{count}")
    return tuple(found)


BUILDERS: dict[str, Builder] = {
    **dict.fromkeys("RCL", _passive),
    "K": _coupling,
    **dict.fromkeys("VI", _independent),
    **dict.fromkeys("EGFHB", _controlled),
    **dict.fromkeys("DQJZM", _device),
    **dict.fromkeys("SW", _switch),
}


def build_part(element: ElementLine, level: Level) -> Part:
    """Return the part of an element line of a simulation deck; unknown letters become opaque parts."""
    builder = BUILDERS.get(element.letter)
    return builder(element, level) if builder is not None else opaque(element, level)
