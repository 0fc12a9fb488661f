"""What a follower-type stage passes of its signal, and what takes the rest."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..circuit.parts import PartKind
from .figures import Figure, Known, Unknown
from .measures import measure
from .stage_gain import input_gains, signal_frequencies, stage_of
from .subjects import Subject

if TYPE_CHECKING:
    from ..topology.stages import Stage
    from .bench import Bench

FOLLOWERS = (
    "voltage-follower",
    "non-inverting-amplifier",
    "emitter-follower",
    "source-follower",
    "buffered-output-amplifier",
)
ISOLATION_OHM = 330.0  # a series resistor up to here isolates a load; a larger one is a divider on purpose
AT_INPUT = 0.98  # share of the signal at the amplifier's input below which the network ahead of it is the cause


def _passed(bench: Bench, stage: Stage) -> tuple[float, float | None, float | None] | str:
    """Return pass-band gain to the output, gain at the signal's frequencies, gain to the load behind a series resistor."""
    if stage.topology not in FOLLOWERS:
        return "the stage is no follower"
    band = input_gains(bench, stage, midband=True)
    if isinstance(band, str):
        return band
    at_signal = None
    frequencies = signal_frequencies(bench, stage)
    if frequencies:
        found = input_gains(bench, stage, hertz=frequencies[-1])
        at_signal = None if isinstance(found, str) else abs(found[0])
    loaded = None
    far = far_end(bench, stage)
    if far is not None:
        gains = bench.solver(stage).gains(stage.inputs, far[1], midband=True)
        loaded = None if gains is None else abs(complex(gains[0]))
    return abs(band[0]), at_signal, loaded


def far_end(bench: Bench, stage: Stage) -> tuple[str, str] | None:
    """Return the isolation resistor at a stage's output and the net behind it; None without one."""
    if stage.output is None:
        return None
    circuit = bench.circuit
    taken = bench.stages_of_parts
    own_inputs = {
        net for each in circuit.amplifiers if each.name in stage.amplifiers for net in (each.plus, each.minus)
    }
    found = []
    for part in circuit.parts_on(stage.output):
        if part.kind is not PartKind.RESISTOR or part.designator in taken or part.value is None:
            continue
        other = part.pins[1].net if part.pins[0].net == stage.output else part.pins[0].net
        is_free = not circuit.is_stiff(other) and not circuit.amplifiers_at(other) and other not in own_inputs
        if 1e-3 < part.value <= ISOLATION_OHM and is_free:
            found.append((part.designator, other))
    return found[0] if len(found) == 1 else None


@measure("stage")
def passed_gain(bench: Bench, subject: Subject) -> Figure:
    """Smallest magnitude of a follower-type stage's gain: in the pass band, at the signal's frequency, behind its series resistor."""
    found = _passed(bench, stage_of(subject))
    if isinstance(found, str):
        return Unknown(found)
    return Known(min(each for each in found if each is not None))


@measure("stage", kind="word")
def loss_cause(bench: Bench, subject: Subject) -> Figure:
    """What takes the signal in a follower-type stage, in words."""
    stage = stage_of(subject)
    found = _passed(bench, stage)
    if isinstance(found, str):
        return Unknown(found)
    band, at_signal, loaded = found
    least = min(each for each in found if each is not None)
    if loaded is not None and loaded == least and loaded < 0.999 * band:
        far = far_end(bench, stage)
        assert far is not None
        return Known(f"{far[0]} in series with the output and the load on {far[1]} divide")
    if at_signal is not None and at_signal == least and at_signal < 0.99 * band:
        return Known("the bandwidth ends below the signal's frequency")
    names = attenuator_parts(bench, stage)
    if names:
        return Known(f"{', '.join(names)} divide ahead of the input")
    return Known("the feedback is not taken from the output alone")


@measure("stage", kind="words")
def loss_parts(bench: Bench, subject: Subject) -> Figure:
    """Designators of the parts that take the signal in a follower-type stage."""
    stage = stage_of(subject)
    found = _passed(bench, stage)
    if isinstance(found, str):
        return Unknown(found)
    band, at_signal, loaded = found
    if loaded is not None and loaded < 0.999 * band:
        far = far_end(bench, stage)
        return Known((far[0],) if far is not None else ())
    if at_signal is not None and at_signal < 0.99 * band:
        return Known(())
    return Known(attenuator_parts(bench, stage))


def attenuator_parts(bench: Bench, stage: Stage) -> tuple[str, ...]:
    """Return the parts that divide the signal ahead of the non-inverting input; empty when nothing does."""
    amplifier = bench.circuit.amplifier(stage.amplifiers[0]) if stage.amplifiers else None
    if amplifier is None or not stage.inputs:
        return ()
    gains = bench.solver(stage).gains(stage.inputs, amplifier.plus, midband=True)
    if amplifier.plus in stage.inputs or gains is None or abs(complex(gains[0])) >= AT_INPUT:
        return ()
    names = [*stage.roles.get("noninverting_input", ()), *stage.roles.get("bias", ())]
    return tuple(name for name in names if name in bench.circuit.parts)


@measure("stage", unit="V")
def undivided_high_v(bench: Bench, subject: Subject) -> Figure:
    """Highest output that the stage would need if nothing divided its signal: extremes over the passed gain (V)."""
    passed = bench.value("passed_gain", subject)
    low, high = bench.value("output_low_v", subject), bench.value("output_high_v", subject)
    if not passed or low is None or high is None:
        return Unknown("the extremes of the output are not known")
    return Known(max(abs(low), abs(high)) / passed)
