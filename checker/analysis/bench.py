"""The bench: a circuit with its stages on it, and every figure computed once, when somebody asks."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property
from typing import TYPE_CHECKING

from ..circuit.graph import Circuit
from ..circuit.parts import PartKind
from ..text.intent import Intent
from ..topology.stages import Stage
from .believable import BELIEVABLE_V, RUNS_AWAY, tidy
from .figures import Figure, Known, Unknown
from .limits import OutputLimits, net_volts, output_limits
from .measures import compute_measure
from .operating_point import HIGH, LOW, NoOperatingPoint, OperatingPoint, solve_operating_point
from .solve import SingularEquations
from .subjects import Subject

if TYPE_CHECKING:
    from ..topology import Template
    from .extremes import Extremes
    from .regions import Region
    from .small_signal import SmallSignal
    from .stage_solver import StageSolver
    from .system import System
    from .transfer import Transfer

SWITCHING_TOPOLOGIES = frozenset(("comparator", "window-comparator", "schmitt-trigger", "relaxation-oscillator"))


class Bench:
    """Figures of one circuit.

    Parameters
    ----------
    circuit, stages
        What was read and recognized.
    intent
        What the designer declared.
    templates
        The topologies by which the stages were recognized, for circuits that are changed and computed again.
    """

    def __init__(
        self,
        circuit: Circuit,
        stages: Iterable[Stage],
        intent: Intent | None = None,
        *,
        templates: Sequence[Template] | None = None,
    ) -> None:
        self.circuit = circuit
        self.stages = tuple(stages)
        self.intent = intent if intent is not None else Intent()
        self.templates = templates
        self.recomputed = 0
        self._figures: dict[tuple[str, str, str], Figure] = {}
        self._asked: list[tuple[str, str, str]] = []
        self._subjects: dict[str, tuple[Subject, ...]] = {}
        self.related: dict[tuple[str, str], dict[str, list[Subject]]] = {}
        self._limits: dict[str, OutputLimits | None] | None = None
        self._system: System | None = None
        self._solution: OperatingPoint | NoOperatingPoint | None = None
        self._others: dict[str, OperatingPoint | NoOperatingPoint] = {}
        self._linear: dict[tuple[float, bool], SmallSignal | None] = {}
        self._regions: dict[str, Region] | None = None
        self._solvers: dict[str, StageSolver] = {}
        self.transfers: dict[tuple[str, bool], Transfer | str] = {}
        self._doubts: dict[str, str] | None = None
        self._stage_of: dict[str, Stage] = {
            name.casefold(): stage for stage in self.stages for name in (stage.name, *stage.amplifiers)
        }

    # figures and subjects

    def figure(self, name: str, subject: Subject) -> Figure:
        """Return one figure of a subject; computed on the first question, kept after it."""
        key = (subject.kind, subject.name, name)
        known = self._figures.get(key)
        if known is not None:
            return known
        if key in self._asked:
            return Unknown(f"{name} of {subject.name} is defined by itself")
        self._asked.append(key)
        try:
            found = compute_measure(self, subject, name)
        except NoOperatingPoint as trouble:
            found = Unknown(f"no operating point: {trouble}")
        except SingularEquations:
            found = Unknown("the equations of the circuit have no single solution")
        finally:
            self._asked.pop()
        self._figures[key] = found
        return found

    def value(self, name: str, subject: Subject) -> float | None:
        """Return a figure as a plain number; None when it is unknown or no number."""
        found = self.figure(name, subject)
        return float(found.value) if isinstance(found, Known) and isinstance(found.value, int | float) else None

    def subjects(self, kind: str) -> tuple[Subject, ...]:
        """Return all subjects of a kind, in netlist order."""
        if kind not in self._subjects:
            from .listing import list_subjects

            self._subjects[kind] = list_subjects(self, kind)
        return self._subjects[kind]

    def subject_of_stage(self, name: str) -> Subject:
        """Return the subject of a stage, by the name of the stage or of one of its amplifiers.

        Raises
        ------
        KeyError
            When there is no such stage.
        """
        stage = self.stage_of(name)
        if stage is None:
            raise KeyError(name)
        for subject in self.subjects("stage"):
            if subject.name == stage.name:
                return subject
        raise KeyError(name)

    def stage_of(self, name: str) -> Stage | None:
        """Return the stage of an amplifier or of a stage's name."""
        return self._stage_of.get(name.casefold())

    @cached_property
    def stages_of_parts(self) -> dict[str, str]:
        """The stage of each part that has a role in one, by designator."""
        from .listing import stages_of_parts

        return stages_of_parts(self)

    # the solved circuit

    @property
    def limits(self) -> Mapping[str, OutputLimits | None]:
        """Output limits by amplifier name; None where the rails are not known."""
        if self._limits is None:
            self._limits = {each.name: output_limits(self.circuit, each) for each in self.circuit.amplifiers}
        return self._limits

    @cached_property
    def switching(self) -> dict[str, str]:
        """Amplifiers that only switch, with the state from which the solve starts."""
        found = {}
        for stage in self.stages:
            for name in stage.amplifiers:
                amplifier = self.circuit.amplifier(name)
                if amplifier is None:
                    continue
                if stage.topology in SWITCHING_TOPOLOGIES or amplifier.kind == "comparator":
                    found[name] = LOW
        return found

    @property
    def system(self) -> System:
        """The equations."""
        if self._system is None:
            from .system import build_system

            self._system = build_system(self.circuit, self.limits, self.forced_volts())
        return self._system

    def forced_volts(self) -> dict[str, float]:
        """Return the nets that are held by what the netlist does not draw: declared signals, rails by name or part."""
        circuit = self.circuit
        forced: dict[str, float] = {}
        for net, rail in circuit.rails.items():
            is_drawn = circuit.is_held(net) or rail.origin == "filtered" or bool(circuit.amplifiers_at(net))
            if rail.volts is not None and not is_drawn and net != circuit.ground:
                forced[net] = rail.volts
        for net in circuit.grounds:
            if net != circuit.ground and not circuit.is_held(net):
                forced[net] = 0.0
        for net, signal in circuit.signals.items():
            is_drawn = signal.source is not None or circuit.is_stiff(net) or bool(circuit.amplifiers_at(net))
            if not is_drawn and not signal.is_current and signal.low is not None and signal.high is not None:
                forced[net] = (signal.low + signal.high) / 2
        return forced

    def source_overrides(self) -> dict[int, float]:
        """Return source rows whose voltage the intent file moves: a declared range that leaves out the drawn value."""
        found = {}
        for net, signal in self.circuit.signals.items():
            if signal.origin != "declared" or signal.source is None or signal.low is None or signal.high is None:
                continue
            part = self.circuit.part(signal.source)
            row = self.system.branch_index.get(signal.source)
            if part is None or row is None or part.value is None:
                continue
            if not signal.low <= part.value <= signal.high and part.pins[0].net == net:
                found[row] = (signal.low + signal.high) / 2
        return found

    @property
    def solution(self) -> OperatingPoint:
        """The operating point.

        Raises
        ------
        NoOperatingPoint
            When there is none.
        """
        if self._solution is None:
            try:
                self._solution = solve_operating_point(self.system, self.switching, self.source_overrides())
            except NoOperatingPoint as trouble:
                self._solution = trouble
        if isinstance(self._solution, NoOperatingPoint):
            raise self._solution
        return self._solution

    def solution_from(self, state: str) -> OperatingPoint:
        """Return the operating point with all switching amplifiers starting ``high`` or ``low``; see :attr:`solution`."""
        if state == LOW:
            return self.solution
        if state not in self._others:
            start = dict.fromkeys(self.switching, HIGH)
            try:
                self._others[state] = solve_operating_point(self.system, start, self.source_overrides())
            except NoOperatingPoint as trouble:
                self._others[state] = trouble
        found = self._others[state]
        if isinstance(found, NoOperatingPoint):
            raise found
        return found

    # small signals

    def solver(self, stage: Stage) -> StageSolver:
        """Return the solved region of a stage."""
        if self._regions is None:
            from .regions import regions_of

            self._regions = regions_of(self)
        region = self._regions[stage.amplifiers[0]] if stage.amplifiers else None
        if region is not None and {*stage.amplifiers} <= {each.name for each in region.amplifiers}:
            key = region.amplifiers[0].name
        else:
            key = f"{stage.name} as a whole"
            if key not in self._solvers:
                from .regions import region_around

                members = [each for each in self.circuit.amplifiers if each.name in stage.amplifiers]
                nets = [net for net in (stage.output, *stage.inner_nets.values()) if net is not None]
                region = region_around(self, members, nets)
        if key not in self._solvers:
            from .stage_solver import StageSolver

            assert region is not None
            self._solvers[key] = StageSolver(self, region)
        return self._solvers[key]

    def whole(self, hertz: float = 0.0, *, midband: bool = False) -> SmallSignal:
        """Return the whole circuit for small signals: what carries a signal over several stages.

        Raises
        ------
        SingularEquations
            When the equations have no single solution.
        """
        key = (hertz, midband)
        if key not in self._linear:
            from .small_signal import SmallSignal
            from .stage_solver import junction_entries

            try:
                self._linear[key] = SmallSignal(
                    self.system,
                    junction_entries(self, self.system),
                    self.switching,
                    hertz,
                    shorted=self.coupling_capacitors if midband else (),
                    gain_bandwidth_hz=self.gain_bandwidth_hz,
                )
            except SingularEquations:
                self._linear[key] = None
        found = self._linear[key]
        if found is None:
            raise SingularEquations
        return found

    @cached_property
    def coupling_capacitors(self) -> tuple[str, ...]:
        """Capacitors that stand in the way of DC only: in series with a signal or a gain leg, or across a reference."""
        from ..topology.references import is_bypassed_divider

        found: dict[str, None] = {}
        for stage in self.stages:
            for key in ("ac_coupled", "gain_leg_coupled"):
                found.update(dict.fromkeys(stage.properties.get(key, ())))
            if stage.topology == "sallen-key-high-pass":
                found.update(dict.fromkeys(name for names in stage.roles.values() for name in names))
        circuit = self.circuit
        for name, part in circuit.parts.items():
            if part.kind is not PartKind.CAPACITOR or len(part.nets) != 2 or not part.is_fitted:
                continue
            one, two = part.nets
            for net, other in ((one, two), (two, one)):
                if circuit.is_stiff(other) and not circuit.is_stiff(net) and is_bypassed_divider(circuit, net):
                    found[name] = None
        return tuple(name for name in found if name in circuit.parts and circuit.parts[name].kind is PartKind.CAPACITOR)

    @cached_property
    def gain_bandwidth_hz(self) -> dict[str, float]:
        """Gain-bandwidth products by amplifier name (Hz), from part data."""
        return {
            each.name: each.data.gbw_hz
            for each in self.circuit.amplifiers
            if each.data is not None and each.data.gbw_hz and not each.inner and each.kind != "comparator"
        }

    @cached_property
    def extremes(self) -> Extremes:
        """Ranges over the signals."""
        from .extremes import Extremes

        return Extremes(self)

    # what may not be believed

    def doubt(self, net: str | None) -> str | None:
        """Return why the voltage of a net at the operating point is not known; None when it is."""
        if net is None:
            return "no net"
        if self._doubts is None:
            from .doubts import find_doubts

            self._doubts = find_doubts(self)
        return self._doubts.get(net)

    def volts(self, net: str | None) -> Figure:
        """Return the voltage of a net at the operating point, or why it is not known (V)."""
        if net is None:
            return Unknown("the pin is not in the netlist")
        fixed = net_volts(self.circuit, net)
        if fixed is not None:
            return Known(fixed)
        reason = self.doubt(net)
        if reason is not None:
            return Unknown(reason)
        try:
            found = self.solution.voltage(net)
        except NoOperatingPoint as trouble:
            return Unknown(f"no operating point: {trouble}")
        return Known(tidy(found)) if abs(found) < BELIEVABLE_V else Unknown(RUNS_AWAY)
