"""Lines of schematic exports: part kinds follow the designator classes of IEEE 315 and ASME Y14.44.

Packages list their nets in rising pin order. Pin 1 of a two-pin diode is its cathode (IPC-7351 land pattern custom);
a transistor's pin order differs from package to package, so it stays opaque until it is declared. A trimmer is two
resistors that meet at the wiper, computed at mid travel. Whatever is assumed is said once.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field

from ..text.netlist import ElementLine
from ..text.values import read_value
from .assemble import Level, build_part, opaque
from .catalogue import Catalogue
from .clues import Clue
from .marks import Marks, read_marks
from .packages import named_part
from .parts import DeviceModel, Part, PartKind, Pin

_CLASS = re.compile(r"^[A-Za-z]+")

CLASSES: dict[str, str] = {
    **dict.fromkeys(("R", "RT", "TH", "RTH"), "resistor"),
    **dict.fromkeys(("RV", "VR", "POT", "TR", "P"), "trimmer"),
    **dict.fromkeys(("RN", "RA", "RP"), "array"),
    "C": "capacitor",
    "L": "inductor",
    **dict.fromkeys(("FB", "FL", "BD", "E"), "ferrite"),
    **dict.fromkeys(("D", "CR", "LED", "LD", "ZD", "DZ", "TVS", "VZ"), "diode"),
    **dict.fromkeys(("Q", "VT", "TQ"), "transistor"),
    **dict.fromkeys(("J", "P", "X", "CN", "CON", "JP", "XP", "XS", "CONN"), "connector"),
    **dict.fromkeys(("TP", "MP"), "test point"),
    **dict.fromkeys(("SW", "S"), "switch"),
    **dict.fromkeys(("F", "FS"), "fuse"),
    **dict.fromkeys(("BT", "BAT", "B"), "battery"),
    **dict.fromkeys(("U", "IC", "A", "N"), "package"),
    **dict.fromkeys(("NT", "LK", "W"), "link"),
}


@dataclass(slots=True)
class BoardReader:
    """Reads the element lines of a schematic export; ``assumptions`` collects what had to be assumed."""

    catalogue: Catalogue
    assumptions: list[str] = field(default_factory=list)

    def read(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, Clue | None]]:
        """Yield the part or parts of one line, each with a clue when it may be an amplifier or a rail source."""
        match = _CLASS.match(element.designator)
        letters = match.group().upper() if match else element.letter
        kind = CLASSES.get(letters, "")
        if letters in {"P", "VR", "TR", "X"}:
            kind = self._doubtful(element, letters)
        if letters == "JP" and len(element.nets) == 2:
            kind = "switch"
        maker = getattr(self, f"_{kind.replace(' ', '_')}", None)
        if maker is not None:
            yield from maker(element, level)
            return
        yield from self._package(element, level)

    def _doubtful(self, element: ElementLine, letters: str) -> str:
        """Classes that two customs use: a part number decides, then a resistance, then the number of pins."""
        if self.catalogue.find(element.model) is not None:
            return "package"
        is_resistance = element.model is not None and read_value(element.model, "R") is not None
        if is_resistance and len(element.nets) in {2, 3}:
            return "trimmer"
        return "connector" if letters in {"P", "X"} else "package"

    def _note(self, text: str) -> None:
        if text not in self.assumptions:
            self.assumptions.append(text)

    def _marks(self, element: ElementLine, level: Level, letter: str) -> Marks:
        return read_marks(element.marks, level.params(element), element.value_text or element.model, letter)

    def _two_pin(self, element: ElementLine, level: Level, kind: PartKind, value: float | None, marks: Marks) -> Part:
        nets = [level.net(each) for each in element.nets[:2]]
        return Part(
            level.prefix + element.designator,
            kind,
            (Pin("1", nets[0]), Pin("2", nets[1])),
            element.location,
            value=value,
            part_name=element.model,
            tolerance=marks.tolerance,
            rating_v=marks.rating_v,
            rating_w=marks.rating_w,
            marks=marks.words,
            is_fitted=marks.is_fitted,
        )

    def _plain(self, element: ElementLine, level: Level, letter: str, kind: PartKind) -> Iterator[tuple[Part, None]]:
        if element.letter == letter and element.designator[:1].upper() == letter and element.value is not None:
            yield build_part(element, level), None
        elif len(element.nets) != 2:
            yield opaque(element, level), None
        else:
            marks = self._marks(element, level, letter)
            value = level.value(element, element.value) if element.value is not None else marks.value
            yield self._two_pin(element, level, kind, value, marks), None

    def _resistor(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        return self._plain(element, level, "R", PartKind.RESISTOR)

    def _capacitor(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        return self._plain(element, level, "C", PartKind.CAPACITOR)

    def _inductor(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        return self._plain(element, level, "L", PartKind.INDUCTOR)

    def _ferrite(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        if len(element.nets) != 2:
            yield opaque(element, level), None
            return
        marks = self._marks(element, level, "R")
        part = self._two_pin(element, level, PartKind.INDUCTOR, None, marks)
        yield part, None

    def _fuse(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        if len(element.nets) != 2:
            yield opaque(element, level), None
            return
        self._note("fuses and links are taken as closed, 0 Ω")
        marks = self._marks(element, level, "R")
        yield self._two_pin(element, level, PartKind.RESISTOR, 0.0, marks), None

    def _link(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        return self._fuse(element, level)

    def _battery(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        if len(element.nets) != 2:
            yield opaque(element, level), None
            return
        marks = self._marks(element, level, "V")
        volts = marks.value if marks.value is not None else marks.rating_v
        self._note("pin 1 of a battery is its positive pole")
        yield self._two_pin(element, level, PartKind.VOLTAGE_SOURCE, volts, marks), None

    def _diode(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        if len(element.nets) != 2:
            yield opaque(element, level), None
            return
        self._note("pin 1 of a two-pin diode is its cathode")
        cathode, anode = (level.net(each) for each in element.nets)
        marks = self._marks(element, level, "D")
        yield (
            Part(
                level.prefix + element.designator,
                PartKind.DIODE,
                (Pin("anode", anode), Pin("cathode", cathode)),
                element.location,
                model=level.model(element),
                part_name=element.model,
                marks=marks.words,
                is_fitted=marks.is_fitted,
            ),
            None,
        )

    def _transistor(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        data = self.catalogue.find(element.model)
        kinds = {"bipolar transistor": PartKind.BJT, "MOSFET": PartKind.MOSFET, "junction FET": PartKind.JFET}
        if data is not None and data.kind in kinds and len(data.pin_order) == len(element.nets):
            pins = tuple(
                Pin(name.lower(), level.net(net)) for name, net in zip(data.pin_order, element.nets, strict=True)
            )
            polarity = DeviceModel(data.name, (data.technology or "").upper())
            yield (
                Part(
                    level.prefix + element.designator,
                    kinds[data.kind],
                    pins,
                    element.location,
                    model=polarity,
                    part_name=element.model,
                ),
                None,
            )
            return
        yield opaque(element, level), None

    def _trimmer(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        marks = self._marks(element, level, "R")
        total = level.value(element, element.value) if element.value is not None else marks.value
        nets = [level.net(each) for each in element.nets]
        if len(nets) == 2:
            yield self._two_pin(element, level, PartKind.RESISTOR, total, marks), None
            return
        if len(nets) != 3:
            yield opaque(element, level), None
            return
        self._note("trimmers are computed at mid travel, pin 2 is the wiper")
        half = None if total is None else total / 2
        low, wiper, high = nets
        base = self._two_pin(element, level, PartKind.RESISTOR, half, marks)
        for end, first, second in (("1", low, wiper), ("2", wiper, high)):
            if first == second:
                continue
            yield (
                Part(
                    f"{base.designator}.{end}",
                    PartKind.RESISTOR,
                    (Pin("1", first), Pin("2", second)),
                    element.location,
                    value=half,
                    part_name=element.model,
                    params={"travel": 0.5, **({"total": total} if total is not None else {})},
                    tolerance=marks.tolerance,
                    marks=("trimmer", *marks.words),
                    is_fitted=marks.is_fitted,
                ),
                None,
            )

    def _array(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        if len(element.nets) == 2:
            return self._plain(element, level, "R", PartKind.RESISTOR)
        return iter([(opaque(element, level), None)])

    def _connector(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        yield opaque(element, level, PartKind.CONNECTOR), None

    def _test_point(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        yield opaque(element, level), None

    def _switch(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, None]]:
        yield opaque(element, level, PartKind.SWITCH), None

    def _package(self, element: ElementLine, level: Level) -> Iterator[tuple[Part, Clue | None]]:
        data = self.catalogue.find(element.model)
        yield named_part(element, level, data, is_package_line=True, is_board=True)
