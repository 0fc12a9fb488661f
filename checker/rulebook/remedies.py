"""Remedies with a value: candidates are put into the circuit, the circuit is computed again, and the rule asked anew.

A fix is a generator of proposals, most welcome first: parts to replace or to add, and the words that tell of them. The
first proposal under which the rule passes is told; without one the rule's other advice stands.
"""

from __future__ import annotations

import importlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from ..analysis.figures import Known
from ..circuit.parts import Part, PartKind, Pin
from ..quantities import engineering
from .scopes import SubjectReading

if TYPE_CHECKING:
    from ..analysis.bench import Bench
    from ..analysis.subjects import Subject
    from ..topology.stages import Stage
    from .pack import Rule

TRIALS = 6  # proposals computed for one finding
BUDGET = 300_000  # parts computed again for one netlist, over all its findings


@dataclass(frozen=True, slots=True)
class Proposal:
    """A change of the circuit and the words about it."""

    words: str
    replace: tuple[Part, ...] = ()
    add: tuple[Part, ...] = ()


Fix = Callable[[SubjectReading], Iterator[Proposal]]
FIXES: dict[str, Fix] = {}
FIX_HOMES = ("fixes_core",)  # modules that declare fixes


def known_fixes() -> dict[str, Fix]:
    """Return all declared fixes by name."""
    for module in FIX_HOMES:
        importlib.import_module(f".{module}", __package__)
    return FIXES


def fix(name: str) -> Callable[[Fix], Fix]:
    """Declare a function that proposes changes under a name that rule files use."""

    def declare(function: Fix) -> Fix:
        FIXES[name] = function
        return function

    return declare


def find_fix(name: str, rule: Rule, reading: SubjectReading) -> dict[str, str] | None:
    """Return the words of the first proposal under which the rule passes; None when none does."""
    bench = reading.bench
    size = max(len(bench.circuit.parts), 50)
    for count, proposal in enumerate(known_fixes()[name](reading)):
        if count >= TRIALS or bench.recomputed + size > BUDGET:
            return None
        bench.recomputed += size
        changed = computed_with(reading, proposal)
        if changed is None:
            continue
        from .apply import judge

        judged = judge(rule, changed)
        if judged.is_asked and judged.case is None and judged.unknown is None:
            words = {"fix": proposal.words}
            for measure in (
                "cmrr_worst_db",
                "cmrr_nominal_db",
                "output_high_v",
                "output_low_v",
                "dc_gain",
                "passed_gain",
            ):
                figure = changed.figure(measure) if changed.subject.kind == "stage" else None
                if isinstance(figure, Known) and isinstance(figure.value, float):
                    unit = {"db": "dB", "_v": "V"}.get(measure[-2:], "")
                    words[measure] = f"{figure.value:.1f} dB" if unit == "dB" else engineering(figure.value, unit)
            return words
    return None


def computed_with(reading: SubjectReading, proposal: Proposal) -> SubjectReading | None:
    """Return the reading of the same subject in the changed circuit; None when it is not there any more."""
    from ..analysis.bench import Bench
    from ..topology import find_stages

    bench = reading.bench
    circuit = bench.circuit.with_changes(replace=proposal.replace, add=proposal.add)
    changed = Bench(circuit, find_stages(circuit, bench.templates), bench.intent, templates=bench.templates)
    for subject in changed.subjects(reading.subject.kind):
        if subject.name == reading.subject.name:
            return SubjectReading(changed, subject, reading.limits)
    return None


# values and words


def series_of(bench: Bench, kind: str) -> str:
    """Return the preferred series for a kind of part: declared, else E96 for resistors and E12 for the rest."""
    return bench.intent.series.get(kind, "E96" if kind == "resistor" else "E12")


def with_value(part: Part, value: float) -> Part:
    """Return a part with another value."""
    return replace(part, value=value)


def change_words(part: Part, value: float, unit: str = "ohm") -> str:
    """Return ``R4 8.20 kΩ -> 10.0 kΩ``."""
    before = engineering(part.value, unit) if part.value is not None else "no value"
    return f"{part.designator} {before} -> {engineering(value, unit)}"


def lone_resistor(bench: Bench, stage: Stage, role: str) -> Part | None:
    """Return the resistor of a role when it is a single part."""
    names = stage.roles.get(role, ())
    parts = [
        part for name in names if (part := bench.circuit.part(name)) is not None and part.kind is PartKind.RESISTOR
    ]
    return parts[0] if len(parts) == 1 and parts[0].value else None


def _new_name(bench: Bench, letter: str) -> str:
    number = 1
    while bench.circuit.part(f"{letter}NEW{number}") is not None:
        number += 1
    return f"{letter}NEW{number}"


def two_terminal(bench: Bench, letter: str, kind: PartKind, one: str, two: str, value: float, subject: Subject) -> Part:
    """Return a new two-terminal part, named so that it clashes with none."""
    return Part(_new_name(bench, letter), kind, (Pin("1", one), Pin("2", two)), subject.location, value=value)
