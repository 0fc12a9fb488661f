"""``ampwarden stages``: what was recognized in a netlist and what it computes to, without judgement."""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import TYPE_CHECKING

import click

from ..report import FORMATS, Options
from .options import report_options, tell_unread
from .streams import deliver

if TYPE_CHECKING:
    from ..rulebook.findings import Review

EPILOG = """\b
Example:
  ampwarden stages board.cir --format json
"""

STAGES_FORMAT = "ampwarden-stages/1"


@click.command(epilog=EPILOG)
@click.argument("paths", metavar="PATH...", nargs=-1, required=True, type=click.Path())
@click.option("--intent", type=click.Path(), metavar="FILE", help="Intent file. [default: nearest review.toml]")
@click.option("--format", "form", type=click.Choice(("text", "json")), default="text", show_default=True)
@click.option("--output", type=click.Path(), metavar="FILE", help="Write the list here. [default: stdout]")
def stages(paths: tuple[str, ...], intent: str | None, form: str, output: str | None) -> int:
    """List the recognized stages with their computed figures.

    Exit status: 0, or 2 when a netlist could not be read.
    """
    from ..pipeline import survey

    found = survey(paths, intent)
    tell_unread(found)
    options = report_options(FORMATS[form], output, "never")
    pieces = _text(found, options) if form == "text" else _document(found)
    deliver(pieces, output, is_for_reading=form == "text")
    return 2 if any(netlist.error for netlist in found.netlists) else 0


def _text(found: Review, options: Options) -> Iterator[str]:
    from ..report.as_text import survey_lines
    from ..report.lines import write

    yield from write(survey_lines(found, options), is_coloured=options.is_coloured, is_ascii=options.is_ascii)


def _document(found: Review) -> Iterator[str]:
    from ..report.as_json import netlist_record
    from ..version import __version__

    kept = {"path", "title", "sha256", "error", "problems", "rails", "stages", "assumptions"}
    netlists = [netlist_record(each).model_dump(include=kept) for each in found.netlists]
    document = {"format": STAGES_FORMAT, "version": __version__, "netlists": netlists}
    yield json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
