"""What a stage is called, what it is made of, and what the intent file says about it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from .figures import Figure, Known, Unknown
from .measures import measure
from .stage_gain import stage_of
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench


@measure("stage", kind="word")
def topology(bench: Bench, subject: Subject) -> Figure:
    """Name of the stage's topology, ``unrecognized`` when none fits."""
    return Known(stage_of(subject).topology)


@measure("stage", kind="word")
def output(bench: Bench, subject: Subject) -> Figure:
    """Name of the output net."""
    net = stage_of(subject).output
    return Known(net) if net is not None else Unknown("the stage has no output net")


@measure("stage", kind="words")
def inputs(bench: Bench, subject: Subject) -> Figure:
    """Names of the nets by which signals enter."""
    return Known(stage_of(subject).inputs)


@measure("stage", kind="words")
def properties(bench: Bench, subject: Subject) -> Figure:
    """Properties beside the name: ac_coupled, input_filter, level_shift …"""
    return Known(tuple(stage_of(subject).properties))


@measure("stage", kind="word")
def amplifier_kind(bench: Bench, subject: Subject) -> Figure:
    """Kind of the stage's first amplifier: op-amp, comparator, instrumentation amplifier …"""
    names = stage_of(subject).amplifiers
    amplifier = bench.circuit.amplifier(names[0]) if names else None
    return Known(amplifier.kind) if amplifier is not None else Unknown("the stage has no amplifier")


def _declared(bench: Bench, subject: Subject, key: str) -> Figure:
    stage = stage_of(subject)
    for name in (stage.name, *stage.amplifiers):
        found = bench.intent.stage(name).get(key)
        if found is not None:
            return Known(float(found) if isinstance(found, int | float) and not isinstance(found, bool) else found)
    return Unknown(f"not declared: [stages.{stage.name}] {key}")


@measure("stage")
def declared_gain(bench: Bench, subject: Subject) -> Figure:
    """Gain that the intent file states for the stage (V/V)."""
    return _declared(bench, subject, "gain")


@measure("stage")
def declared_rejection(bench: Bench, subject: Subject) -> Figure:
    """Common-mode rejection that the intent file asks for (dB)."""
    return _declared(bench, subject, "rejection")


def _flag(bench: Bench, subject: Subject, key: str) -> Figure:
    found = _declared(bench, subject, key)
    return Known(bool(found.value)) if isinstance(found, Known) else Known(False)


@measure("stage", kind="flag")
def is_attenuator(bench: Bench, subject: Subject) -> Figure:
    """True when the intent file says that the stage attenuates on purpose."""
    return _flag(bench, subject, "attenuator")


@measure("stage", kind="flag")
def clips_on_purpose(bench: Bench, subject: Subject) -> Figure:
    """True when the intent file says that the stage clips on purpose."""
    return _flag(bench, subject, "clips")


@measure("stage", kind="flag")
def loop_is_outside(bench: Bench, subject: Subject) -> Figure:
    """True when the intent file says that the stage's loop closes outside the netlist: nothing here sets its output."""
    return _flag(bench, subject, "loop_outside")
