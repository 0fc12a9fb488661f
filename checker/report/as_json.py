"""The JSON report: every figure, finding and open question of a review, in the format of :mod:`.schema`."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator, Mapping
from typing import Any

from ..errors import Problem
from ..rulebook.findings import Finding, NetlistReview, Review, StageReport
from ..version import __version__
from .formats import Options
from .schema import (
    FORMAT,
    CountsRecord,
    ErrorRecord,
    FindingRecord,
    Measures,
    NetlistRecord,
    ProblemRecord,
    RailRecord,
    StageRecord,
    UnevaluatedRecord,
    WaivedRecord,
)
from .wording import MEASURES


def render(review: Review, options: Options) -> Iterator[str]:
    """Yield the document, one netlist after the other."""
    head = json.dumps({"format": FORMAT, "version": __version__}, indent=2)
    yield head.removesuffix("\n}") + ',\n  "netlists": ['
    for index, netlist in enumerate(review.netlists):
        text = json.dumps(netlist_record(netlist).model_dump(), indent=2, ensure_ascii=False, allow_nan=False)
        yield ("," if index else "") + "\n    " + text.replace("\n", "\n    ")
    yield "\n  ]\n}\n" if review.netlists else "]\n}\n"


def netlist_record(netlist: NetlistReview) -> NetlistRecord:
    """Return the record of one netlist."""
    counts = netlist.counts
    return NetlistRecord(
        path=netlist.path,
        title=netlist.title,
        sha256=netlist.sha256,
        error=_error(netlist.error),
        problems=[_problem(each) for each in netlist.problems],
        rails=[RailRecord(net=net, volts=finite(volts), origin=origin) for net, volts, origin in netlist.rails],  # type: ignore[arg-type]
        stages=[_stage(each) for each in netlist.stages],
        findings=[_finding(each) for each in netlist.findings],
        unevaluated=[
            UnevaluatedRecord(rule=each.rule, subject=each.subject, reason=each.reason) for each in netlist.unevaluated
        ],
        counts=CountsRecord(
            passed=counts.passed, flagged=counts.flagged, waived=counts.waived, unevaluated=counts.unevaluated
        ),
        assumptions=list(netlist.assumptions),
    )


def finite(value: object) -> float | None:
    """Return a plain float, or None for what is no finite number."""
    if not isinstance(value, int | float) or not math.isfinite(value):
        return None
    return float(value)


def _measure(kind: str, value: object) -> Any:
    if kind == "map":
        return {str(net): finite(gain) for net, gain in value.items()} if isinstance(value, Mapping) else None
    if kind == "list":
        if value is None:
            return None
        several = value if isinstance(value, list | tuple) else (value,)
        return [each for each in map(finite, several) if each is not None]
    return finite(value)


def _stage(stage: StageReport) -> StageRecord:
    measures = {word.name: _measure(word.kind, stage.measures.get(word.name)) for word in MEASURES}
    return StageRecord(
        name=stage.name,
        topology=stage.topology,
        amplifiers=list(stage.amplifiers),
        inputs=list(stage.inputs),
        output=stage.output,
        roles={role: list(parts) for role, parts in stage.roles.items()},
        measures=Measures(**measures),
        properties={name: list(parts) for name, parts in stage.properties.items()},
        reason=stage.reason,
        notes=list(stage.notes),
        file=stage.file,
        line=stage.line,
    )


def _finding(finding: Finding) -> FindingRecord:
    waived = finding.waived
    return FindingRecord(
        rule=finding.rule,
        level=finding.level,  # type: ignore[arg-type]
        message=finding.message,
        remedy=finding.remedy.text if finding.remedy else None,
        remedy_verified=bool(finding.remedy and finding.remedy.is_verified),
        because=finding.because,
        subject=finding.subject,
        parts=list(finding.parts),
        nets=list(finding.nets),
        stage=finding.stage,
        file=finding.file,
        line=finding.line,
        measured=finite(finding.measured),
        limit=finite(finding.limit),
        unit=finding.unit,
        assumptions=list(finding.assumptions),
        waived=None
        if waived is None
        else WaivedRecord(reason=waived.reason, by=waived.by, until=waived.until.isoformat() if waived.until else None),
        follows_from=finding.follows_from,
        fingerprint=finding.fingerprint,
    )


def _problem(problem: Problem) -> ProblemRecord:
    place = problem.location
    return ProblemRecord(
        kind=problem.kind,
        level="warning" if problem.level == "warning" else "error",
        message=problem.what,
        file=place.file if place else None,
        line=place.line if place else None,
        column=place.column if place else None,
        cure=problem.cure,
    )


def _error(problems: tuple[Problem, ...]) -> ErrorRecord | None:
    if not problems:
        return None
    first = problems[0].location
    return ErrorRecord(
        message=problems[0].what,
        file=first.file if first else None,
        line=first.line if first else None,
        problems=[_problem(each) for each in problems],
    )
