"""The room that a stage's output has between its rails, and how much of it the signals leave."""

from __future__ import annotations

from typing import TYPE_CHECKING

from .figures import Figure, Known, Unknown
from .limits import OutputLimits, net_volts
from .measures import measure
from .stage_gain import stage_of
from .subjects import Subject

if TYPE_CHECKING:
    from ..circuit.parts import Amplifier
    from .bench import Bench


def output_amplifier(bench: Bench, subject: Subject) -> Amplifier | None:
    """Return the amplifier whose output is the stage's, else the stage's last one."""
    stage = stage_of(subject)
    found = [each for name in stage.amplifiers if (each := bench.circuit.amplifier(name)) is not None]
    for each in found:
        if each.output == stage.output:
            return each
    return found[-1] if found else None


def _limits(bench: Bench, subject: Subject) -> OutputLimits | Unknown:
    amplifier = output_amplifier(bench, subject)
    if amplifier is None:
        return Unknown("the stage has no amplifier")
    if amplifier.supply_plus is None or amplifier.supply_minus is None:
        return Unknown(f"{amplifier.name} is drawn without supply pins: its rails are not known")
    found = bench.limits.get(amplifier.name)
    if found is not None:
        return found
    for net in (amplifier.supply_plus, amplifier.supply_minus):
        if net_volts(bench.circuit, net) is None:
            return Unknown(f"the voltage of {net}, a supply of {amplifier.name}, is not known", f"[rails] {net}")
    return Unknown(f"the rails of {amplifier.name} leave no room for its headroom")


@measure("stage", unit="V")
def rail_high_v(bench: Bench, subject: Subject) -> Figure:
    """Voltage of the positive supply of the stage's output amplifier (V)."""
    found = _limits(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.rail_high_v)


@measure("stage", unit="V")
def rail_low_v(bench: Bench, subject: Subject) -> Figure:
    """Voltage of the negative supply of the stage's output amplifier (V)."""
    found = _limits(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.rail_low_v)


@measure("stage", unit="V")
def headroom_high_v(bench: Bench, subject: Subject) -> Figure:
    """Headroom that the output needs below its positive rail, from part data or a stated assumption (V)."""
    found = _limits(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.high_headroom_v, found.assumptions)


@measure("stage", unit="V")
def headroom_low_v(bench: Bench, subject: Subject) -> Figure:
    """Headroom that the output needs above its negative rail, from part data or a stated assumption (V)."""
    found = _limits(bench, subject)
    return found if isinstance(found, Unknown) else Known(found.low_headroom_v, found.assumptions)


@measure("stage", kind="word")
def rail_high(bench: Bench, subject: Subject) -> Figure:
    """Net of the positive supply of the stage's output amplifier."""
    amplifier = output_amplifier(bench, subject)
    net = amplifier.supply_plus if amplifier is not None else None
    return Known(net) if net is not None else Unknown("the amplifier is drawn without supply pins")


@measure("stage", kind="word")
def rail_low(bench: Bench, subject: Subject) -> Figure:
    """Net of the negative supply of the stage's output amplifier."""
    amplifier = output_amplifier(bench, subject)
    net = amplifier.supply_minus if amplifier is not None else None
    return Known(net) if net is not None else Unknown("the amplifier is drawn without supply pins")


@measure("stage", kind="flag")
def is_switching(bench: Bench, subject: Subject) -> Figure:
    """True for stages whose output is meant to stand at one of its limits: comparators, Schmitt triggers."""
    return Known(any(name in bench.switching for name in stage_of(subject).amplifiers))


@measure("stage", kind="flag")
def rests_at_rail(bench: Bench, subject: Subject) -> Figure:
    """True for stages whose amplifier waits at a rail by design: detectors, rectifiers, clampers, log stages, oscillators."""
    stage = stage_of(subject)
    if stage.topology == "unrecognized" and stage.output is not None:
        states = bench.solution.states
        is_limited = any(states.get(name) in ("high", "low", "off") for name in stage.amplifiers)
        if is_limited or stage.output in bench.extremes.bent:
            return Unknown("the stage is not recognized: whether it may stand at a rail is not known")
    return Known(stage.topology in WAITING)


WAITING = frozenset(
    (
        "peak-detector", "half-wave-rectifier", "full-wave-rectifier", "clamper", "logarithmic-amplifier",
        "relaxation-oscillator", "wien-bridge-oscillator",
    )
)  # fmt: skip
