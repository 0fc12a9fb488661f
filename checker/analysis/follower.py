"""What a follower-type stage passes of its signal, and what takes the rest."""

from __future__ import annotations

from dataclasses import dataclass
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


@dataclass(frozen=True, slots=True)
class Passage:
    """Gains of a follower-type stage: in its pass band, what its amplifier's bandwidth leaves of it, behind its series resistor."""

    band: float
    by_bandwidth: float
    loaded: float


def _passage(bench: Bench, stage: Stage) -> Passage | str:
    if stage.topology not in FOLLOWERS:
        return "the stage is no follower"
    gains = input_gains(bench, stage, midband=True)
    if isinstance(gains, str):
        return gains
    band = abs(gains[0])
    solver = bench.solver(stage)
    by_bandwidth = loaded = band
    frequencies = signal_frequencies(bench, stage)
    if frequencies and stage.output is not None:
        # a filter ahead of the input is meant; only what the amplifier itself loses counts
        real = solver.gains(stage.inputs, stage.output, hertz=frequencies[-1])
        ideal = solver.gains(stage.inputs, stage.output, hertz=frequencies[-1], ideal=True)
        if real is not None and ideal is not None and abs(ideal[0]) > 1e-9:
            by_bandwidth = band * abs(complex(real[0])) / abs(complex(ideal[0]))
    far = far_end(bench, stage)
    if far is not None:
        behind = solver.gains(stage.inputs, far[1], midband=True)
        loaded = band if behind is None else abs(complex(behind[0]))
    return Passage(band, by_bandwidth, loaded)


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
    """Magnitude of a follower-type stage's gain in its pass band, less what its amplifier's bandwidth takes at the signal."""
    found = _passage(bench, stage_of(subject))
    return Unknown(found) if isinstance(found, str) else Known(min(found.band, found.by_bandwidth))


@measure("stage")
def loaded_gain(bench: Bench, subject: Subject) -> Figure:
    """Magnitude of a follower-type stage's gain to the net behind the series resistor at its output."""
    found = _passage(bench, stage_of(subject))
    return Unknown(found) if isinstance(found, str) else Known(found.loaded)


@measure("stage", kind="flag")
def is_in_larger_loop(bench: Bench, subject: Subject) -> Figure:
    """True when the stage's amplifiers share a feedback loop with amplifiers of other stages: its own gain says little."""
    stage = stage_of(subject)
    if not stage.amplifiers:
        return Known(False)
    names = {each.name for each in bench.solver(stage).region.amplifiers}
    return Known(bool(names - set(stage.amplifiers)))


@measure("stage", kind="word")
def loss_cause(bench: Bench, subject: Subject) -> Figure:
    """What takes the signal in a follower-type stage, in words."""
    stage = stage_of(subject)
    found = _passage(bench, stage)
    if isinstance(found, str):
        return Unknown(found)
    if found.by_bandwidth < 0.99 * found.band:
        return Known("the amplifier's bandwidth ends below the signal's frequency")
    names = attenuator_parts(bench, stage)
    if names:
        return Known(f"{', '.join(names)} divide ahead of the input")
    return Known("the feedback is not taken from the output alone")


@measure("stage", kind="words")
def loss_parts(bench: Bench, subject: Subject) -> Figure:
    """Designators of the parts that divide ahead of a follower-type stage's input."""
    return Known(attenuator_parts(bench, stage_of(subject)))


@measure("stage", kind="word")
def series_resistor(bench: Bench, subject: Subject) -> Figure:
    """Designator of the resistor in series with the stage's output."""
    far = far_end(bench, stage_of(subject))
    return Known(far[0]) if far is not None else Unknown("no resistor stands in series with the output")


@measure("stage", kind="word")
def load_net(bench: Bench, subject: Subject) -> Figure:
    """Net behind the resistor in series with the stage's output."""
    far = far_end(bench, stage_of(subject))
    return Known(far[1]) if far is not None else Unknown("no resistor stands in series with the output")


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
