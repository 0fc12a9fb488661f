"""Hierarchy to flat parts: ``X1/R3`` for a part inside an instance, ``X1/n4`` for its inner net.

Instances of amplifiers, rail sources and packages stay one part each, with a :class:`Clue` about them; every other
definition is expanded in place, so that parts keep the order of the netlist. The number of elements is counted
through all levels before anything is expanded. Nothing is lost: what cannot be expanded or evaluated stays as a part
without a value, and a problem says why.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace

from ..errors import Location, NetlistError, Problem
from ..quantities import nearest_names
from ..text.netlist import ElementLine, Netlist, Scope, Subcircuit
from ..text.source import Limits
from .assemble import Level, NetNames, build_part, opaque
from .boards import BoardReader
from .catalogue import Catalogue
from .clues import Clue
from .definitions import BLOCK, Reading, read_definition
from .packages import named_part
from .parts import Part, PartKind
from .scopes import Frame

# A definition larger than this is a block of a design; no vendor's amplifier model comes near it.
MOST_ELEMENTS_OF_A_MODEL = 600


@dataclass(slots=True)
class FlatCircuit:
    """All parts of a netlist after flattening, with what was learned on the way."""

    parts: dict[str, Part] = field(default_factory=dict)
    clues: dict[str, Clue] = field(default_factory=dict)
    problems: list[Problem] = field(default_factory=list)
    assumptions: list[str] = field(default_factory=list)
    names: NetNames = field(default_factory=NetNames)
    folded: dict[str, str] = field(default_factory=dict)

    def add(self, part: Part) -> str:
        """Keep a part; a designator that is taken gets a mark, and a problem says so. Returns the designator kept."""
        key = part.designator.lower()
        earlier = self.folded.get(key)
        if earlier is not None:
            first = self.parts[earlier]
            count = 2
            while f"{key}~{count}" in self.folded:
                count += 1
            self.problems.append(
                Problem(
                    "designator-twice",
                    f"{part.designator} stands twice in the netlist; the first is at {first.location}",
                    part.location,
                    level="error",
                    because="readers differ in which of the two they keep",
                    cure="give one of them a designator of its own",
                )
            )
            part = replace(part, designator=f"{part.designator}~{count}")
            key = part.designator.lower()
        self.folded[key] = part.designator
        self.parts[part.designator] = part
        return part.designator


class Flattener:
    """Expands one netlist."""

    def __init__(self, netlist: Netlist, catalogue: Catalogue, limits: Limits | None = None) -> None:
        self.netlist = netlist
        self.catalogue = catalogue
        self.limits = limits or Limits()
        self.globals = frozenset(each.lower() for each in netlist.globals)
        self._readings: dict[int, Reading] = {}
        self._counts: dict[int, int] = {}
        self._board = BoardReader(catalogue) if netlist.style == "board" else None

    def run(self) -> FlatCircuit:
        """Return the flat circuit.

        Raises
        ------
        NetlistError
            When flattening would exceed a bound or a subcircuit holds itself.
        """
        top = Frame(self.netlist.scope)
        self._count_first(top)
        flat = FlatCircuit(names=NetNames(self.globals))
        level = Level(flat.names, top, problems=flat.problems)
        self._expand(self.netlist.scope, level, flat)
        if self._board is not None:
            flat.assumptions += self._board.assumptions
        return flat

    # counting

    def _count_first(self, top: Frame) -> None:
        total = self._count(top.scope, top, (), None)
        bound = self.limits.elements_after_flattening
        if total > bound:
            heaviest = max(
                (each for each in top.scope.elements if each.letter == "X"),
                key=lambda each: self._weight(each, top),
                default=None,
            )
            raise NetlistError(
                Problem(
                    "too-many-elements",
                    f"flattening would give {total} elements, more than the bound of {bound}",
                    heaviest.location if heaviest is not None else Location(self.netlist.path, 1),
                    cure="raise elements_after_flattening in the limits of the call, if the netlist is meant so",
                )
            )

    def _weight(self, element: ElementLine, frame: Frame) -> int:
        found = frame.subcircuit(element.model or "")
        return self._counts.get(id(found[0]), 1) if found is not None else 1

    def _count(self, scope: Scope, frame: Frame, path: tuple[int, ...], location: Location | None) -> int:
        if len(path) > self.limits.subcircuit_depth:
            raise NetlistError(
                Problem(
                    "nested-too-deep",
                    f"instances nested deeper than the bound of {self.limits.subcircuit_depth}",
                    location,
                    cure="raise subcircuit_depth in the limits of the call, if the netlist is meant so",
                )
            )
        total = 0
        for element in scope.elements:
            total += 1
            if element.letter != "X" or element.model is None:
                continue
            found = frame.subcircuit(element.model)
            if found is None:
                continue
            definition, home = found
            key = id(definition)
            if key in path:
                raise NetlistError(
                    Problem(
                        "subcircuit-circle",
                        f"subcircuit `{definition.name}` contains itself",
                        element.location,
                        cure=f"remove {element.designator} from the definition, or name another subcircuit there",
                    )
                )
            if key not in self._counts:
                inner = Frame(definition.scope, home)
                self._counts[key] = self._count(definition.scope, inner, (*path, key), element.location)
            total += self._counts[key]
        return total

    # expanding

    def _expand(self, scope: Scope, level: Level, flat: FlatCircuit) -> None:
        board = self._board
        for element in scope.elements:
            if element.letter == "X":
                self._instance(element, level, flat)
            elif board is not None and not level.prefix:
                for part, clue in board.read(element, level):
                    kept = flat.add(part)
                    if clue is not None and part.is_fitted:
                        flat.clues[kept] = replace(clue, designator=kept)
            elif element.letter == "U":
                self._named_part(element, level, flat)
            else:
                flat.add(build_part(element, level))

    def _instance(self, element: ElementLine, level: Level, flat: FlatCircuit) -> None:
        found = level.frame.subcircuit(element.model) if element.model is not None else None
        if found is None:
            self._undefined(element, level, flat)
            return
        definition, home = found
        if len(element.nets) != len(definition.ports):
            flat.problems.append(
                Problem(
                    "pin-count-differs",
                    f"{level.prefix}{element.designator} has {len(element.nets)} nets, its definition "
                    f"`{definition.name}` has {len(definition.ports)} pins ({' '.join(definition.ports)})",
                    element.location,
                    level="error",
                    because=f"`{definition.name}` is defined at {definition.location}",
                    cure="give one net for each pin, in the order of the definition",
                )
            )
            flat.add(opaque(element, level))
            return
        given: dict[str, float] = {}
        for name, value in element.params.items():
            evaluated = level.value(element, value)
            if evaluated is not None:
                given[name] = evaluated
        reading = self._read(definition, home, flat)
        if reading.form == "block":
            self._expand(definition.scope, self._inside(element, definition, home, given, level), flat)
            return
        inner: tuple[Part, ...] = ()
        gain = None
        if reading.has_linear_body:
            inner = self._body(element, definition, home, given, level, flat)
            gain = self._gain(reading, definition, inner, element, level)
        self._keep_opaque(element, level, flat, reading, definition.ports, inner, gain)

    def _inside(
        self, element: ElementLine, definition: Subcircuit, home: Frame, given: dict[str, float], level: Level
    ) -> Level:
        multiplier = level.multiplier * given.get("m", 1.0) if "m" not in definition.params else level.multiplier
        frame = Frame(definition.scope, home, definition.params, given)
        ports = {port.lower(): level.net(net) for port, net in zip(definition.ports, element.nets, strict=True)}
        prefix = f"{level.prefix}{element.designator}/"
        return Level(level.names, frame, prefix, ports, multiplier, level.problems)

    def _body(
        self,
        element: ElementLine,
        definition: Subcircuit,
        home: Frame,
        given: dict[str, float],
        level: Level,
        flat: FlatCircuit,
    ) -> tuple[Part, ...]:
        own = FlatCircuit(names=flat.names, problems=flat.problems)
        self._expand(definition.scope, self._inside(element, definition, home, given, level), own)
        return tuple(own.parts.values())

    def _gain(
        self, reading: Reading, definition: Subcircuit, inner: tuple[Part, ...], element: ElementLine, level: Level
    ) -> float | None:
        """Open-loop gain of this instance: that of the definition, or computed anew where parameters are given."""
        if reading.body is not None and not element.params:
            return reading.body.gain
        from .bodies import solve_body

        if not reading.channels:
            return None
        # Ports that share a net (a follower) cannot be driven apart, so the body is solved with nets of its own.
        roles = reading.channels[0]
        ports = {port: f"\0{index}" for index, port in enumerate(definition.ports)}
        frame_level = Level(NetNames(self.globals), level.frame)
        own = FlatCircuit(names=frame_level.names)
        found = level.frame.subcircuit(definition.name)
        if found is None:
            return None
        given = {name: value for name, value in level.params(element).items()}
        inside = Level(
            own.names,
            Frame(definition.scope, found[1], definition.params, given),
            "",
            {port.lower(): net for port, net in ports.items()},
        )
        self._expand(definition.scope, inside, own)
        by_role = {role: ports[definition.ports[index]] for role, index in roles.items()}
        drives = {net: 0.0 for role, net in by_role.items() if role != "OUT"}
        drives[by_role["IN+"]], drives[by_role["IN-"]] = 0.5, -0.5
        return solve_body(tuple(own.parts.values()), drives, by_role["OUT"], own.names.ground)

    def _read(self, definition: Subcircuit, home: Frame, flat: FlatCircuit) -> Reading:
        key = id(definition)
        reading = self._readings.get(key)
        if reading is None:
            if self._counts.get(key, len(definition.scope.elements)) > MOST_ELEMENTS_OF_A_MODEL:
                reading = BLOCK
            else:
                own = FlatCircuit(names=NetNames(self.globals))
                frame = Frame(definition.scope, home, definition.params)
                ports = {each.lower(): own.names.canonical(each) for each in definition.ports}
                self._expand(definition.scope, Level(own.names, frame, "", ports), own)
                reading = read_definition(
                    definition, tuple(own.parts.values()), own.clues, self.catalogue, own.names.ground
                )
            self._readings[key] = reading
            if reading.disagreement:
                flat.problems.append(
                    Problem("pin-names-contradict", reading.disagreement, definition.location, level="warning")
                )
        return reading

    def _keep_opaque(
        self,
        element: ElementLine,
        level: Level,
        flat: FlatCircuit,
        reading: Reading,
        ports: Iterable[str],
        inner: tuple[Part, ...],
        gain: float | None,
    ) -> None:
        names = tuple(ports)
        roles = list(names)
        if len(reading.channels) == 1:
            for role, index in reading.channels[0].items():
                roles[index] = role
        kind = PartKind.REGULATOR if reading.form == "rail source" else PartKind.AMPLIFIER
        part = opaque(element, level, kind, roles)
        kept = flat.add(part)
        if not part.is_fitted:
            return
        flat.clues[kept] = Clue(
            kept,
            element.location,
            part.nets,
            element.model,
            names,
            reading.channels,
            reading.orders,
            reading.data,
            reading.evidence,
            gain,
            inner,
            reading.is_certain,
        )

    def _undefined(self, element: ElementLine, level: Level, flat: FlatCircuit) -> None:
        data = self.catalogue.find(element.model)
        if data is None:
            name = element.model or ""
            known = [each.name for each in self._visible(level.frame)]
            flat.problems.append(
                Problem(
                    "subcircuit-undefined",
                    f"{level.prefix}{element.designator}: no .subckt defines `{name}`",
                    element.location,
                    level="warning",
                    because="the part is kept with its pins, but nothing is computed through it",
                    cure="include the library that defines it, or declare it under [parts] in review.toml",
                    nearest=nearest_names(name, known),
                )
            )
        self._named_part(element, level, flat)

    def _visible(self, frame: Frame) -> Iterable[Subcircuit]:
        each: Frame | None = frame
        while each is not None:
            yield from each.scope.subcircuits.values()
            each = each.parent

    def _named_part(self, element: ElementLine, level: Level, flat: FlatCircuit) -> None:
        """Keep a part that only its name describes: a U line, or an instance without definition."""
        data = self.catalogue.find(element.model)
        part, clue = named_part(
            element, level, data, is_package_line=element.letter == "U", is_board=self._board is not None
        )
        kept = flat.add(part)
        if clue is not None and part.is_fitted:
            flat.clues[kept] = replace(clue, designator=kept)
