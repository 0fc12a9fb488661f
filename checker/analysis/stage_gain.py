"""Gains and impedances of a stage, from the solve of its region."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from ..text.expressions import ExpressionError, evaluate
from ..topology.stages import Stage
from .doubts import spread_doubts
from .figures import Figure, Known, Unknown
from .measures import measure
from .subjects import CURRENT_INPUT, Subject

if TYPE_CHECKING:
    from .bench import Bench

JUNCTION_TOPOLOGIES = frozenset(
    ("peak-detector", "half-wave-rectifier", "full-wave-rectifier", "clamper", "logarithmic-amplifier")
)
OSCILLATORS = frozenset(("relaxation-oscillator", "wien-bridge-oscillator"))
TWO_SIDED = frozenset(("difference-amplifier", "instrumentation-amplifier"))
NO_GAIN = frozenset(("unused-amplifier", "virtual-ground"))


def stage_of(subject: Subject) -> Stage:
    """Return the stage of a subject of kind stage."""
    stage = subject.item
    assert isinstance(stage, Stage)
    return stage


def has_no_gain(bench: Bench, stage: Stage) -> str | None:
    """Return why a stage has no gain to speak of; None when it has one."""
    if any(name in bench.switching for name in stage.amplifiers):
        return "the stage switches: it has thresholds, not a gain"
    if stage.topology in JUNCTION_TOPOLOGIES:
        return "the gain depends on which diodes conduct"
    if stage.topology in OSCILLATORS:
        return "the stage makes its own signal"
    if stage.topology in NO_GAIN:
        return "no signal enters the stage"
    if stage.output is None:
        return "the stage has no output net"
    if not stage.inputs:
        return "no net is known by which a signal enters"
    return None


def gain_doubt(bench: Bench, stage: Stage) -> str | None:
    """Return why the gains of a stage cannot be computed: a part of it has no value or no model."""
    solver = bench.solver(stage)
    held = (*stage.inputs, *solver.region.edges)
    origins = {}
    for name, reason in solver.system.left_out.items():
        part = bench.circuit.part(name)
        for net in part.nets if part is not None else ():
            if net not in held and net not in solver.system.drivers:
                origins[net] = reason
    for row in solver.system.amplifiers:
        if row.is_packaged and row.fixed_gain is None:
            origins[row.amplifier.output] = _gain_wanted(row.amplifier.name, row.amplifier.data is None)
    if not origins:
        return None
    return spread_doubts(bench, origins, held=held).get(stage.output or "")


def _gain_wanted(name: str, has_no_data: bool) -> str:
    return f"the gain of {name} is not known: {'its part data are missing' if has_no_data else 'its gain resistor was not found'}"


def input_gains(bench: Bench, stage: Stage, *, midband: bool = False, hertz: float = 0.0) -> list[complex] | str:
    """Return the gain from each input of a stage to its output, or why there is none."""
    reason = has_no_gain(bench, stage) or gain_doubt(bench, stage)
    if reason is not None:
        return reason
    assert stage.output is not None
    found = bench.solver(stage).gains(stage.inputs, stage.output, midband=midband, hertz=hertz)
    if found is None:
        return "the input nets cannot be moved by themselves"
    return [_clean(complex(each)) for each in found]


def _clean(value: complex) -> complex:
    return 0j if abs(value) < 1e-9 else value


def headline(stage: Stage, gains: list[complex]) -> complex:
    """Return the gain that speaks for the stage: the differential one of two-sided stages, else the first input's."""
    if stage.topology in TWO_SIDED and len(gains) == 2:
        return (gains[0] - gains[1]) / 2
    return gains[0]


@measure("stage")
def dc_gain(bench: Bench, subject: Subject) -> Figure:
    """Signed gain at DC from the first input to the output; the differential gain of a difference stage (V/V).

    From the nodal solve with finite open-loop gain, capacitors open, the other inputs held.
    """
    stage = stage_of(subject)
    if stage.topology in CURRENT_INPUT:
        return Unknown("the input is a current: see transresistance_ohm")
    gains = input_gains(bench, stage)
    return Unknown(gains) if isinstance(gains, str) else Known(headline(stage, gains).real)


@measure("stage")
def midband_gain(bench: Bench, subject: Subject) -> Figure:
    """Signed gain in the pass band: coupling capacitors short, band-limiting ones open (V/V).

    Where the pass band lies between capacitors of both kinds, the largest magnitude over frequency counts.
    """
    stage = stage_of(subject)
    if stage.topology in CURRENT_INPUT:
        return Unknown("the input is a current: see transresistance_ohm")
    reason = has_no_gain(bench, stage) or gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    if stage.topology in PEAKED:
        from .stage_response import peak_gain

        found = peak_gain(bench, stage)
        return Known(found) if found is not None else Unknown("the pass band was not found")
    gains = input_gains(bench, stage, midband=True)
    return Unknown(gains) if isinstance(gains, str) else Known(headline(stage, gains).real)


PEAKED = frozenset(("multiple-feedback-band-pass", "charge-amplifier"))


@measure("stage", kind="map")
def gains(bench: Bench, subject: Subject) -> Figure:
    """Signed DC gain from each input net to the output, the others held (V/V), for stages with several inputs."""
    stage = stage_of(subject)
    if len(stage.inputs) < 2:
        return Unknown("the stage has one input: see dc_gain")
    found = input_gains(bench, stage)
    if isinstance(found, str):
        return Unknown(found)
    return Known({net: each.real for net, each in zip(stage.inputs, found, strict=True)})


def signal_frequencies(bench: Bench, stage: Stage) -> tuple[float, ...]:
    """Return the frequencies of the signals that enter by a stage's inputs, else of all signals (Hz), ascending."""
    signals = bench.circuit.signals
    own = {each for net in stage.inputs if net in signals for each in signals[net].frequencies_hz}
    found = own or {each for signal in signals.values() for each in signal.frequencies_hz}
    return tuple(sorted(found))


@measure("stage")
def signal_gain(bench: Bench, subject: Subject) -> Figure:
    """Magnitude of the gain at the signal's frequency, with the amplifiers' bandwidth; the smallest over a band's ends (V/V)."""
    stage = stage_of(subject)
    frequencies = signal_frequencies(bench, stage)
    if not frequencies:
        return Unknown("no signal frequency is known", f"frequency of [signals.{(stage.inputs or ('NET',))[0]}]")
    smallest = math.inf
    for hertz in (frequencies[0], frequencies[-1]):
        found = input_gains(bench, stage, hertz=hertz)
        if isinstance(found, str):
            return Unknown(found)
        smallest = min(smallest, abs(headline(stage, found)))
    return Known(smallest)


@measure("stage")
def noise_gain(bench: Bench, subject: Subject) -> Figure:
    """Gain for an error in series with the amplifier's own input, ideal amplifier: 1/beta in the pass band (V/V).

    From the closed-loop gain g and the open-loop gain A: 1/(1/g - 1/A).
    """
    stage = stage_of(subject)
    if any(name in bench.switching for name in stage.amplifiers):
        return Unknown("the stage switches: no loop is closed")
    if stage.topology in JUNCTION_TOPOLOGIES:
        return Unknown("the loop depends on which diodes conduct")
    if stage.topology == "unrecognized" and bench.solver(stage).system.nonlinear:
        return Unknown("diodes or transistors stand in a loop that is not recognized")
    if len(stage.amplifiers) != 1:
        return Unknown("the stage has several amplifiers, each with its own noise gain")
    reason = gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    solver = bench.solver(stage)
    row = solver.row_of(stage.amplifiers[0])
    if row is None:
        return Unknown("the amplifier stands in no equation")
    closed = solver.closed_gain(row, midband=True)
    if closed is None or closed == 0:
        return Unknown("the amplifier's gain is set inside")
    inverse = 1 / closed.real - 1 / row.amplifier.gain
    if inverse <= 1e-9:
        return Unknown("no negative feedback reaches the inverting input at DC")
    return Known(1 / inverse)


def _return_ratio(bench: Bench, subject: Subject) -> tuple[float, float, tuple[str, ...]] | Unknown:
    """Return the return ratio of the stage's amplifier at DC and its open-loop gain."""
    import numpy as np

    stage = stage_of(subject)
    noise = bench.figure("noise_gain", subject)
    if isinstance(noise, Unknown):
        return noise
    amplifier = bench.circuit.amplifier(stage.amplifiers[0])
    ratio = bench.solver(stage).loop_gain(stage.amplifiers[0], np.array([0.0]))
    if ratio is None or amplifier is None:
        return Unknown("the loop gain could not be computed")
    notes = () if amplifier.gain_origin != "assumed" else (f"open-loop gain of {amplifier.gain:.0e} assumed",)
    return float(ratio[0].real), amplifier.gain, notes


@measure("stage")
def loop_gain(bench: Bench, subject: Subject) -> Figure:
    """Return ratio of the stage's amplifier at DC: open-loop gain times feedback factor, output resistance included (V/V)."""
    found = _return_ratio(bench, subject)
    return found if isinstance(found, Unknown) else Known(found[0], found[2])


@measure("stage")
def feedback_factor(bench: Bench, subject: Subject) -> Figure:
    """Share of the amplifier's unloaded output that returns to its input: loop gain over open-loop gain."""
    found = _return_ratio(bench, subject)
    return found if isinstance(found, Unknown) else Known(found[0] / found[1], found[2])


def current_input(bench: Bench, stage: Stage) -> str | None:
    """Return the net into which a stage's input current flows: its first input, else the amplifier's inverting input."""
    if stage.inputs:
        return stage.inputs[0]
    amplifier = bench.circuit.amplifier(stage.amplifiers[0]) if stage.amplifiers else None
    return amplifier.minus if amplifier is not None else None


@measure("stage", unit="ohm")
def transresistance_ohm(bench: Bench, subject: Subject) -> Figure:
    """Output voltage for a current into the input net, at DC (ohm)."""
    stage = stage_of(subject)
    if stage.topology not in CURRENT_INPUT:
        return Unknown("the input is a voltage: see dc_gain")
    net = current_input(bench, stage)
    if stage.output is None or net is None:
        return Unknown("input or output net is not known")
    reason = gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    import numpy as np

    solver = bench.solver(stage)
    right = np.zeros(solver.system.size)
    row = solver.system.index(net)
    if row < 0:
        return Unknown("the input net is held")
    right[row] = 1.0
    return Known(float(solver.small().factors.solve(right)[solver.system.index(stage.output)]))


@measure("stage", unit="ohm")
def input_resistance_ohm(bench: Bench, subject: Subject) -> Figure:
    """Resistance at DC between the first input net and ground, seen by what drives it (ohm)."""
    stage = stage_of(subject)
    reason = has_no_gain(bench, stage) or gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    import numpy as np

    solver = bench.solver(stage)
    small = solver.small()
    net = stage.inputs[0]
    pushed = small.response([net])[:, 0]
    branch = solver.system.drivers.get(net)
    volts = float(pushed[solver.system.index(net)])
    if branch is None:
        return Known(volts)
    current = -float(pushed[branch])  # the source's branch current flows into its plus pin
    if np.isclose(current, 0.0, atol=1e-15):
        return Unknown("no DC current flows into the input")
    return Known(volts / current)


@measure("stage", unit="ohm")
def output_resistance_ohm(bench: Bench, subject: Subject) -> Figure:
    """Resistance at DC between the output net and ground, the loop closed and the inputs held (ohm)."""
    stage = stage_of(subject)
    if stage.output is None:
        return Unknown("the stage has no output net")
    reason = gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    solver = bench.solver(stage)
    if stage.output in solver.system.drivers:
        return Unknown("the amplifier's output resistance is not modelled")
    return Known(solver.small().impedance(stage.output).real)


def formula(bench: Bench, stage: Stage, name: str) -> float | None:
    """Return what the topology's closed form says about a measure; None without one or without its values."""
    text = stage.formulas.get(name)
    if text is None:
        return None
    try:
        found = evaluate(text, stage.values)
    except ExpressionError:
        return None
    return found if math.isfinite(found) else None
