"""Applies rules to the subjects of a circuit: every pair is passed, flagged, waived or unevaluated, none is skipped."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import TYPE_CHECKING

from ..analysis.figures import Known, Unknown
from ..analysis.subjects import Subject
from ..errors import IntentError, Location, Problem
from ..quantities import nearest_names, parse_quantity
from ..text.intent import Intent
from .findings import Counts, Finding, Remedy, Unevaluated
from .pack import Case, Pack, Rule
from .scopes import SubjectReading
from .waivers import apply_waivers

if TYPE_CHECKING:
    from ..analysis.bench import Bench
    from .conditions import Verdict

AMPLIFIER_SUBJECTS = frozenset(("amplifier", "input pin", "supply pin", "supply net", "package", "stage"))


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the rules said about one circuit."""

    findings: tuple[Finding, ...]
    unevaluated: tuple[Unevaluated, ...]
    counts: Counts


@dataclass(frozen=True, slots=True)
class Judgement:
    """What one rule says of one subject: a failed case with its verdict, what is not known, or neither (passed)."""

    case: Case | None = None
    verdict: Verdict | None = None
    unknown: Unknown | None = None
    is_asked: bool = True


def apply_pack(
    pack: Pack,
    bench: Bench,
    intent: Intent,
    *,
    only: Sequence[str] = (),
    skip: Sequence[str] = (),
    today: date | None = None,
) -> Outcome:
    """Apply all rules that are on.

    Raises
    ------
    IntentError
        When the intent file names a rule or a limit that does not exist.
    """
    check_intent(pack, intent)
    findings: list[Finding] = []
    unevaluated: list[Unevaluated] = []
    passed = 0
    for rule in pack.rules:
        if rule.name in intent.rules_off or rule.name in skip or (only and rule.name not in only):
            continue
        limits = rule_limits(rule, intent)
        for subject in bench.subjects(rule.subject):
            reading = SubjectReading(bench, subject, limits)
            judged = judge(rule, reading)
            if not judged.is_asked:
                continue
            if judged.case is not None and judged.verdict is not None:
                findings.append(_finding(rule, judged.case, judged.verdict, reading, intent))
            elif judged.unknown is not None:
                unevaluated.append(Unevaluated(rule.name, subject.name, _reason(judged.unknown)))
            else:
                passed += 1
        if rule.subject in AMPLIFIER_SUBJECTS:
            for each in bench.circuit.undetermined:
                reason = f"{each.reason}; {each.declare}" if each.declare else each.reason
                unevaluated.append(Unevaluated(rule.name, each.designator, reason))
    folded = fold(pack, findings)
    judged_findings = apply_waivers(folded, bench, intent, today if today is not None else date.today())
    raised = [each for each in judged_findings if each.rule in {rule.name for rule in pack.rules}]
    waived = sum(1 for each in raised if each.waived is not None)
    counts = Counts(passed, len(raised) - waived, waived, len(unevaluated))
    ordered = sorted(judged_findings, key=lambda each: (each.line, each.rule, each.subject))
    return Outcome(tuple(ordered), tuple(unevaluated), counts)


def _reason(unknown: Unknown) -> str:
    return f"{unknown.reason}; declare {unknown.missing}" if unknown.missing else unknown.reason


def rule_limits(rule: Rule, intent: Intent) -> dict[str, float | None]:
    """Return a rule's limits in SI units, those of the intent file first."""
    found: dict[str, float | None] = {}
    for name, limit in rule.limits.items():
        changed = intent.limit(rule.name, name)
        found[name] = limit.value if changed is None else parse_quantity(changed, limit.unit)
    return found


def check_intent(pack: Pack, intent: Intent) -> None:
    """Raise for every rule and limit that the intent file names and the pack does not have."""
    problems: list[Problem] = []
    known = [rule.name for rule in pack.rules]

    def unknown(name: str, *keys: str | int) -> None:
        near = nearest_names(name, known)
        problems.append(Problem("rule-unknown", f"no rule is named `{name}`", intent.location(*keys), nearest=near))

    for name, changed in intent.limits.items():
        rule = pack.find(name)
        if rule is None:
            unknown(name, "limits", name)
            continue
        for key, value in changed.items():
            place = intent.location("limits", name, key)
            limit = rule.limits.get(key)
            if limit is None:
                near = nearest_names(key, rule.limits)
                what = f"rule {name} has no limit `{key}`"
                problems.append(Problem("limit-unknown", what, place, nearest=near or tuple(rule.limits)))
                continue
            try:
                parse_quantity(value, limit.unit)
            except ValueError as trouble:
                problems.append(Problem("limit-wrong", f"limit `{key}` of {name}: {trouble}", place))
    for name in intent.rules_off:
        if name not in known:
            unknown(name, "rules", "off")
    for name in intent.rule_levels:
        if name not in known:
            unknown(name, "rules", "levels", name)
    for index, waiver in enumerate(intent.waivers):
        if waiver.rule not in known:
            unknown(waiver.rule, "waivers", index, "rule")
    if problems:
        raise IntentError(problems)


def judge(rule: Rule, reading: SubjectReading) -> Judgement:
    """Ask one rule of one subject."""
    if rule.when is not None:
        verdict = rule.when.evaluate(reading)
        if verdict.value is None:
            return Judgement(unknown=_first(verdict))
        if not verdict.value:
            return Judgement(is_asked=False)
    unknown: Unknown | None = None
    is_asked = False
    for case in rule.cases:
        if case.when is not None:
            verdict = case.when.evaluate(reading)
            if verdict.value is None:
                unknown, is_asked = unknown or _first(verdict), True
                continue
            if not verdict.value:
                continue
        is_asked = True
        verdict = case.require.evaluate(reading)
        if verdict.value is False:
            return Judgement(case, verdict)
        if verdict.value is None:
            unknown = unknown or _first(verdict)
    return Judgement(unknown=unknown, is_asked=is_asked)


def _first(verdict: Verdict) -> Unknown:
    return verdict.unknowns[0] if verdict.unknowns else Unknown("a figure is not known")


def _finding(rule: Rule, case: Case, verdict: Verdict, reading: SubjectReading, intent: Intent) -> Finding:
    subject = reading.subject
    parts = dict.fromkeys(subject.parts)
    nets = dict.fromkeys(subject.nets)
    for value, held in ((case.parts, parts), (case.nets, nets)):
        if value is not None:
            figure = value.evaluate(reading)
            if isinstance(figure, Known):
                words = (figure.value,) if isinstance(figure.value, str) else figure.value
                held.update(dict.fromkeys(str(word) for word in words))
    measured, limit, unit = _compared(case, verdict, reading)
    place = subject.location
    base = Location(place.file, place.line)
    level = intent.rule_levels.get(rule.name, case.level)
    return Finding(
        rule=rule.name,
        level=level,
        message=case.message.fill(reading),
        remedy=_remedy(rule, case, reading),
        because=rule.because,
        parts=tuple(parts),
        nets=tuple(nets),
        stage=subject.stage,
        file=base.file,
        line=base.line,
        measured=measured,
        limit=limit,
        unit=unit,
        fingerprint=fingerprint(rule.name, subject),
        subject=subject.name,
        assumptions=tuple(dict.fromkeys(verdict.assumptions)),
    )


def _compared(case: Case, verdict: Verdict, reading: SubjectReading) -> tuple[float | None, float | None, str | None]:
    found = verdict.comparison
    measured = found.measured if found is not None else None
    limit = found.limit if found is not None else None
    unit = found.unit if found is not None else None
    for value, is_measured in ((case.measured, True), (case.limit, False)):
        if value is None:
            continue
        figure = value.evaluate(reading)
        number = figure.value if isinstance(figure, Known) and isinstance(figure.value, int | float) else None
        if is_measured:
            measured = number
        else:
            limit = number
        unit = value.unit
    return measured, limit, (unit or "") if measured is not None or limit is not None else None


def fingerprint(rule: str, subject: Subject) -> str:
    """Return the mark by which a finding is known again when lines move or unrelated parts are added."""
    text = "\0".join((rule, subject.kind, subject.name.casefold(), *(each.casefold() for each in subject.parts)))
    return hashlib.sha256(text.encode()).hexdigest()[:16]


def _remedy(rule: Rule, case: Case, reading: SubjectReading) -> Remedy:
    if case.fix is None:
        return Remedy(case.remedy.fill(reading))
    from .remedies import find_fix

    fix = find_fix(case.fix, rule, reading)
    if fix is not None:
        return Remedy(case.remedy.fill(reading, fix), is_verified=True)
    return Remedy((case.otherwise or case.remedy).fill(reading))


def fold(pack: Pack, findings: Sequence[Finding]) -> list[Finding]:
    """Mark the findings that follow from another one: same stage or shared parts, and a rule that names its causes."""
    causes = {rule.name: rule.follows for rule in pack.rules if rule.follows}
    if not causes:
        return list(findings)
    by_rule: dict[str, list[Finding]] = {}
    for each in findings:
        by_rule.setdefault(each.rule, []).append(each)
    found = []
    for each in findings:
        cause = next(
            (
                other
                for name in causes.get(each.rule, ())
                for other in by_rule.get(name, ())
                if (other.stage is not None and other.stage == each.stage) or set(other.nets) & set(each.nets)
            ),
            None,
        )
        found.append(replace(each, follows_from=cause.fingerprint) if cause is not None else each)
    return found
