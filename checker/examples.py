"""Runs the examples that rules and topologies carry: one runner for `ampwarden rules --check` and the project's tests."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from .errors import AmpwardenError

if TYPE_CHECKING:
    from .pipeline import Knowledge
    from .rulebook.pack import Example, Rule
    from .topology import Template


@dataclass(frozen=True, slots=True)
class ExampleOutcome:
    """What one example came to: ``trouble`` is None when it did as its file says."""

    owner: str
    title: str
    path: str
    line: int
    trouble: str | None


def run_rule_example(rule: Rule, example: Example, knowledge: Knowledge) -> ExampleOutcome:
    """Review the netlist of one example by its rule alone and compare with what the file expects."""
    from .pipeline import review_text
    from .text import parse_intent

    def outcome(trouble: str | None) -> ExampleOutcome:
        return ExampleOutcome(rule.name, example.title, rule.path, example.line, trouble)

    try:
        intent = parse_intent(example.intent, "intent of the example")
        reviewed = review_text(example.netlist, intent, name="example.cir", only=(rule.name,), knowledge=knowledge)
    except AmpwardenError as trouble:
        return outcome(f"cannot be read: {trouble.problems[0].what}")
    if reviewed.error:
        return outcome(f"cannot be read: {reviewed.error[0].what}")
    found = [each for each in reviewed.findings if each.rule == rule.name]
    if example.expect == "flagged":
        if found:
            return outcome(None)
        reasons = "; ".join(f"{each.subject}: {each.reason}" for each in reviewed.unevaluated[:3])
        return outcome(f"is not flagged{f' (not evaluated: {reasons})' if reasons else ''}")
    if found:
        return outcome(f"is flagged: {found[0].message}")
    return outcome(None)


def run_rule_examples(rules: Sequence[Rule], knowledge: Knowledge) -> Iterator[ExampleOutcome]:
    """Run all examples of rules."""
    for rule in rules:
        for example in rule.examples:
            yield run_rule_example(rule, example, knowledge)


def run_topology_examples(templates: Sequence[Template]) -> Iterator[ExampleOutcome]:
    """Run all examples of topologies; variants of one topology share theirs."""
    from .topology.exercise import run_topology_examples as run

    for each in run(templates):
        yield ExampleOutcome(each.topology, each.title, each.path, each.line, each.problem)
