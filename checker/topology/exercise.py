"""Run the examples that topology files carry: each netlist is read, built and recognized as a user's would be."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from ..circuit.build import build_circuit
from ..errors import AmpwardenError
from ..text.read import parse_netlist
from .recognize import find_stages
from .templates import Example, Template


@dataclass(frozen=True, slots=True)
class ExampleOutcome:
    """What an example of a topology gave: ``problem`` is None when it is as expected."""

    topology: str
    title: str
    path: str
    line: int
    problem: str | None


def run_topology_examples(templates: Sequence[Template]) -> tuple[ExampleOutcome, ...]:
    """Run every example once; variants of one topology share theirs."""
    outcomes = []
    seen: set[tuple[str, str]] = set()
    for template in templates:
        for example in template.examples:
            if (template.name, example.title) in seen:
                continue
            seen.add((template.name, example.title))
            outcomes.append(
                ExampleOutcome(
                    template.name, example.title, template.path, example.line, _run(template, example, templates)
                )
            )
    return tuple(outcomes)


def _run(template: Template, example: Example, templates: Sequence[Template]) -> str | None:
    try:
        circuit = build_circuit(parse_netlist(example.netlist, name=template.path))
        stages = find_stages(circuit, templates)
    except AmpwardenError as trouble:
        return f"the netlist cannot be read: {trouble.problems[0].what}"
    if example.stage is not None:
        wanted = [
            stage for stage in stages if example.stage.casefold() in (name.casefold() for name in stage.amplifiers)
        ]
        if not wanted:
            return f"there is no stage {example.stage}"
        stage = wanted[0]
    elif len(stages) == 1:
        stage = stages[0]
    else:
        return f"the netlist has {len(stages)} stages; the example must name one"
    if example.expect == "not":
        return f"it was taken for {template.name}" if stage.topology == template.name else None
    if stage.topology != example.expect:
        return f"expected {example.expect}, found {stage.topology}" + (f" ({stage.reason})" if stage.reason else "")
    return None
