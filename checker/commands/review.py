"""``ampwarden review``: netlists in, a report out."""

from __future__ import annotations

import click

from ..report import find_format
from .options import exit_status, report_options, review_options, tell_unread
from .streams import deliver

EPILOG = """\b
(*) may be given several times. A folder means all netlists below it
(.cir .net .sp .ckt .cki .spice .spi).

\b
Example:
  ampwarden review boards/ --intent review.toml --fail-on error
"""


@click.command(epilog=EPILOG)
@click.argument("paths", metavar="PATH...", nargs=-1, required=True, type=click.Path())
@review_options
def review(
    paths: tuple[str, ...],
    intent: str | None,
    form: str,
    output: str | None,
    fail_on: str,
    only: tuple[str, ...],
    skip: tuple[str, ...],
) -> int:
    """Review netlists (files or folders) and print findings."""
    from ..pipeline import review as review_netlists

    found, render = find_format(form)
    result = review_netlists(paths, intent, only=only, skip=skip)
    tell_unread(result)
    options = report_options(found, output, fail_on)
    deliver(render(result, options), output, is_for_reading=found.is_for_reading)
    return exit_status(result, fail_on)
