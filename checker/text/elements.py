"""Fields of an element line to an :class:`ElementLine`: one small reader for each kind of element.

``ELEMENTS`` is the table of the language: letter, number of nets that always come first, and the form of the line as
an author writes it, which an error quotes.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from .lines import LogicalLine
from .netlist import Control, ElementLine, Excitation, Expression, Value, Waveform
from .tokens import Field
from .values import read_value

ELEMENTS: dict[str, tuple[int, str]] = {
    "R": (2, "R<name> net net value"),
    "C": (2, "C<name> net net value"),
    "L": (2, "L<name> net net value"),
    "K": (0, "K<name> L<name> L<name> coefficient"),
    "V": (2, "V<name> net net [DC] value [AC magnitude] [waveform]"),
    "I": (2, "I<name> net net [DC] value [AC magnitude] [waveform]"),
    "E": (2, "E<name> net net control+ control- gain"),
    "G": (2, "G<name> net net control+ control- transconductance"),
    "F": (2, "F<name> net net V<name> gain"),
    "H": (2, "H<name> net net V<name> transresistance"),
    "B": (2, "B<name> net net V=expression or I=expression"),
    "D": (2, "D<name> anode cathode model"),
    "Q": (3, "Q<name> collector base emitter model"),
    "J": (3, "J<name> drain gate source model"),
    "Z": (3, "Z<name> drain gate source model"),
    "M": (3, "M<name> drain gate source bulk model"),
    "S": (4, "S<name> net net control+ control- model"),
    "W": (2, "W<name> net net V<name> model"),
    "T": (4, "T<name> net net net net Z0=value"),
    "O": (4, "O<name> net net net net model"),
    "U": (0, "U<name> net … part"),
    "X": (0, "X<name> net … subcircuit"),
}

WAVEFORMS = frozenset({"SIN", "PULSE", "EXP", "PWL", "SFFM", "AM", "SINE", "TRNOISE", "TRRANDOM"})

_SKIPPED_WORDS = frozenset({"params:", "off", "on"})


class LineError(Exception):
    """An element line that does not fit its form; ``offset`` is that of the field at fault."""

    def __init__(self, kind: str, what: str, offset: int, length: int, expected: str, cure: str | None = None) -> None:
        super().__init__(what)
        self.kind = kind
        self.what = what
        self.offset = offset
        self.length = length
        self.expected = expected
        self.cure = cure


_CLASS = re.compile(r"^[A-Za-z]+")
_PLAIN_CLASSES = frozenset({"R", "C", "L", "D", "Q", "FB"})


def _is_plain_class(designator: str) -> bool:
    """True for designator classes whose lines a board export writes as a simulator would."""
    match = _CLASS.match(designator)
    return match is not None and match.group().upper() in _PLAIN_CLASSES


def read_element(line: LogicalLine, fields: Sequence[Field], *, is_board: bool = False) -> ElementLine:
    """Read one element line; ``is_board`` reads letters as designator classes (IEEE 315) rather than element kinds.

    Raises
    ------
    LineError
        When nets or values are missing or of the wrong form.
    """
    head = fields[0]
    letter = head.text[0].upper()
    needed, form = ELEMENTS.get(letter, (0, f"{letter}<name> net …"))
    rest = fields[1:]
    if is_board and not _is_plain_class(head.text):
        return _instance(line, head, (), list(rest), f"{head.text} net … part")
    if letter == "B":
        return _behavioural(line, head, rest, form)
    nets = rest[:needed]
    for index in range(needed):
        if index >= len(nets) or nets[index].name is not None or nets[index].form in {"braced", "quoted"}:
            place = nets[index] if index < len(nets) else None
            raise LineError(
                "net-missing",
                f"{head.text} has {index} of its {needed} nets"
                if place is None
                else f"{head.text}: `{place.text}` stands where a net is expected",
                place.offset if place else len(line.text.rstrip()),
                len(place.text) if place else 1,
                form,
            )
    names = tuple(each.bare for each in nets)
    return _READERS.get(letter, _other)(line, head, names, list(rest[needed:]), form)


def _params(fields: Sequence[Field]) -> dict[str, Value]:
    found: dict[str, Value] = {}
    for field in fields:
        if field.name is not None:
            value = field.value()
            found[field.name.lower()] = value if value is not None else Expression(field.bare)
    return found


def _words(fields: Sequence[Field]) -> list[Field]:
    return [each for each in fields if each.name is None and each.text.lower() not in _SKIPPED_WORDS]


def _passive(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    letter = head.text[0].upper()
    words = _words(rest)
    params = _params(rest)
    value: Value | None = None
    text: str | None = None
    model: str | None = None
    marks: list[str] = []
    for field in words:
        found = field.value(letter)
        if found is not None and value is None:
            value, text = found, field.bare
        elif value is None and model is None:
            model, text = field.bare, text or field.bare
        else:
            marks.append(field.bare)
    own = letter.lower()
    if value is None and own in params:
        value = params.pop(own)
    if value is None and model is None and not params:
        raise LineError("value-missing", f"{head.text} has no value", len(line.text.rstrip()), 1, form)
    if value is None and model is not None and model[0].isdigit() is True:
        field = words[0]
        raise LineError(
            "value-unreadable",
            f"{head.text}: cannot read the value `{field.text}`",
            field.offset,
            len(field.text),
            "number, number with suffix (T G MEG k m u n p f), marking code such as 4k7, or {expression}",
            _cure_for_value(field.text),
        )
    return ElementLine(
        head.text,
        letter,
        nets,
        line.place(),
        value=value,
        model=model,
        params=params,
        marks=tuple(marks),
        value_text=text,
    )


def _cure_for_value(text: str) -> str | None:
    if re.match(r"^\d+\.\.\d", text):
        fixed = text.replace("..", ".")
        return f"write {fixed}"
    if re.match(r"^\d+,\d", text):
        return f"write {text.replace(',', '.')}"
    return None


def _coupling(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    words = _words(rest)
    if len(words) < 3 or words[-1].value() is None:
        raise LineError(
            "coupling-incomplete", f"{head.text} needs two inductors and a coefficient", len(line.text), 1, form
        )
    return ElementLine(
        head.text,
        "K",
        (),
        line.place(),
        value=words[-1].value(),
        coupled=tuple(each.bare for each in words[:-1]),
        params=_params(rest),
        value_text=words[-1].text,
    )


def _source(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    letter = head.text[0].upper()
    dc: Value | None = None
    magnitude: Value | None = None
    phase: Value | None = None
    waveform: Waveform | None = None
    words = list(rest)
    index = 0
    while index < len(words):
        field = words[index]
        word = field.text.upper() if field.form == "word" else ""
        key = field.name.upper() if field.name else ""
        if key in {"DC", "AC"}:
            if key == "DC":
                dc = field.value()
            else:
                magnitude = field.value()
            index += 1
        elif key:
            index += 1
        elif word == "DC":
            index += 1
            if index < len(words) and (value := words[index].value()) is not None:
                dc = value
                index += 1
        elif word == "AC":
            index += 1
            magnitude = 1.0
            if index < len(words) and (value := words[index].value()) is not None:
                magnitude = value
                index += 1
                if index < len(words) and words[index].name is None and (value := words[index].value()) is not None:
                    phase = value
                    index += 1
        elif word in WAVEFORMS:
            values: list[Value] = []
            index += 1
            while index < len(words) and words[index].name is None and (value := words[index].value()) is not None:
                values.append(value)
                index += 1
            waveform = Waveform("SIN" if word == "SINE" else word, tuple(values))
        else:
            value = field.value()
            if value is None:
                raise LineError(
                    "source-unreadable",
                    f"{head.text}: `{field.text}` is neither a value nor a waveform",
                    field.offset,
                    len(field.text),
                    form + "; waveforms are SIN PULSE EXP PWL SFFM",
                )
            if dc is None:
                dc = value
            index += 1
    return ElementLine(
        head.text,
        letter,
        nets,
        line.place(),
        excitation=Excitation(dc, magnitude, phase, waveform),
        params=_params(rest),
    )


def _voltage_controlled(
    line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str
) -> ElementLine:
    letter = head.text[0].upper()
    control = _special_control(line, head, rest, form)
    if control is None:
        words = _words(rest)
        gain = words[2].value() if len(words) > 2 else None
        named = _params(rest)
        if gain is None:
            gain = named.get("gain") if letter == "E" else named.get("gm")
        if len(words) < 2 or gain is None:
            place = words[2] if len(words) > 2 else None
            raise LineError(
                "control-incomplete",
                f"{head.text} needs two controlling nets and a gain",
                place.offset if place else len(line.text.rstrip()),
                len(place.text) if place else 1,
                form,
            )
        control = Control("linear", nets=(words[0].bare, words[1].bare), gain=gain)
    return ElementLine(head.text, letter, nets, line.place(), value=control.gain, control=control, params=_params(rest))


def _current_controlled(
    line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str
) -> ElementLine:
    letter = head.text[0].upper()
    words = _words(rest)
    if words and words[0].text.upper() == "POLY":
        control = _poly(line, head, words, form, per_source=1)
    else:
        gain = words[1].value() if len(words) > 1 else None
        if gain is None:
            raise LineError(
                "control-incomplete",
                f"{head.text} needs a controlling source and a gain",
                len(line.text.rstrip()),
                1,
                form,
            )
        control = Control("linear", sources=(words[0].bare,), gain=gain)
    return ElementLine(head.text, letter, nets, line.place(), value=control.gain, control=control, params=_params(rest))


def _special_control(line: LogicalLine, head: Field, rest: list[Field], form: str) -> Control | None:
    first = rest[0] if rest else None
    if first is None:
        return None
    word = first.text.upper() if first.form == "word" else ""
    if word == "POLY":
        return _poly(line, head, _words(rest), form, per_source=2)
    for field in rest:
        key = (field.name or "").lower()
        if key in {"value", "vol", "cur"}:
            return Control(
                "value", expression=Expression(field.bare if field.form != "word" else _tail(line, field.offset))
            )
    if word in {"VALUE", "TABLE", "LAPLACE", "FREQ", "CHEBYSHEV"}:
        braced = [each for each in rest[1:] if each.form in {"braced", "quoted"}]
        return Control(
            word.lower(), expression=Expression(braced[0].bare if braced else _tail(line, first.offset + len(word)))
        )
    if (first.name or "").lower() in {"table", "laplace"}:
        return Control((first.name or "").lower(), expression=Expression(first.bare))
    return None


def _poly(line: LogicalLine, head: Field, words: list[Field], form: str, *, per_source: int) -> Control:
    order = words[1].value() if len(words) > 1 else None
    if not isinstance(order, float) or order < 1 or order > 50:
        raise LineError(
            "poly-unreadable",
            f"{head.text}: POLY needs its number of controls",
            words[0].offset,
            4,
            "POLY(n) control … coefficient …",
        )
    count = int(order) * per_source
    controls = words[2 : 2 + count]
    coefficients = [each.value() for each in words[2 + count :]]
    if len(controls) < count or not coefficients or None in coefficients:
        raise LineError(
            "poly-unreadable",
            f"{head.text}: POLY({int(order)}) needs {count} controls and its coefficients",
            words[0].offset,
            4,
            "POLY(n) control … coefficient …",
        )
    names = tuple(each.bare for each in controls)
    values = tuple(each for each in coefficients if each is not None)
    if per_source == 2:
        return Control("poly", nets=names, coefficients=values)
    return Control("poly", sources=names, coefficients=values)


def _tail(line: LogicalLine, offset: int) -> str:
    return line.text[offset:].strip().lstrip("=").strip().strip("{}'")


_B_FORM = re.compile(r"(?<![\w.])(?P<output>[VI])\s*=\s*(?P<expression>.+)$", re.IGNORECASE)


def _behavioural(line: LogicalLine, head: Field, rest: Sequence[Field], form: str) -> ElementLine:
    words = [each for each in rest if each.name is None][:2]
    match = _B_FORM.search(line.text)
    if len(words) < 2 or match is None or match.start() < words[1].offset:
        raise LineError(
            "behaviour-missing", f"{head.text} needs V=expression or I=expression", len(line.text.rstrip()), 1, form
        )
    control = Control(
        "value", expression=Expression(match["expression"].strip().strip("{}'")), output=match["output"].upper()
    )
    return ElementLine(head.text, "B", tuple(each.bare for each in words), line.place(), control=control)


def _modelled(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    """D, J, Z, S, W, O: nets, then a model, then an area."""
    letter = head.text[0].upper()
    words = _words(rest)
    sources: tuple[str, ...] = ()
    if letter == "W" and words:
        sources, words = (words[0].bare,), words[1:]
    if not words:
        raise LineError("model-missing", f"{head.text} names no model", len(line.text.rstrip()), 1, form)
    area = words[1].value() if len(words) > 1 else None
    marks = tuple(each.bare for each in words[1:] if each.value() is None)
    control = Control("switch", nets=nets[2:4], sources=sources) if letter in "SW" else None
    return ElementLine(
        head.text,
        letter,
        nets[:2] if letter == "S" else nets,
        line.place(),
        value=area,
        model=words[0].bare,
        params=_params(rest),
        control=control,
        marks=marks,
    )


def _transistor(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    """Q and M: three nets, perhaps a fourth, then the model: the last word that is no number."""
    letter = head.text[0].upper()
    words = _words(rest)
    if not words:
        raise LineError("model-missing", f"{head.text} names no model", len(line.text.rstrip()), 1, form)
    has_fourth = len(words) > 1 and words[1].form == "word" and read_value(words[1].text) is None
    if has_fourth:
        nets, words = (*nets, words[0].bare), words[1:]
    area = words[1].value() if len(words) > 1 else None
    return ElementLine(head.text, letter, nets, line.place(), value=area, model=words[0].bare, params=_params(rest))


def _line_element(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    words = _words(rest)
    return ElementLine(
        head.text,
        head.text[0].upper(),
        nets,
        line.place(),
        model=words[0].bare if words else None,
        params=_params(rest),
    )


def _instance(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    words = _words(rest)
    if len(words) < 2:
        raise LineError("instance-incomplete", f"{head.text} needs nets and a name", len(line.text.rstrip()), 1, form)
    return ElementLine(
        head.text,
        head.text[0].upper(),
        tuple(each.bare for each in words[:-1]),
        line.place(),
        model=words[-1].bare,
        params=_params(rest),
    )


def _other(line: LogicalLine, head: Field, nets: tuple[str, ...], rest: list[Field], form: str) -> ElementLine:
    words = _words(rest)
    return ElementLine(
        head.text,
        head.text[0].upper(),
        tuple(each.bare for each in words[:-1]),
        line.place(),
        model=words[-1].bare if words else None,
        params=_params(rest),
    )


_READERS = {
    "R": _passive,
    "C": _passive,
    "L": _passive,
    "K": _coupling,
    "V": _source,
    "I": _source,
    "E": _voltage_controlled,
    "G": _voltage_controlled,
    "F": _current_controlled,
    "H": _current_controlled,
    "D": _modelled,
    "J": _modelled,
    "Z": _modelled,
    "S": _modelled,
    "W": _modelled,
    "O": _modelled,
    "Q": _transistor,
    "M": _transistor,
    "T": _line_element,
    "U": _instance,
    "X": _instance,
}
