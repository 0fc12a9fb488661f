"""Hierarchy to flat parts: ``X1/R3`` on ``X1/n4``, values evaluated in the scope of their instance.

An instance that is an amplifier stays one part; its linear body, if it has one, travels with it for the solver.
Nothing is dropped: what cannot be evaluated keeps its place with an unknown value and a problem that says so.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

from ..errors import NetlistError, Problem
from ..quantities import nearest_names
from ..text.expressions import ExpressionError
from ..text.netlist import ElementLine, ModelLine, Netlist, Subcircuit, Value
from ..text.source import Limits
from .catalogue import Catalogue
from .devices import DIRECT_KINDS, PIN_NAMES, board_kind, device_model, drive_of, read_marks
from .macromodels import AmplifierShape, recognize_definition
from .parts import Part, PartKind, Pin
from .levels import Level

GROUND_NAMES = frozenset({"0", "gnd"})


@dataclass(slots=True)
class FlatAmplifier:
    """An instance that is an amplifier by its definition: the part, its shape, the flat parts of its linear body."""

    part: Part
    shape: AmplifierShape
    inner: tuple[Part, ...] = ()


@dataclass(slots=True)
class FlatCircuit:
    """What flattening yields; ``nets`` maps a folded name to the spelling that stands for the net."""

    parts: dict[str, Part] = field(default_factory=dict)
    nets: dict[str, str] = field(default_factory=dict)
    amplifiers: list[FlatAmplifier] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)
    ground: str | None = None


def flatten(netlist: Netlist, catalogue: Catalogue, limits: Limits | None = None) -> FlatCircuit:
    """Expand a netlist.

    Raises
    ------
    NetlistError
        When it would expand beyond the bound, a definition contains itself, or an instance does not fit its
        definition; all such problems are collected.
    """
    worker = _Flattener(netlist, catalogue, limits or Limits())
    worker.run()
    return worker.flat


class _Flattener:
    def __init__(self, netlist: Netlist, catalogue: Catalogue, limits: Limits) -> None:
        self.netlist = netlist
        self.catalogue = catalogue
        self.limits = limits
        self.flat = FlatCircuit(problems=[])
        self.globals = {name.casefold() for name in netlist.globals}
        self.is_board = netlist.style == "board"
        self._shapes: dict[tuple[int, tuple[tuple[str, float], ...]], AmplifierShape | None] = {}
        self._folded: dict[str, str] = {}
        self._errors: list[Problem] = []
        self._reported: set[str] = set()

    def run(self) -> None:
        top = Level(self.netlist.scope)
        total = self._count(top, self.netlist.scope.elements, {}, ())
        if total > self.limits.elements_after_flattening:
            raise NetlistError(
                Problem(
                    "too-many-elements",
                    f"the netlist expands to {total:.3g} elements, more than the bound of {self.limits.elements_after_flattening}",
                    cure="raise elements_after_flattening in the call of read_netlist",
                )
            )
        for element in self.netlist.scope.elements:
            self._element(element, top, "", {}, self.flat.parts)
        if self._errors:
            raise NetlistError([*self._errors, *self.netlist.problems])

    def _count(
        self, level: Level, elements: Sequence[ElementLine], known: dict[int, float], path: tuple[str, ...]
    ) -> float:
        total = 0.0
        for element in elements:
            found = level.subcircuit(element.model) if element.letter == "X" and element.model else None
            if found is None:
                total += 1
                continue
            definition, home = found
            if definition.name.lower() in path:
                circle = " -> ".join([*path, definition.name])
                raise NetlistError(
                    Problem(
                        "subcircuit-contains-itself",
                        f"subcircuit `{definition.name}` contains itself: {circle}",
                        element.location,
                    )
                )
            key = id(definition)
            if key not in known:
                inner = Level(definition.scope, home)
                known[key] = self._count(inner, definition.scope.elements, known, (*path, definition.name.lower()))
            total += max(1.0, known[key])
        return total

    # nets -----------------------------------------------------------------------------------------------------------

    def _net(self, name: str, prefix: str, ports: dict[str, str]) -> str:
        folded = name.casefold()
        if folded in GROUND_NAMES:
            if self.flat.ground is None:
                self.flat.ground = name
                self.flat.nets.setdefault("0", name)
            return self.flat.ground
        if folded in ports:
            return ports[folded]
        if prefix and folded not in self.globals:
            name = f"{prefix}{name}"
            folded = name.casefold()
        return self.flat.nets.setdefault(folded, name)

    # elements -------------------------------------------------------------------------------------------------------

    def _element(
        self, element: ElementLine, level: Level, prefix: str, ports: dict[str, str], target: dict[str, Part]
    ) -> None:
        designator = f"{prefix}{element.designator}"
        folded = designator.casefold()
        if target is self.flat.parts:
            if folded in self._folded:
                first = self.flat.parts[self._folded[folded]].location
                self._errors.append(
                    Problem(
                        "designator-twice",
                        f"designator {designator} is used twice; the first is at {first}",
                        element.location,
                        cure="renumber one of them",
                    )
                )
                return
            self._folded[folded] = designator
        nets = tuple(self._net(each, prefix, ports) for each in element.nets)
        if element.letter == "X" and not self.is_board:
            self._instance(element, designator, nets, level, prefix, target)
            return
        if self.is_board or element.letter == "U":
            kind = board_kind(element)
            if kind is not None:
                target[designator] = self._package(element, designator, nets, kind, level)
                return
        part = self._plain(element, designator, nets, level, prefix, ports)
        target[designator] = part

    def _plain(
        self,
        element: ElementLine,
        designator: str,
        nets: tuple[str, ...],
        level: Level,
        prefix: str,
        ports: dict[str, str],
    ) -> Part:
        value_of = self._reader(element, designator, level)
        kind = DIRECT_KINDS.get(element.letter, PartKind.OPAQUE)
        names = PIN_NAMES.get(kind, ())
        pins = tuple(Pin(names[index] if index < len(names) else str(index + 1), net) for index, net in enumerate(nets))
        params = {name: number for name, each in element.params.items() if (number := value_of(each)) is not None}
        model = device_model(element, level, value_of) if element.model is not None else None
        if element.model is not None and model is None and kind in _NEEDS_MODEL:
            self._missing_model(element, level)
        value = value_of(element.value) if element.value is not None else None
        multiplier = params.get("m", 1.0)
        if multiplier > 0 and multiplier != 1.0 and value is not None:
            value = value / multiplier if kind in {PartKind.RESISTOR, PartKind.INDUCTOR} else value * multiplier
        if value is None and model is not None and kind in {PartKind.RESISTOR, PartKind.CAPACITOR, PartKind.INDUCTOR}:
            value = model.params.get(element.letter.lower())
        marks = read_marks(element)
        control: tuple[str, ...] = ()
        coefficients: tuple[float, ...] = ()
        expression = None
        if element.control is not None:
            written = element.control
            control = tuple(self._net(each, prefix, ports) for each in written.nets)
            control += tuple(f"{prefix}{each}" for each in written.sources)
            coefficients = tuple(value_of(each) or 0.0 for each in written.coefficients)
            expression = written.expression.text if written.expression is not None else None
            if written.form not in {"linear", "poly", "switch"}:
                kind = PartKind.BEHAVIOURAL
            elif written.form == "poly" and written.output is None:
                value, kind = _linear_poly(kind, coefficients, value)
        drive = drive_of(element, value_of) if element.excitation is not None else None
        if drive is not None:
            value = drive.dc
        return Part(
            designator=designator,
            kind=kind,
            pins=pins,
            location=element.location,
            value=value,
            model=model,
            part_name=element.model,
            params=params,
            drive=drive,
            control=control or tuple(f"{prefix}{each}" for each in element.coupled),
            coefficients=coefficients,
            expression=expression,
            tolerance=marks.tolerance if marks.tolerance is not None else _fraction(params.get("tol")),
            rating_v=marks.rating_v,
            rating_w=marks.rating_w,
            marks=element.marks,
            is_fitted=marks.is_fitted,
        )

    def _reader(self, element: ElementLine, designator: str, level: Level) -> Callable[[Value | None], float | None]:
        def read(written: Value | None) -> float | None:
            if written is None:
                return None
            try:
                number = level.value(written)
            except ExpressionError as trouble:
                self._report(
                    Problem(
                        trouble.kind if trouble.kind != "expression" else "value-not-computed",
                        f"{designator}: {trouble}",
                        element.location,
                        level="warning",
                        because="the part is kept with an unknown value",
                    )
                )
                return None
            return number if math.isfinite(number) else None

        return read

    def _report(self, problem: Problem) -> None:
        mark = f"{problem.kind} {problem.what}"
        if mark not in self._reported:
            self._reported.add(mark)
            self.flat.problems.append(problem)

    def _missing_model(self, element: ElementLine, level: Level) -> None:
        known = [each.name for each in _models(level)]
        self._report(
            Problem(
                "model-undefined",
                f"{element.designator}: no model `{element.model}` is defined",
                element.location,
                level="warning",
                because="typical values of its kind are used",
                nearest=nearest_names(element.model or "", known),
            )
        )

    # instances ------------------------------------------------------------------------------------------------------

    def _package(
        self, element: ElementLine, designator: str, nets: tuple[str, ...], kind: PartKind, level: Level
    ) -> Part:
        marks = read_marks(element)
        return Part(
            designator=designator,
            kind=kind,
            pins=tuple(Pin(str(index + 1), net) for index, net in enumerate(nets)),
            location=element.location,
            part_name=element.model,
            marks=element.marks,
            is_fitted=marks.is_fitted,
        )

    def _instance(
        self,
        element: ElementLine,
        designator: str,
        nets: tuple[str, ...],
        level: Level,
        prefix: str,
        target: dict[str, Part],
    ) -> None:
        found = level.subcircuit(element.model) if element.model else None
        if found is None:
            known = self.catalogue.find(element.model)
            if known is None:
                names = [name for each in _levels(level) for name in each.scope.subcircuits]
                self._report(
                    Problem(
                        "subcircuit-undefined",
                        f"{designator}: no subcircuit `{element.model}` is defined",
                        element.location,
                        level="warning",
                        because="the instance is kept as an opaque part",
                        nearest=nearest_names(element.model or "", names),
                    )
                )
            target[designator] = self._package(element, designator, nets, PartKind.OPAQUE, level)
            return
        definition, home = found
        if len(nets) != len(definition.ports):
            self._errors.append(
                Problem(
                    "pin-count-differs",
                    f"{designator} has {len(nets)} nets, subcircuit `{definition.name}` has {len(definition.ports)} pins",
                    element.location,
                    expected=f"{' '.join(definition.ports)} (defined at {definition.location})",
                )
            )
            return
        given = {}
        read = self._reader(element, designator, level)
        for name, written in element.params.items():
            number = read(written)
            if number is not None:
                given[name] = number
        inner = Level(definition.scope, home, given=given, defaults=definition.params)
        key = (id(definition), tuple(sorted(given.items())))
        if key not in self._shapes:
            self._shapes[key] = recognize_definition(definition, inner, self.catalogue)
        shape = self._shapes[key]
        local = {port.casefold(): net for port, net in zip(definition.ports, nets, strict=True)}
        if shape is not None:
            pins = tuple(Pin(role, net) for role, net in zip(shape.roles, nets, strict=True))
            part = Part(designator, PartKind.AMPLIFIER, pins, element.location, part_name=element.model, params=given)
            target[designator] = part
            body = self._body(definition, inner, designator, local) if shape.is_linear else ()
            self.flat.amplifiers.append(FlatAmplifier(part, shape, body))
            return
        for each in definition.scope.elements:
            self._element(each, inner, f"{designator}/", local, target)

    def _body(self, definition: Subcircuit, level: Level, designator: str, local: dict[str, str]) -> tuple[Part, ...]:
        held: dict[str, Part] = {}
        known = dict(self.flat.nets)
        for each in definition.scope.elements:
            self._element(each, level, f"{designator}/", local, held)
        self.flat.nets = known
        return tuple(held.values())


_NEEDS_MODEL = {PartKind.DIODE, PartKind.BJT, PartKind.JFET, PartKind.MOSFET}


def _fraction(percent: float | None) -> float | None:
    return None if percent is None else percent / 100 if percent >= 0.5 else percent


def _linear_poly(kind: PartKind, coefficients: Sequence[float], value: float | None) -> tuple[float | None, PartKind]:
    """Keep a polynomial of one control with a single first-order term as a plain controlled source."""
    if len(coefficients) == 2 and coefficients[0] == 0:
        return coefficients[1], kind
    if len(coefficients) == 1:
        return coefficients[0], kind
    return value, PartKind.BEHAVIOURAL


def _levels(level: Level | None) -> list[Level]:
    found = []
    while level is not None:
        found.append(level)
        level = level.outer
    return found


def _models(level: Level) -> list[ModelLine]:
    return [model for each in _levels(level) for model in each.scope.models.values()]
