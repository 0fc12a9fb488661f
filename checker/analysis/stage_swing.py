"""Where a stage's output and inputs stand, at rest and over the range of the signals."""

from __future__ import annotations

from typing import TYPE_CHECKING

from .figures import Figure, Known, Unknown
from .measures import measure
from .stage_gain import gain_doubt, signal_frequencies, stage_of
from .subjects import Subject

if TYPE_CHECKING:
    from ..circuit.parts import Amplifier
    from .bench import Bench
    from .extremes import Range


@measure("stage", unit="V")
def output_dc_v(bench: Bench, subject: Subject) -> Figure:
    """Voltage of the output net at the operating point (V)."""
    return bench.volts(stage_of(subject).output)


def _output_range(bench: Bench, subject: Subject) -> Range | Unknown:
    net = stage_of(subject).output
    return Unknown("the stage has no output net") if net is None else bench.extremes.of_net(net)


@measure("stage", unit="V")
def output_low_v(bench: Bench, subject: Subject) -> Figure:
    """Lowest output that the signals ask for, before any rail limits it (V)."""
    found = _output_range(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.low, found.assumptions)


@measure("stage", unit="V")
def output_high_v(bench: Bench, subject: Subject) -> Figure:
    """Highest output that the signals ask for, before any rail limits it (V)."""
    found = _output_range(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.high, found.assumptions)


def _first_amplifier(bench: Bench, subject: Subject) -> Amplifier | None:
    names = stage_of(subject).amplifiers
    return bench.circuit.amplifier(names[0]) if names else None


def _input_range(bench: Bench, subject: Subject) -> tuple[float, float, tuple[str, ...]] | Unknown:
    amplifier = _first_amplifier(bench, subject)
    if amplifier is None:
        return Unknown("the stage has no amplifier")
    is_switching = amplifier.name in bench.switching or amplifier.kind != "op-amp"
    ranges = []
    for net in (amplifier.plus, amplifier.minus) if is_switching else (amplifier.plus,):
        found = bench.extremes.of_net(net)
        if isinstance(found, Unknown):
            return found
        ranges.append(found)
    notes = tuple(dict.fromkeys(note for each in ranges for note in each.assumptions))
    return min(each.low for each in ranges), max(each.high for each in ranges), notes


@measure("stage", unit="V")
def input_cm_low_v(bench: Bench, subject: Subject) -> Figure:
    """Lowest voltage at the inputs of the stage's first amplifier (V): both inputs of what switches, else IN+."""
    found = _input_range(bench, subject)
    return found if isinstance(found, Unknown) else Known(found[0], found[2])


@measure("stage", unit="V")
def input_cm_high_v(bench: Bench, subject: Subject) -> Figure:
    """Highest voltage at the inputs of the stage's first amplifier (V). See ``input_cm_low_v``."""
    found = _input_range(bench, subject)
    return found if isinstance(found, Unknown) else Known(found[1], found[2])


@measure("stage", unit="A")
def output_current_a(bench: Bench, subject: Subject) -> Figure:
    """Largest magnitude of the current that the stage's last amplifier sources or sinks (A); at rest without signals."""
    stage = stage_of(subject)
    amplifier = bench.circuit.amplifier(stage.amplifiers[-1]) if stage.amplifiers else None
    if amplifier is None:
        return Unknown("the stage has no amplifier")
    row = bench.system.drivers.get(amplifier.output)
    if row is None:
        return Unknown("no branch drives the output")
    name = next(each for each, index in bench.system.branch_index.items() if index == row)
    found = bench.extremes.of_branch(name, amplifier.output)
    if isinstance(found, Unknown):
        if bench.circuit.signals or bench.doubt(amplifier.output) is not None:
            return found
        return Known(abs(bench.solution.current(name)))
    return Known(max(abs(found.low), abs(found.high)), found.assumptions)


@measure("stage", unit="V")
def offset_v(bench: Bench, subject: Subject) -> Figure:
    """Worst-case DC error at the output from offset voltage and bias current of the stage's own amplifiers (V).

    Sum over the amplifiers of ``Vos*g + Ib*(R+ , R- by their transfer to the output)``; bias currents flow the same
    way into both inputs and are taken at their maximum, or typical value where no maximum is known (then said).
    """
    import numpy as np

    stage = stage_of(subject)
    if any(name in bench.switching for name in stage.amplifiers):
        return Unknown("the stage switches: its offset shifts the thresholds")
    if stage.output is None or not stage.amplifiers:
        return Unknown("the stage has no amplifier or output")
    reason = gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    for name in stage.amplifiers:
        amplifier = bench.circuit.amplifier(name)
        for net in (amplifier.plus, amplifier.minus) if amplifier is not None else ():
            if net in bench.system.floating and net not in stage.inputs:
                return Unknown(f"net {net} has no DC path: the bias current goes nowhere")
    solver = bench.solver(stage)
    out = solver.system.index(stage.output)
    if out < 0:
        return Unknown("the output is held")
    unit = np.zeros(solver.system.size)
    unit[out] = 1.0
    weights = solver.small().factors.solve_transposed(unit)
    total = 0.0
    notes: list[str] = []
    for name in stage.amplifiers:
        row = solver.row_of(name)
        data = row.amplifier.data if row is not None else None
        if row is None or data is None or data.offset_max_v is None:
            return Unknown(f"the offset voltage of {name} is not known", f"part data of {name}")
        push = solver.input_push(row)
        if push is None:
            return Unknown(f"the gain of {name} is set inside")
        total += abs(float(weights @ push)) * data.offset_max_v
        bias = data.input_bias_max_a if data.input_bias_max_a is not None else data.input_bias_a
        if bias is None:
            notes.append("bias currents that are not known are left out of the offset")
            continue
        if data.input_bias_max_a is None:
            notes.append("bias currents are typical ones where the part data give no maximum")
        both = sum(float(weights[index]) for index in (row.plus, row.minus) if index >= 0)
        total += abs(both) * abs(bias)
    return Known(total, tuple(notes))


@measure("stage", unit="V/s")
def slew_demand_v_per_s(bench: Bench, subject: Subject) -> Figure:
    """Slew rate that the largest swing at the highest signal frequency asks for: 2*pi*f times the peak (V/s)."""
    import math

    stage = stage_of(subject)
    frequencies = signal_frequencies(bench, stage)
    if not frequencies:
        return Unknown("no signal frequency is known", f"frequency of [signals.{(stage.inputs or ('NET',))[0]}]")
    found = _output_range(bench, subject)
    if isinstance(found, Unknown):
        return found
    return Known(math.pi * frequencies[-1] * (found.high - found.low), found.assumptions)
