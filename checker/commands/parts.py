"""``ampwarden parts``: what is known of amplifier and supply parts, with where it was read."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import asdict, fields
from typing import TYPE_CHECKING

import click

from ..errors import Problem, UsageError
from ..quantities import engineering, nearest_names
from ..report.formats import FORMATS, Options
from ..report.lines import Line, Span, labelled, wrap, write
from .options import report_options
from .streams import deliver

if TYPE_CHECKING:
    from ..circuit.catalogue import Catalogue
    from ..circuit.partdata import PartData

EPILOG = """\b
Example:
  ampwarden parts OPA2134
"""

# Units by the end of a field's name, the longest ending first.
UNITS = (
    ("_v_per_s", "V/s"), ("_v_rthz", "V/rtHz"), ("_load_f", "F"), ("_ohm", "ohm"), ("_hz", "Hz"), ("_db", "dB"),
    ("_v", "V"), ("_a", "A"),
)  # fmt: skip

# The width of the labels beside the figures of a part.
COLUMN = 26

_APART = {"name", "kind", "aliases", "source", "verified", "from_memory", "notes", "pinouts", "extra"}


@click.command(epilog=EPILOG)
@click.argument("name", required=False)
@click.option("--intent", type=click.Path(), metavar="FILE", help="Intent file that names house parts.")
@click.option("--format", "form", type=click.Choice(("text", "json")), default="text", show_default=True)
def parts(name: str | None, intent: str | None, form: str) -> int:
    """List the part data, or tell one part in full with its sources."""
    catalogue = _catalogue(intent)
    chosen = catalogue.parts if name is None else (_find(catalogue, name),)
    if form == "json":
        records = [{key: value for key, value in asdict(each).items() if value is not None} for each in chosen]
        deliver([json.dumps(records, indent=2, ensure_ascii=False) + "\n"], is_for_reading=False)
        return 0
    options = report_options(FORMATS["text"], None, "never")
    lines = part_lines(chosen[0], options.width) if name is not None else list_lines(chosen, options)
    deliver(write(lines, is_coloured=options.is_coloured, is_ascii=options.is_ascii))
    return 0


def _catalogue(intent: str | None) -> Catalogue:
    from ..circuit.catalogue import load_catalogue

    if intent is None:
        return load_catalogue()
    from pathlib import Path

    from ..text import read_intent

    declared = read_intent(Path(intent))
    return load_catalogue(declared.folders(declared.rule_folders), declared.parts)


def _find(catalogue: Catalogue, name: str) -> PartData:
    found = catalogue.find(name)
    if found is None:
        cure = "declare it in review.toml under [parts.NAME], or list all with `ampwarden parts`"
        near = nearest_names(name, (number for each in catalogue.parts for number in (each.name, *each.aliases)))
        raise UsageError(Problem("part-unknown", f"no part data for `{name}`", nearest=near, cure=cure))
    return found


def list_lines(chosen: tuple[PartData, ...], options: Options) -> Iterator[Line]:
    """Yield one line a part under its kind, the kinds in the order of their names."""
    by_kind: dict[str, list[PartData]] = {}
    for each in chosen:
        by_kind.setdefault(each.kind, []).append(each)
    for kind in sorted(by_kind):
        yield ((kind, "heading"),)
        for each in sorted(by_kind[kind], key=lambda part: part.name):
            facts = [f"{count} in a package" for count in each.channels if count > 1]
            if each.supply_total_min_v is not None and each.supply_total_max_v is not None:
                low, high = (engineering(volts, "V") for volts in (each.supply_total_min_v, each.supply_total_max_v))
                facts.append(f"supply {low} to {high}")
            if each.gbw_hz is not None:
                facts.append(f"gain-bandwidth {engineering(each.gbw_hz, 'Hz')}")
            facts.extend(f"output {engineering(volts, 'V')}" for volts in each.fixed_output_v)
            yield from wrap([(f"{each.name:<16}", "part.name"), (", ".join(facts), "")], options.width, 2, 18)
        yield ()
    yield ((f"{len(chosen)} parts; `ampwarden parts NAME` tells one in full", "label"),)


def part_lines(part: PartData, width: int) -> Iterator[Line]:
    """Yield everything that is known of a part; figures recalled rather than read carry a mark."""
    yield from wrap([(part.name, "heading"), (f"  {part.kind}", "")], width)
    if part.aliases:
        yield from labelled("also", [(", ".join(part.aliases), "")], width, 2, COLUMN)
    for each in fields(part):
        value = getattr(part, each.name)
        if each.name in _APART or value is None or (isinstance(value, tuple | Mapping) and not value):
            continue
        mark = "" if part.is_read(each.name) or isinstance(value, str | tuple) else "  (from memory, not read)"
        spans: list[Span] = [(_said(each.name, value), "figure"), (mark, "label")]
        yield from labelled(_label(each.name), spans, width, 2, COLUMN)
    for pinout in part.pinouts:
        roles = "   ".join(f"{number}\u00a0{role}" for role, number in pinout.roles)
        yield from labelled(f"pins, {pinout.package}", [(roles, "")], width, 2, COLUMN)
    for key, figure in part.extra.items():
        yield from labelled(key.replace("_", " "), [(engineering(figure, _unit(key)), "figure")], width, 2, COLUMN)
    for label, text in (("notes", part.notes), ("source", part.source), ("verified", part.verified)):
        if text:
            yield from labelled(label, [(text, "")], width, 2, COLUMN)


def _unit(name: str) -> str:
    return next((unit for ending, unit in UNITS if name.endswith(ending)), "")


def _label(name: str) -> str:
    ending = next((ending for ending, _ in UNITS if name.endswith(ending)), "")
    short = name if ending == "_load_f" else name.removesuffix(ending)
    return short.removesuffix("_f").replace("_", " ").replace("gbw", "gain-bandwidth").replace("cmrr", "CMRR")


def _said(name: str, value: object) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, tuple):
        return ", ".join(_said(name, each) for each in value)
    if isinstance(value, Mapping):
        return ", ".join(f"{key} {_said(name, each)}" for key, each in value.items())
    if isinstance(value, int) and name == "channels":
        return str(value)
    return engineering(float(value), _unit(name)) if isinstance(value, int | float) else str(value)
