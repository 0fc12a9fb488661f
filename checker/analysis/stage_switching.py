"""Thresholds of stages that switch, solved with the output at each of its levels."""

from __future__ import annotations

from typing import TYPE_CHECKING

from .figures import Figure, Known, Unknown
from .measures import measure
from .operating_point import HIGH, LOW, OFF, amplifier_entries
from .solve import SingularEquations, solve_once
from .stage_gain import formula, stage_of
from .subjects import Subject
from .system import Entries

if TYPE_CHECKING:
    from ..topology.stages import Stage
    from .bench import Bench

THRESHOLD_TOPOLOGIES = frozenset(("schmitt-trigger", "comparator"))


def _thresholds(bench: Bench, stage: Stage) -> tuple[float, float] | Unknown:
    """Return the input voltages at which the output leaves its two levels, the lower first."""
    if stage.topology not in THRESHOLD_TOPOLOGIES or len(stage.amplifiers) != 1:
        return Unknown("the stage has no thresholds")
    if not stage.inputs:
        return Unknown("no net is known by which a signal enters")
    found = []
    for state in (LOW, HIGH):
        crossing = _crossing(bench, stage, state)
        if isinstance(crossing, Unknown):
            return crossing
        found.append(crossing)
    return min(found), max(found)


def _crossing(bench: Bench, stage: Stage, state: str) -> float | Unknown:
    """Return the input voltage at which the amplifier's inputs are equal while its output stands at one level."""
    import numpy as np

    system = bench.system
    name = stage.amplifiers[0]
    row = next((each for each in system.amplifiers if each.amplifier.name == name), None)
    if row is None or row.row < 0:
        return Unknown("the amplifier's limits are not modelled")
    is_off = state == HIGH and row.amplifier.is_open_output
    if row.limits is None and not is_off:
        return Unknown(f"the output levels of {name} are not known: its rails are not")
    if system.nonlinear and stage.output in bench.extremes.bent_by_junctions:
        return Unknown("a diode or transistor stands at the output: the levels depend on it")
    net = stage.inputs[0]
    driver = system.drivers.get(net)
    for each in (row.amplifier.plus, row.amplifier.minus):
        reason = bench.doubt(each) if each not in (net, stage.output) and driver is not None else None
        if reason is not None and "levels" not in reason:
            return Unknown(reason)
    entries = Entries(
        list(system.conductances.rows), list(system.conductances.columns), list(system.conductances.values)
    )
    right = list(system.sources)
    others = bench.solution.states
    for other in system.amplifiers:
        held = (OFF if is_off else state) if other is row else others[other.amplifier.name]
        amplifier_entries(other, held, entries, right)
    for part_row, value in bench.source_overrides().items():
        right[part_row] = value
    at = driver if driver is not None else system.index(net)
    if at < 0:
        return Unknown("the input net is held")
    push = np.zeros(system.size)
    push[at] = 1.0
    try:
        base = solve_once(system.size, entries, np.asarray(right))
        moved = solve_once(system.size, entries, push)
    except SingularEquations:
        return Unknown("the equations of the circuit have no single solution")

    def difference(values: np.ndarray) -> float:
        return float((values[row.plus] if row.plus >= 0 else 0.0) - (values[row.minus] if row.minus >= 0 else 0.0))

    slope = difference(moved)
    index = system.index(net)
    if abs(slope) < 1e-12 * max(1.0, abs(float(moved[index]))):
        return Unknown("the input does not move the amplifier's inputs")
    step = -difference(base) / slope
    return float(base[index]) + step * float(moved[index])


@measure("stage", unit="V")
def threshold_low_v(bench: Bench, subject: Subject) -> Figure:
    """Lower input voltage at which the output switches (V); with one threshold both are the same."""
    found = _thresholds(bench, stage_of(subject))
    return found if isinstance(found, Unknown) else Known(found[0], _level_notes(bench, stage_of(subject)))


@measure("stage", unit="V")
def threshold_high_v(bench: Bench, subject: Subject) -> Figure:
    """Upper input voltage at which the output switches (V)."""
    found = _thresholds(bench, stage_of(subject))
    return found if isinstance(found, Unknown) else Known(found[1], _level_notes(bench, stage_of(subject)))


@measure("stage", unit="V")
def hysteresis_v(bench: Bench, subject: Subject) -> Figure:
    """Distance of the two thresholds (V)."""
    found = _thresholds(bench, stage_of(subject))
    return found if isinstance(found, Unknown) else Known(found[1] - found[0], _level_notes(bench, stage_of(subject)))


def _level_notes(bench: Bench, stage: Stage) -> tuple[str, ...]:
    limits = bench.limits.get(stage.amplifiers[0])
    return limits.assumptions if limits is not None else ()


@measure("stage", unit="Hz")
def frequency_hz(bench: Bench, subject: Subject) -> Figure:
    """Frequency at which an oscillator runs, from the closed form of its topology (Hz)."""
    stage = stage_of(subject)
    found = formula(bench, stage, "frequency_hz")
    return Known(found) if found is not None else Unknown("the topology has no frequency of its own")
