"""The registry of report formats: each is declared once, and its module is loaded when it is asked for.

A format is a module with ``render(review, options)`` that yields the report in pieces, so that a large report is
written as it is made.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from importlib import import_module
from importlib.util import find_spec
from typing import TypeAlias

from ..errors import Problem, UsageError
from ..quantities import nearest_names
from ..rulebook.findings import Review


@dataclass(frozen=True, slots=True)
class Options:
    """How a report is made.

    ``width`` is the number of columns, ``is_coloured`` puts terminal codes into a text report, ``is_ascii`` writes the
    signs of the trade in words. ``fail_on`` is the level from which a finding fails the review (``never`` for none).
    ``root`` is the folder that places in machine formats are relative to (None: the current one).
    """

    width: int = 80
    is_coloured: bool = False
    is_ascii: bool = False
    fail_on: str = "warning"
    root: str | None = None


Render: TypeAlias = Callable[[Review, Options], Iterator[str]]


@dataclass(frozen=True, slots=True)
class Format:
    """A report format: ``is_for_reading`` ones follow the terminal's encoding, the others are always UTF-8."""

    name: str
    module: str
    is_for_reading: bool
    means: str


FORMATS = {
    each.name: each
    for each in (
        Format("text", "as_text", True, "for a terminal or a printed page"),
        Format("json", "as_json", False, "everything that was computed, for programs"),
        Format("sarif", "as_sarif", False, "SARIF 2.1.0, for code hosts and editors"),
        Format("junit", "as_junit", False, "JUnit XML, for build servers"),
        Format("html", "as_html", False, "a review sheet for a browser and for signing"),
        Format("csv", "as_csv", False, "one finding a row, for a spreadsheet"),
    )
}


def find_format(name: str) -> tuple[Format, Render]:
    """Return a format and the function that renders it.

    Raises
    ------
    UsageError
        When there is no such format, or this version does not write it yet.
    """
    found = FORMATS.get(name)
    if found is None:
        near = nearest_names(name, FORMATS) or tuple(FORMATS)
        raise UsageError(Problem("format-unknown", f"unknown format `{name}`", nearest=near))
    place = f"{__package__}.{found.module}"
    if find_spec(place) is None:
        others = ", ".join(each for each in FORMATS if find_spec(f"{__package__}.{FORMATS[each].module}"))
        cure = f"use one of {others}"
        raise UsageError(Problem("format-missing", f"this version does not write the format `{name}` yet", cure=cure))
    render: Render = import_module(place).render
    return found, render
