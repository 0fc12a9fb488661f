"""What a review holds: findings, checks that could not be made, and the counts of both."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date
from typing import Any

from ..errors import Problem

# The figures that every report gives for a stage, by their fixed names (null where they do not apply).
STAGE_MEASURES = (
    "dc_gain", "midband_gain", "gains", "signal_gain", "noise_gain", "bandwidth_hz", "phase_margin_deg",
    "output_low_v", "output_high_v", "output_dc_v", "input_cm_low_v", "input_cm_high_v",
    "cmrr_nominal_db", "cmrr_worst_db", "ratio_mismatch", "corner_hz", "quality", "time_constant_s",
    "threshold_low_v", "threshold_high_v", "hysteresis_v", "offset_v", "output_current_a", "transresistance_ohm",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Waived:
    """Who accepted a finding, why, and until when."""

    reason: str
    by: str | None = None
    until: date | None = None


@dataclass(frozen=True, slots=True)
class Remedy:
    """What to change. ``is_verified`` only when the changed circuit was computed and passes the rule."""

    text: str
    is_verified: bool = False


@dataclass(frozen=True, slots=True)
class Finding:
    """One defect: a fact with numbers.

    ``message`` stands alone; ``remedy`` says what to do; ``because`` why it matters. ``measured`` and ``limit`` are
    plain SI floats in ``unit`` (None where the defect is topological). ``follows_from`` names the fingerprint of the
    finding that causes this one. ``fingerprint`` stays when lines move or unrelated parts are added.
    """

    rule: str
    level: str
    message: str
    remedy: Remedy | None
    because: str
    parts: tuple[str, ...]
    nets: tuple[str, ...]
    stage: str | None
    file: str
    line: int
    measured: float | None
    limit: float | None
    unit: str | None
    fingerprint: str
    subject: str
    assumptions: tuple[str, ...] = ()
    waived: Waived | None = None
    follows_from: str | None = None


@dataclass(frozen=True, slots=True)
class Unevaluated:
    """A check that could not be made on a subject, and what is missing."""

    rule: str
    subject: str
    reason: str


@dataclass(frozen=True, slots=True)
class Counts:
    """Outcomes of all rule and subject pairs of a netlist."""

    passed: int = 0
    flagged: int = 0
    waived: int = 0
    unevaluated: int = 0


@dataclass(frozen=True, slots=True)
class StageReport:
    """A stage with its computed measures: ``measures`` maps every contract measure to a value or None.

    ``values`` maps each role to the values of its parts in the order of ``roles`` (SI units, None where unknown).
    """

    name: str
    topology: str
    amplifiers: tuple[str, ...]
    inputs: tuple[str, ...]
    output: str | None
    roles: Mapping[str, tuple[str, ...]]
    measures: Mapping[str, Any]
    values: Mapping[str, tuple[float | None, ...]] = field(default_factory=dict)
    properties: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    reason: str | None = None
    line: int = 0
    file: str = ""


@dataclass(frozen=True, slots=True)
class NetlistReview:
    """The review of one netlist. ``error`` holds the problems when it could not be read; then the rest is empty."""

    path: str
    title: str
    sha256: str
    error: tuple[Problem, ...] = ()
    problems: tuple[Problem, ...] = ()
    rails: tuple[tuple[str, float | None, str], ...] = ()
    stages: tuple[StageReport, ...] = ()
    findings: tuple[Finding, ...] = ()
    unevaluated: tuple[Unevaluated, ...] = ()
    counts: Counts = Counts()
    assumptions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class RuleText:
    """What a report says about a rule itself, beside its findings."""

    name: str
    level: str
    title: str
    because: str
    sources: tuple[str, ...] = ()
    concern: str = ""


@dataclass(frozen=True, slots=True)
class Review:
    """The review of one or more netlists; ``rules`` tells of every rule that was asked."""

    netlists: tuple[NetlistReview, ...]
    rules: tuple[RuleText, ...] = ()

    @property
    def findings(self) -> tuple[Finding, ...]:
        """All findings, in the order of the netlists."""
        return tuple(finding for netlist in self.netlists for finding in netlist.findings)

    @property
    def unevaluated(self) -> tuple[Unevaluated, ...]:
        """All checks that could not be made."""
        return tuple(each for netlist in self.netlists for each in netlist.unevaluated)
