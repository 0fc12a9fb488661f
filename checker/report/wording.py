"""Words and figures of the reports: plurals, lists, levels, and how each measure of a stage is said.

Everything here turns data into short plain texts; layout, colour and file formats are the business of others.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from ..quantities import engineering
from ..rulebook.findings import Finding, NetlistReview, Review, StageReport

LEVELS = ("error", "warning", "note")

ORIGINS = {
    "source": "from a source",
    "declared": "declared",
    "name": "from its name",
    "part": "from its part",
    "filtered": "filtered",
}


@dataclass(frozen=True, slots=True)
class MeasureWord:
    """How a measure of a stage is said: its fixed name, a short label, its unit, and whether it holds several."""

    name: str
    label: str
    unit: str
    kind: str = "number"


MEASURES = (
    MeasureWord("dc_gain", "DC gain", ""),
    MeasureWord("midband_gain", "midband gain", ""),
    MeasureWord("gains", "gain from", "", "map"),
    MeasureWord("signal_gain", "gain at the signal's frequency", ""),
    MeasureWord("noise_gain", "noise gain", ""),
    MeasureWord("bandwidth_hz", "bandwidth", "Hz"),
    MeasureWord("phase_margin_deg", "phase margin", "deg"),
    MeasureWord("output_low_v", "lowest output", "V"),
    MeasureWord("output_high_v", "highest output", "V"),
    MeasureWord("output_dc_v", "output at rest", "V"),
    MeasureWord("input_cm_low_v", "lowest common mode", "V"),
    MeasureWord("input_cm_high_v", "highest common mode", "V"),
    MeasureWord("cmrr_nominal_db", "CMRR nominal", "dB"),
    MeasureWord("cmrr_worst_db", "CMRR worst", "dB"),
    MeasureWord("ratio_mismatch", "ratio mismatch", "%"),
    MeasureWord("corner_hz", "corner", "Hz", "list"),
    MeasureWord("quality", "Q", ""),
    MeasureWord("time_constant_s", "time constant", "s"),
    MeasureWord("threshold_low_v", "lower threshold", "V"),
    MeasureWord("threshold_high_v", "upper threshold", "V"),
    MeasureWord("hysteresis_v", "hysteresis", "V"),
    MeasureWord("offset_v", "offset worst", "V"),
    MeasureWord("output_current_a", "output current", "A"),
    MeasureWord("transresistance_ohm", "transresistance", "ohm"),
)

# Pairs of measures that read better as one range.
RANGES = {
    "output_low_v": ("output_high_v", "output"),
    "input_cm_low_v": ("input_cm_high_v", "common mode"),
    "threshold_low_v": ("threshold_high_v", "thresholds"),
}

# Gains that agree within this fraction are said once.
SAME_GAIN = 5e-4


def plural(count: int, noun: str, nouns: str | None = None) -> str:
    """Return a counted noun: ``1 finding``, ``2 findings``."""
    return f"{count} {noun if count == 1 else nouns or noun + 's'}"


def listing(words: Sequence[str], most: int | None = None) -> str:
    """Return ``a``, ``a and b``, ``a, b and c``; beyond ``most`` words the rest is counted."""
    if most is not None and len(words) > most:
        return f"{', '.join(words[:most])} and {len(words) - most} more"
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} and {words[-1]}"


def volts_or_unknown(volts: float | None) -> str:
    """Return a rail's voltage in words."""
    return "voltage unknown" if volts is None else engineering(volts, "V")


def stage_facts(stage: StageReport) -> tuple[tuple[str, str], ...]:
    """Return the known figures of a stage as (label, text) pairs, in the order of the format's measures."""
    measures = stage.measures
    facts: list[tuple[str, str]] = []
    said: set[str] = set()
    for word in MEASURES:
        value = measures.get(word.name)
        if value is None or word.name in said:
            continue
        if word.kind == "map":
            facts.extend(_gains(value, measures))
            continue
        label, text = word.label, _figures(value, word.unit)
        if word.name == "midband_gain" and _is_same(value, measures.get("dc_gain")):
            continue
        if word.name == "dc_gain" and _is_same(value, measures.get("midband_gain")):
            label = "gain"
        if word.name in RANGES and measures.get(RANGES[word.name][0]) is not None:
            other, label = RANGES[word.name]
            said.add(other)
            text = f"{text} to {_figures(measures[other], word.unit)}"
        facts.append((label, text))
    return tuple(facts)


def _is_same(value: object, other: object) -> bool:
    if not isinstance(value, int | float) or not isinstance(other, int | float):
        return False
    return abs(value - other) <= SAME_GAIN * max(abs(value), abs(other))


def _figures(value: object, unit: str) -> str:
    if isinstance(value, Mapping):
        return ", ".join(f"{name} {_figures(each, unit)}" for name, each in value.items())
    if isinstance(value, list | tuple):
        return ", ".join(engineering(each, unit) for each in value)
    return engineering(float(value), unit) if isinstance(value, int | float) else str(value)


def _gains(value: object, measures: Mapping[str, object]) -> Iterable[tuple[str, str]]:
    """Gains by input net; a single one that repeats the gain said before is left out."""
    if not isinstance(value, Mapping):
        return
    known = {net: gain for net, gain in value.items() if gain is not None}
    if len(known) == 1 and _is_same(next(iter(known.values())), measures.get("dc_gain")):
        return
    for net, gain in known.items():
        yield f"gain from {net}", _figures(gain, "")


def figures_of(finding: Finding) -> tuple[tuple[str, str], ...]:
    """Return what was measured, the limit and the distance between them, as far as they are known."""
    if finding.measured is None:
        return ()
    unit = finding.unit or ""
    facts = [("measured", engineering(finding.measured, unit))]
    if finding.limit is not None:
        facts.append(("limit", engineering(finding.limit, unit)))
        distance = abs(finding.measured - finding.limit)
        if distance > 1e-9 * max(abs(finding.limit), abs(finding.measured)):
            facts.append(("margin", engineering(-distance, unit)))
    return tuple(facts)


def remedy_words(finding: Finding) -> str | None:
    """Return the remedy with its mark, or None: ``verified`` means that the changed circuit was computed and passes."""
    if finding.remedy is None:
        return None
    return f"{finding.remedy.text}, {'verified' if finding.remedy.is_verified else 'not verified'}"


def waiver_words(finding: Finding) -> str | None:
    """Return who waived a finding, until when and why, or None for an open finding."""
    if finding.waived is None:
        return None
    waived = finding.waived
    by = f" by {waived.by}" if waived.by else ""
    until = f" until {waived.until.isoformat()}" if waived.until else ""
    return f"waived{by}{until}: {waived.reason}"


def open_findings(findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """Return the findings that no waiver covers."""
    return tuple(each for each in findings if each.waived is None)


def fails(level: str, fail_on: str) -> bool:
    """Tell whether a finding of this level fails a review that fails on ``fail_on``."""
    return fail_on in LEVELS and LEVELS.index(level) <= LEVELS.index(fail_on)


def count_levels(findings: Iterable[Finding]) -> dict[str, int]:
    """Count open findings by level, the gravest first."""
    counts = dict.fromkeys(LEVELS, 0)
    for finding in open_findings(findings):
        counts[finding.level] = counts.get(finding.level, 0) + 1
    return counts


def level_words(findings: Iterable[Finding]) -> str:
    """Return ``2 errors, 1 warning``; ``no findings`` when nothing is open."""
    counts = count_levels(findings)
    said = [plural(count, level) for level, count in counts.items() if count]
    return ", ".join(said) or "no findings"


def check_words(netlist: NetlistReview) -> str:
    """Return the outcomes of all checks on a netlist: every pair of rule and subject is in exactly one count."""
    counts = netlist.counts
    return (
        f"{counts.passed} passed, {counts.flagged} flagged, {counts.waived} waived, {counts.unevaluated} not evaluated"
    )


def verdict(review: Review) -> str:
    """Return the outcome of a review in one line; an unreadable netlist and an open question are never left out."""
    netlists = review.netlists
    if not netlists:
        return "nothing to review: no netlist found"
    unread = sum(1 for each in netlists if each.error)
    parts = [f"{level_words(review.findings)} in {plural(len(netlists), 'netlist')}"]
    if unread == len(netlists):
        parts = ["nothing judged"]
    if unread:
        parts.append(f"{unread} not read")
    waived = sum(each.counts.waived for each in netlists)
    if waived:
        parts.append(f"{waived} waived")
    unknown = sum(each.counts.unevaluated for each in netlists)
    if unknown:
        parts.append(f"{unknown} not evaluated")
    return "; ".join(parts)
