"""The CSV report: one finding a row (RFC 4180, UTF-8), for a spreadsheet or a database.

A netlist that could not be read gives one row of the level ``error`` without a rule, so that it is not taken as clean.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator

from ..rulebook.findings import Finding, NetlistReview, Review
from .formats import Options
from .wording import waiver_words

COLUMNS = (
    "netlist", "file", "line", "level", "rule", "subject", "stage", "parts", "nets", "message",
    "measured", "limit", "unit", "remedy", "remedy_verified", "waived", "fingerprint",
)  # fmt: skip

# A spreadsheet takes a cell that begins with one of these for a formula; a blank in front keeps it a text.
_FORMULA = ("=", "+", "-", "@", "\t", "\r")


def render(review: Review, options: Options) -> Iterator[str]:
    """Yield the table row by row."""
    yield _row(COLUMNS)
    for netlist in review.netlists:
        yield from (_row(_unread(netlist, index)) for index in range(len(netlist.error)))
        yield from (_row(_finding(netlist, each)) for each in netlist.findings)


def _row(cells: tuple[object, ...]) -> str:
    stream = io.StringIO()
    csv.writer(stream).writerow([_guarded(cell) for cell in cells])
    return stream.getvalue()


def _guarded(cell: object) -> object:
    return f" {cell}" if isinstance(cell, str) and cell.startswith(_FORMULA) else cell


def _finding(netlist: NetlistReview, finding: Finding) -> tuple[object, ...]:
    remedy = finding.remedy
    return (
        netlist.path, finding.file, finding.line, finding.level, finding.rule, finding.subject, finding.stage or "",
        " ".join(finding.parts), " ".join(finding.nets), finding.message,
        "" if finding.measured is None else finding.measured, "" if finding.limit is None else finding.limit,
        finding.unit or "", remedy.text if remedy else "", ("yes" if remedy.is_verified else "no") if remedy else "",
        waiver_words(finding) or "", finding.fingerprint,
    )  # fmt: skip


def _unread(netlist: NetlistReview, index: int) -> tuple[object, ...]:
    problem = netlist.error[index]
    place = problem.location
    cells: dict[str, object] = dict.fromkeys(COLUMNS, "")
    cells |= {
        "netlist": netlist.path,
        "file": place.file if place else netlist.path,
        "line": place.line if place else "",
        "level": "error",
        "message": f"cannot be read: {problem.what}",
    }
    return tuple(cells.values())
