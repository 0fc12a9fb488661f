"""The text report: netlist by netlist and stage by stage, with one verdict at the end.

Each netlist stands alone: its rails, then each stage with its figures and the findings about it, then the findings
about no stage, then what could not be checked and what was assumed. The page fits the width it is given.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from ..rulebook.findings import Finding, NetlistReview, Review, StageReport, Unevaluated
from .formats import Options
from .lines import Line, Span, keep_whole, labelled, two_sided, wrap, write
from .wording import (
    LEVELS,
    ORIGINS,
    check_words,
    count_levels,
    figures_of,
    listing,
    remedy_words,
    stage_facts,
    verdict,
    volts_or_unknown,
    waiver_words,
)

# Wider pages give room to figures; prose and places beyond this column would be hard to follow.
READABLE = 120


def render(review: Review, options: Options) -> Iterator[str]:
    """Yield the report line by line."""
    yield from write(report_lines(review, options), is_coloured=options.is_coloured, is_ascii=options.is_ascii)


def report_lines(review: Review, options: Options) -> Iterator[Line]:
    """Yield the report as styled lines."""
    width = max(40, options.width)
    for netlist in review.netlists:
        yield from netlist_lines(netlist, width)
        yield ()
    yield (("verdict   ", "heading"), (verdict(review), _verdict_style(review)))


def survey_lines(review: Review, options: Options) -> Iterator[Line]:
    """Yield the stages of each netlist alone, without findings and verdict."""
    width = max(40, options.width)
    for index, netlist in enumerate(review.netlists):
        if index:
            yield ()
        yield from heading_lines(netlist, width)
        if netlist.error:
            yield from _unread_lines(netlist, width)
            continue
        yield from labelled("rails", _rail_spans(netlist), width, 0)
        for stage in netlist.stages:
            yield ()
            yield from stage_lines(stage, width)
        if not netlist.stages:
            yield from labelled("stages", [("none found", "")], width, 0)


def netlist_lines(netlist: NetlistReview, width: int) -> Iterator[Line]:
    """Yield the section of one netlist."""
    yield from heading_lines(netlist, width)
    if netlist.error:
        yield from _unread_lines(netlist, width)
        return
    yield from labelled("rails", _rail_spans(netlist), width, 0)
    explained: set[str] = set()
    by_stage: dict[str | None, list[Finding]] = {}
    names = {stage.name for stage in netlist.stages}
    heads, followers = _fold(netlist.findings)
    for finding in heads:
        by_stage.setdefault(finding.stage if finding.stage in names else None, []).append(finding)

    def block(stage: str | None) -> Iterator[Line]:
        for finding in by_stage.get(stage, ()):
            yield from finding_lines(finding, width, explained)
            yield from _follower_lines(followers.get(finding.fingerprint, ()), width)

    for stage in netlist.stages:
        yield ()
        yield from stage_lines(stage, width)
        yield from block(stage.name)
    if None in by_stage:
        yield ()
        yield (("findings beside the stages", "heading"),)
        yield from block(None)
    yield from _warning_lines(netlist, width)
    yield from _unevaluated_lines(netlist.unevaluated, width)
    yield ()
    for index, assumption in enumerate(netlist.assumptions):
        yield from labelled("" if index else "assumed", [(assumption, "")], min(width, READABLE), 0)
    yield from labelled("checks", [(check_words(netlist), "")], width, 0)


def heading_lines(netlist: NetlistReview, width: int) -> Iterator[Line]:
    """Yield path and title of a netlist over a rule."""
    spans: list[Span] = [(netlist.path, "netlist.path")]
    if netlist.title:
        spans.append((f"  {netlist.title}", "netlist.title"))
    yield from wrap(spans, width, 0, 2)
    yield (("─" * min(width, READABLE), "netlist.rule"),)


def stage_lines(stage: StageReport, width: int) -> Iterator[Line]:
    """Yield what a stage is and what it computes to."""
    style = "stage.unrecognized" if stage.topology == "unrecognized" else "stage.topology"
    head: list[Span] = [(stage.name, "stage.name"), ("  ", ""), (stage.topology, style)]
    way = listing(stage.inputs, 6) + (f" -> {stage.output}" if stage.output else "")
    if way:
        head.append((f"  {way}", "net.name"))
    place = f"{stage.file}:{stage.line}" if stage.line else ""
    yield from two_sided(head, (place, "place"), min(width, READABLE))
    others = [each for each in stage.amplifiers if each != stage.name]
    if others:
        yield from labelled("with", [(listing(others), "part.name")], width, 2)
    if stage.reason:
        yield from labelled("why", [(stage.reason, "")], min(width, READABLE), 2)
    roles = [(role.replace("_", " "), ", ".join(parts)) for role, parts in stage.roles.items() if parts]
    if roles:
        yield from labelled("parts", _pairs(roles), width, 2)
    facts = stage_facts(stage)
    if facts:
        yield from labelled("figures", _pairs(facts), width, 2)
    if stage.properties:
        seen = [(name.replace("_", " "), ", ".join(parts)) for name, parts in stage.properties.items()]
        yield from labelled("also", _pairs(seen), width, 2)
    for note in stage.notes:
        yield from labelled("remark", [(note, "")], min(width, READABLE), 2)


def _pairs(pairs: Iterable[tuple[str, str]]) -> list[Span]:
    """Labels beside their texts, three blanks apart; a pair is never broken unless it is long."""
    spans: list[Span] = []
    for label, text in pairs:
        if spans:
            spans.append(("   ", ""))
        whole = len(label) + len(text) < 40
        spans.append((keep_whole(f"{label} ") if whole else f"{label} ", "label"))
        spans.append((keep_whole(text) if whole else text, "figure"))
    return spans


def _rail_spans(netlist: NetlistReview) -> list[Span]:
    if not netlist.rails:
        return [("none found", "")]
    said = [f"{net} {volts_or_unknown(volts)} ({ORIGINS.get(origin, origin)})" for net, volts, origin in netlist.rails]
    return _pairs((text.split(" ", 1)[0], text.split(" ", 1)[1]) for text in said)


def _graver_first(findings: Iterable[Finding]) -> list[Finding]:
    order = {level: index for index, level in enumerate(LEVELS)}
    return sorted(findings, key=lambda each: (each.waived is not None, order.get(each.level, len(order))))


def _fold(findings: Iterable[Finding]) -> tuple[list[Finding], dict[str, list[Finding]]]:
    """Part findings into those that stand by themselves and those that follow from one of these."""
    ordered = _graver_first(findings)
    roots = {each.fingerprint for each in ordered if each.follows_from is None}
    heads: list[Finding] = []
    followers: dict[str, list[Finding]] = {}
    for finding in ordered:
        if finding.follows_from in roots:
            followers.setdefault(finding.follows_from or "", []).append(finding)
        else:
            heads.append(finding)
    return heads, followers


def finding_lines(finding: Finding, width: int, explained: set[str]) -> Iterator[Line]:
    """Yield one finding: headline, numbers, remedy, and the reason where its rule appears first."""
    prose = min(width, READABLE)
    waived = waiver_words(finding)
    level = "waived" if waived else finding.level
    left: list[Span] = [
        ("  ", ""),
        (f"{level:<8}", f"level.{level}"),
        (f" {finding.rule}", "rule.name"),
        (f"  {finding.subject}", ""),
    ]
    yield from two_sided(left, (f"{finding.file}:{finding.line}", "place"), prose)
    yield from wrap([(finding.message, "")], prose, 4)
    if waived:
        yield from wrap([(waived, "")], prose, 4)
        return
    facts = figures_of(finding)
    if facts:
        first, rest = facts[0], facts[1:]
        spans: list[Span] = [(keep_whole(first[1]), "figure.measured")]
        for label, text in rest:
            spans += [("   ", ""), (keep_whole(f"{label} "), "label"), (keep_whole(text), "figure")]
        yield from labelled(first[0], spans, width)
    remedy = remedy_words(finding)
    if remedy and finding.remedy:
        style = "remedy" if finding.remedy.is_verified else "remedy.unverified"
        yield from labelled("remedy", [(remedy, style)], prose)
    if finding.assumptions:
        yield from labelled("assumed", [("; ".join(finding.assumptions), "")], prose)
    if finding.because and finding.rule not in explained:
        explained.add(finding.rule)
        yield from labelled("because", [(" ".join(finding.because.split()), "because")], prose)


def _follower_lines(findings: Iterable[Finding], width: int) -> Iterator[Line]:
    for finding in findings:
        text = f"{finding.rule} {finding.subject}: {finding.message}"
        yield from labelled("follows", [(text, "")], min(width, READABLE))


def _warning_lines(netlist: NetlistReview, width: int) -> Iterator[Line]:
    """Yield what the reader met in the text and no finding tells."""
    told = {(each.rule, each.line) for each in netlist.findings}
    left = [each for each in netlist.problems if (each.kind, each.location.line if each.location else 0) not in told]
    if not left:
        return
    yield ()
    yield (("remarks on the text", "heading"),)
    for problem in left:
        place = f"{problem.location}" if problem.location else ""
        yield from wrap([(f"{place}  " if place else "", "place"), (problem.what, "")], min(width, READABLE), 2, 4)
        if problem.cure:
            yield from labelled("cure", [(problem.cure, "")], min(width, READABLE))


def _unevaluated_lines(unevaluated: Iterable[Unevaluated], width: int) -> Iterator[Line]:
    """Yield the checks that could not be made, folded by the reason they share."""
    by_reason: dict[str, dict[str, list[str]]] = {}
    for each in unevaluated:
        by_reason.setdefault(each.reason, {}).setdefault(each.rule, []).append(each.subject)
    if not by_reason:
        return
    yield ()
    yield (("not evaluated", "heading"),)
    prose = min(width, READABLE)
    for reason, rules in by_reason.items():
        yield from wrap([(reason, "")], prose, 2, 4)
        by_subjects: dict[tuple[str, ...], list[str]] = {}
        for rule, subjects in rules.items():
            by_subjects.setdefault(tuple(subjects), []).append(rule)
        for names, same in by_subjects.items():
            yield from wrap([(", ".join(same), "label"), (f": {listing(names, 12)}", "")], prose, 4, 6)


def _unread_lines(netlist: NetlistReview, width: int) -> Iterator[Line]:
    yield (("cannot be read", "level.error"),)
    for problem in netlist.error:
        place = f"{problem.location}  " if problem.location else ""
        yield from wrap([(place, "place"), (problem.what, "")], min(width, READABLE), 2, 4)
        if problem.cure:
            yield from labelled("cure", [(problem.cure, "")], min(width, READABLE))


def _verdict_style(review: Review) -> str:
    counts = count_levels(review.findings)
    if counts["error"] or any(each.error for each in review.netlists):
        return "verdict.bad"
    if counts["warning"] or counts["note"] or review.unevaluated or not review.netlists:
        return "verdict.open"
    return "verdict.good"
