"""What the reviewing commands share: options, how a report is made, and the exit status."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, TypeVar

import click

from ..errors import render_problem
from ..report.formats import FORMATS, Format, Options
from ..report.lines import is_encodable
from ..report.wording import LEVELS, fails, open_findings
from .streams import tell

if TYPE_CHECKING:
    from ..rulebook.findings import Review

Command = TypeVar("Command", bound=Callable[..., Any])

FAIL_ON = (*LEVELS, "never")


def complete_rule(ctx: click.Context, param: click.Parameter, incomplete: str) -> list[str]:
    """Return the names of shipped rules that begin as typed; files are named after their rule."""
    from ..resources import core_folder, toml_files

    names = (file.name.removesuffix(".toml") for file in toml_files(core_folder("checks")))
    return [name for name in names if name.startswith(incomplete)]


def review_options(command: Command) -> Command:
    """Add the options that every reviewing command has."""
    options = (
        click.option(
            "--intent",
            type=click.Path(),
            metavar="FILE",
            help="Intent file. [default: nearest review.toml in the netlist's folder or above]",
        ),
        click.option(
            "--format",
            "form",
            type=click.Choice(tuple(FORMATS)),
            default="text",
            show_default=True,
            help="Report format.",
        ),
        click.option("--output", type=click.Path(), metavar="FILE", help="Write the report here. [default: stdout]"),
        click.option(
            "--fail-on",
            type=click.Choice(FAIL_ON),
            default="warning",
            show_default=True,
            help="Level from which a finding gives exit status 1.",
        ),
        click.option(
            "--only", multiple=True, metavar="RULE", shell_complete=complete_rule, help="Apply this rule alone. (*)"
        ),
        click.option(
            "--skip", multiple=True, metavar="RULE", shell_complete=complete_rule, help="Leave out this rule. (*)"
        ),
    )
    for option in reversed(options):
        command = option(command)
    return command


def report_options(form: Format, output: str | None, fail_on: str) -> Options:
    """Return how a report is made for its destination: width, colour and signs follow the terminal."""
    is_terminal = output is None and sys.stdout.isatty()
    encoding = "utf-8" if output is not None or not form.is_for_reading else sys.stdout.encoding
    return Options(
        width=shutil.get_terminal_size((80, 24)).columns,
        is_coloured=is_terminal and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb",
        is_ascii=not is_encodable(encoding),
        fail_on=fail_on,
    )


def tell_unread(review: Review) -> None:
    """Write why netlists could not be read to standard error; a cause that several share is told once."""
    problems = (render_problem(problem) for netlist in review.netlists for problem in netlist.error)
    for text in dict.fromkeys(problems):
        tell(text)


def exit_status(review: Review, fail_on: str) -> int:
    """Return 2 when a netlist could not be read, 1 for open findings at or above the level, else 0."""
    if any(netlist.error for netlist in review.netlists):
        return 2
    return 1 if any(fails(each.level, fail_on) for each in open_findings(review.findings)) else 0
