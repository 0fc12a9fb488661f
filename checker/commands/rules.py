"""``ampwarden rules``: the rules by concern, one in full, or the examples of a rule pack put to the test."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ..errors import Problem, UsageError
from ..quantities import engineering
from ..report.formats import FORMATS, Options
from ..report.lines import Line, labelled, wrap, write
from .options import report_options
from .streams import deliver, tell

if TYPE_CHECKING:
    from ..rulebook.pack import Pack, Rule

EPILOG = """\b
Example:
  ampwarden rules output-near-rail
"""

COLUMN = 12


@click.command(epilog=EPILOG)
@click.argument("name", required=False)
@click.option(
    "--check", type=click.Path(), metavar="FOLDER", help="Run the examples of a rule pack and of its topologies."
)
@click.option("--measures", is_flag=True, help="List the figures that conditions can read, and the language.")
@click.option("--intent", type=click.Path(), metavar="FILE", help="Intent file that names house rule folders.")
@click.option("--format", "form", type=click.Choice(("text", "json")), default="text", show_default=True)
def rules(name: str | None, check: str | None, measures: bool, intent: str | None, form: str) -> int:
    """List the rules, tell one in full, or run the examples of a rule pack."""
    if check is not None:
        return check_folder(Path(check))
    if measures:
        options = report_options(FORMATS["text"], None, "never")
        lines = measure_lines(options.width)
        deliver(write(lines, is_coloured=options.is_coloured, is_ascii=options.is_ascii))
        return 0
    pack = _pack(intent)
    chosen = pack.rules if name is None else (_find(pack, name),)
    if form == "json":
        records = [_record(each) for each in chosen]
        deliver([json.dumps(records, indent=2, ensure_ascii=False) + "\n"], is_for_reading=False)
        return 0
    options = report_options(FORMATS["text"], None, "never")
    lines = rule_lines(chosen[0], options.width) if name is not None else list_lines(chosen, options)
    deliver(write(lines, is_coloured=options.is_coloured, is_ascii=options.is_ascii))
    return 0


def _pack(intent: str | None) -> Pack:
    from ..rulebook import load_pack

    if intent is None:
        return load_pack()
    from ..text import read_intent

    declared = read_intent(Path(intent))
    return load_pack(declared.folders(declared.rule_folders))


def _find(pack: Pack, name: str) -> Rule:
    found = pack.find(name)
    if found is None:
        cure = "list all with `ampwarden rules`"
        raise UsageError(Problem("rule-unknown", f"no rule is named `{name}`", nearest=pack.nearest(name), cure=cure))
    return found


def _record(rule: Rule) -> dict[str, object]:
    return {
        "name": rule.name,
        "level": rule.level,
        "title": rule.title,
        "concern": rule.concern,
        "subject": rule.subject,
        "when": rule.when.text if rule.when is not None else None,
        "require": [{"level": level, "condition": text} for level, text in rule.conditions],
        "limits": {
            name: {"value": each.value, "unit": each.unit, "text": each.text} for name, each in rule.limits.items()
        },
        "because": rule.because,
        "sources": list(rule.sources),
        "path": rule.path,
    }


def list_lines(chosen: tuple[Rule, ...], options: Options) -> Iterator[Line]:
    """Yield one line a rule, grouped by concern."""
    width = max((len(rule.name) for rule in chosen), default=0)
    concern = None
    for rule in chosen:
        if rule.concern != concern:
            if concern is not None:
                yield ()
            concern = rule.concern
            yield ((concern, "heading"),)
        yield ((f"  {rule.name:<{width}}  ", ""), (f"{rule.level:<9}", rule.level), (rule.title, ""))
    yield ()
    count = len(chosen)
    yield ((f"{count} rule{'s' if count != 1 else ''}; `ampwarden rules NAME` tells one in full", ""),)


def measure_lines(width: int) -> Iterator[Line]:
    """Yield the language of conditions, then every figure under its subject, from the registry."""
    from ..analysis import list_measures
    from ..analysis.relations import RELATIONS
    from ..rulebook.conditions import describe_language

    yield from (((row, ""),) for row in describe_language().splitlines())
    subject = None
    for each in list_measures():
        if each.subject != subject:
            subject = each.subject
            yield ()
            yield ((f"of a {subject}", "heading"),)
            relations = [f"{name} ({found.members}s)" for (kind, name), found in RELATIONS.items() if kind == subject]
            if relations:
                yield from _row("members", ", ".join(relations), width)
        unit = f" ({each.unit})" if each.unit else f" ({each.kind})" if each.kind != "number" else ""
        first = each.text.split("\n\n")[0].replace("``", "")
        yield from wrap([(f"{each.name}{unit}: {' '.join(first.split())}", "")], width, 2, 6)


def rule_lines(rule: Rule, width: int) -> Iterator[Line]:
    """Yield all that is known of a rule: reason, demands, limits, sources, a flagged and a clean example."""
    yield ((rule.name, "heading"), ("  ", ""), (rule.level, rule.level), (f"  {rule.title}", ""))
    yield ()
    yield from _row("because", " ".join(rule.because.split()), width)
    yield from _row("asked of", f"each {rule.subject}" + (f" where {rule.when.text}" if rule.when else ""), width)
    for level, text in rule.conditions:
        yield from _row("demands", f"{text}  ({level} otherwise)", width)
    for name, limit in rule.limits.items():
        shown = "not set" if limit.value is None else _shown(limit.value, limit.unit)
        yield from _row("limit", f"{name} = {shown}" + (f": {limit.text}" if limit.text else ""), width)
    for source in rule.sources:
        yield from _row("source", source, width)
    for expect in ("flagged", "clean"):
        example = next((each for each in rule.examples if each.expect == expect), None)
        if example is None:
            continue
        yield ()
        yield from wrap([(f"{expect}: {example.title}", "")], width)
        rows = [f"    {row}" for row in example.netlist.strip().splitlines()]
        if example.intent:
            rows += ["  with review.toml:", *(f"    {row}" for row in example.intent.strip().splitlines())]
        yield from (((row, ""),) for row in rows)
        if expect == "flagged":
            yield from _told(rule, example.netlist, example.intent, width)


def _row(label: str, text: str, width: int) -> Iterator[Line]:
    return labelled(label, [(text, "")], width, 0, COLUMN)


def _told(rule: Rule, netlist: str, intent: str, width: int) -> Iterator[Line]:
    """Yield what a review says of the flagged example."""
    from ..pipeline import review_text
    from ..text import parse_intent

    reviewed = review_text(netlist, parse_intent(intent, "review.toml"), name="example.cir", only=(rule.name,))
    for finding in reviewed.findings[:1]:
        yield from _row("says", finding.message, width)
        if finding.remedy is not None:
            state = "verified" if finding.remedy.is_verified else "not verified"
            yield from _row("remedy", f"{finding.remedy.text}, {state}", width)


def _shown(value: float, unit: str) -> str:
    if unit == "%":
        return f"{100 * value:.3g} %"
    if unit == "":
        return f"{value:.4g}"
    return f"{value:g} {unit}" if unit in {"dB", "deg", "degC"} else engineering(value, unit)


def check_folder(folder: Path) -> int:
    """Run the examples of a house folder: its rules and topologies, on top of the shipped knowledge."""
    from ..examples import run_rule_examples, run_topology_examples
    from ..pipeline import load_knowledge

    if not folder.is_dir():
        raise UsageError(
            Problem("folder-missing", f"no folder {folder}", cure="give the folder that holds the rule files")
        )
    known = load_knowledge((folder,))
    base = folder.resolve()

    def is_inside(path: str) -> bool:
        return Path(path).resolve().is_relative_to(base)

    own_rules = [rule for rule in known.pack.rules if is_inside(rule.path)]
    own_templates = [each for each in known.templates if is_inside(each.path)]
    if not own_rules and not own_templates:
        raise UsageError(Problem("folder-empty", f"no rule and no topology below {folder}", expected="files *.toml"))
    failed = count = 0
    for outcome in run_rule_examples(own_rules, known):
        count += 1
        if outcome.trouble is not None:
            failed += 1
            tell(f"{outcome.path}:{outcome.line}  {outcome.owner}: example `{outcome.title}` {outcome.trouble}")
    named = {each.name for each in own_templates}
    for outcome in run_topology_examples(known.templates):
        if outcome.owner not in named or not is_inside(outcome.path):
            continue
        count += 1
        if outcome.trouble is not None:
            failed += 1
            tell(f"{outcome.path}:{outcome.line}  {outcome.owner}: example `{outcome.title}` {outcome.trouble}")
    things = [_count(len(own_rules), "rule", "rules"), _count(len(named), "topology", "topologies")]
    what = " and ".join(each for each in things if each)
    deliver([f"{what}, {count} examples, {failed} not as expected\n"], is_for_reading=True)
    return 1 if failed else 0


def _count(number: int, one: str, many: str) -> str:
    return "" if number == 0 else f"{number} {one if number == 1 else many}"
