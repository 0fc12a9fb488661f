"""Waivers: findings that somebody accepted for a reason, until a day; expired and unused ones speak up."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from typing import TYPE_CHECKING

from ..text.intent import Intent, WaiverIntent
from .findings import Finding, Remedy, RuleText, Waived

if TYPE_CHECKING:
    from ..analysis.bench import Bench

EXPIRED = RuleText(
    "waiver-expired",
    "warning",
    "a waiver is past its date",
    "A waiver holds until the day that was agreed. After it the finding counts again, so that somebody looks at it anew.",
    ("convention of this tool",),
    "waivers",
)
UNUSED = RuleText(
    "waiver-unused",
    "note",
    "a waiver matches no finding",
    "A waiver without a finding hides the next one that happens to fit. It can go once the circuit is mended.",
    ("convention of this tool",),
    "waivers",
)


def matches(waiver: WaiverIntent, finding: Finding) -> bool:
    """Tell whether a waiver speaks of a finding: same rule, and its place is a part, net, stage or subject of it."""
    if waiver.rule != finding.rule:
        return False
    wanted = waiver.where.casefold()
    places = (*finding.parts, *finding.nets, finding.subject, finding.stage or "")
    return any(each.casefold() == wanted for each in places)


def apply_waivers(findings: Sequence[Finding], bench: Bench, intent: Intent, today: date) -> list[Finding]:
    """Mark waived findings and add one for each waiver of this netlist that is expired or unused."""
    if not intent.waivers:
        return list(findings)
    found = list(findings)
    extra = []
    for waiver in intent.waivers:
        hits = [index for index, each in enumerate(found) if matches(waiver, each)]
        is_expired = waiver.until is not None and waiver.until < today
        if hits and not is_expired:
            for index in hits:
                if found[index].waived is None:
                    found[index] = replace(found[index], waived=Waived(waiver.reason, waiver.by, waiver.until))
        elif hits:
            extra.append(
                _about(waiver, EXPIRED, f"the waiver of {waiver.rule} at {waiver.where} ended on {waiver.until}")
            )
        elif _speaks_of(waiver, bench):
            extra.append(_about(waiver, UNUSED, f"the waiver of {waiver.rule} at {waiver.where} matches no finding"))
    return found + extra


def _speaks_of(waiver: WaiverIntent, bench: Bench) -> bool:
    """True when the waiver's place is in this netlist; one intent file may serve many netlists."""
    circuit = bench.circuit
    return (
        circuit.part(waiver.where) is not None
        or circuit.net(waiver.where) is not None
        or circuit.amplifier(waiver.where) is not None
        or bench.stage_of(waiver.where) is not None
    )


def _about(waiver: WaiverIntent, rule: RuleText, message: str) -> Finding:
    place = waiver.location
    remedy = "judge the finding again: mend it, or set a new date" if rule is EXPIRED else "remove the waiver"
    return Finding(
        rule=rule.name,
        level=rule.level,
        message=message,
        remedy=Remedy(remedy),
        because=rule.because,
        parts=(),
        nets=(),
        stage=None,
        file=place.file or "review.toml" if place is not None else "review.toml",
        line=(place.line or 1) if place is not None else 1,
        measured=None,
        limit=None,
        unit=None,
        fingerprint=f"{rule.name}:{waiver.rule}:{waiver.where}".casefold(),
        subject=waiver.where,
    )
