"""One netlist through all rooms: text, circuit, stages, figures, rules, review.

This is the only module that knows the whole order. A netlist that cannot be read gives a review with its problems,
never a clean one; an unexpected failure is named as a bug of this tool and touches no other netlist. Knowledge (rules,
topologies, parts) is loaded once for each set of house folders.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import date
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .errors import AmpwardenError, Location, NetlistError, Problem, UsageError
from .quantities import nearest_names
from .rulebook.findings import STAGE_MEASURES, NetlistReview, Review, RuleText, StageReport

if TYPE_CHECKING:
    from .analysis.bench import Bench
    from .circuit import Catalogue, Circuit
    from .rulebook import Pack
    from .text.intent import Intent
    from .text.netlist import Netlist
    from .topology import Stage, Template

ENDINGS = (".cir", ".net", ".sp", ".ckt", ".cki", ".spice", ".spi")


@dataclass(frozen=True, slots=True)
class Inspection:
    """A netlist understood, but not judged: its circuit, its stages, and the bench that computes figures on demand."""

    circuit: Circuit
    stages: tuple[Stage, ...]
    bench: Bench


@dataclass(frozen=True, slots=True)
class Knowledge:
    """Rules, topologies and part data that hold for one set of house folders and declared parts."""

    pack: Pack
    templates: tuple[Template, ...]
    catalogue: Catalogue


@dataclass(slots=True)
class _Library:
    """Intents and knowledge read so far in this run, so that a folder of netlists reads each only once."""

    declared: Intent | None = None
    intents: dict[Path, Intent] = field(default_factory=dict)
    knowledge: dict[object, Knowledge] = field(default_factory=dict)

    def intent_for(self, netlist: Path) -> Intent:
        from .text import Intent, find_intent, read_intent

        if self.declared is not None:
            return self.declared
        place = find_intent(netlist)
        if place is None:
            return Intent()
        if place not in self.intents:
            self.intents[place] = read_intent(place)
        return self.intents[place]

    def knowledge_for(self, intent: Intent) -> Knowledge:
        folders = intent.folders(intent.rule_folders)
        key = (folders, intent.path if intent.parts else None)
        if key not in self.knowledge:
            self.knowledge[key] = load_knowledge(folders, intent.parts)
        return self.knowledge[key]


def load_knowledge(folders: Sequence[Path] = (), parts: Mapping[str, Mapping[str, Any]] | None = None) -> Knowledge:
    """Load the shipped knowledge together with that of house folders and declared parts."""
    from .circuit import load_catalogue
    from .rulebook import load_pack
    from .topology import load_templates

    return Knowledge(load_pack(folders), load_templates(folders), load_catalogue(folders, parts or {}))


def find_netlists(path: str | PathLike[str]) -> tuple[Path, ...]:
    """Return the netlists of a path: the file itself, or all files below a folder with a netlist's ending, sorted.

    Raises
    ------
    UsageError
        When a folder holds no netlist.
    """
    place = Path(path)
    if not place.is_dir():
        return (place,)
    found = [
        each
        for each in place.rglob("*")
        if each.suffix.lower() in ENDINGS
        and not any(part.startswith(".") for part in each.relative_to(place).parts)
        and each.is_file()
    ]
    if not found:
        known = " ".join(ENDINGS)
        raise UsageError(
            Problem("no-netlist", f"no netlist below {place}", expected=f"files with one of the endings {known}")
        )
    return tuple(sorted(found))


def review(
    paths: str | PathLike[str] | Iterable[str | PathLike[str]],
    intent: str | PathLike[str] | Intent | None = None,
    *,
    only: Sequence[str] = (),
    skip: Sequence[str] = (),
    today: date | None = None,
) -> Review:
    """Review netlists and return what was found, computed, and left open.

    Parameters
    ----------
    paths
        One netlist or folder, or several.
    intent
        The intent file, or an intent already read. Without it the nearest ``review.toml`` in each netlist's folder or
        above is used.
    only, skip
        Names of rules to apply alone, or to leave out.
    today
        The day on which waivers are judged; the current one when not given.

    Raises
    ------
    UsageError
        When a folder holds no netlist or a rule name is unknown.
    IntentError, RulePackError
        When the given intent file, or a rule folder that it names, is wrong. One that was found beside a netlist is
        reported with that netlist instead.
    """
    library = _Library(_given_intent(intent))
    if library.declared is not None:
        _check_rule_names(library.knowledge_for(library.declared).pack, (*only, *skip))
    day = today or date.today()

    def judge(netlist: Netlist, intent: Intent, known: Knowledge) -> NetlistReview:
        return _judge(netlist, intent, known, only, skip, day)

    netlists = tuple(_read_and(judge, each, library) for each in _places(paths))
    return Review(netlists, _rule_texts(library.knowledge.values()))


def survey(
    paths: str | PathLike[str] | Iterable[str | PathLike[str]], intent: str | PathLike[str] | Intent | None = None
) -> Review:
    """Find the stages of netlists and compute their figures; no rule is applied. See :func:`review`."""
    library = _Library(_given_intent(intent))

    def describe(netlist: Netlist, intent: Intent, known: Knowledge) -> NetlistReview:
        return _describe(netlist, inspect(netlist, intent, knowledge=known))

    return Review(tuple(_read_and(describe, each, library) for each in _places(paths)))


def review_text(
    text: str,
    intent: Intent | None = None,
    *,
    name: str = "<text>",
    only: Sequence[str] = (),
    skip: Sequence[str] = (),
    today: date | None = None,
    knowledge: Knowledge | None = None,
) -> NetlistReview:
    """Review a netlist given as text; every include is refused. See :func:`review`."""
    from .text import Intent, parse_netlist

    declared = intent if intent is not None else Intent()
    known = knowledge or _Library().knowledge_for(declared)
    day = today or date.today()
    digest = hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()
    try:
        return _judge(parse_netlist(text, name=name, style=declared.style), declared, known, only, skip, day)
    except NetlistError as trouble:
        return NetlistReview(name, "", digest, error=trouble.problems)


def inspect(netlist: Netlist, intent: Intent | None = None, *, knowledge: Knowledge | None = None) -> Inspection:
    """Find circuit and stages of a netlist and set up the bench that computes their figures; nothing is judged."""
    from .analysis.bench import Bench
    from .circuit import build_circuit
    from .text import Intent
    from .topology import find_stages

    declared = intent if intent is not None else Intent()
    known = knowledge or _Library().knowledge_for(declared)
    circuit = build_circuit(netlist, declared, catalogue=known.catalogue)
    stages = find_stages(circuit, known.templates)
    return Inspection(circuit, stages, Bench(circuit, stages, declared, templates=known.templates))


def _given_intent(intent: str | PathLike[str] | Intent | None) -> Intent | None:
    if isinstance(intent, str | PathLike):
        from .text import read_intent

        return read_intent(Path(intent))
    return intent


def _places(paths: str | PathLike[str] | Iterable[str | PathLike[str]]) -> tuple[Path, ...]:
    several = [paths] if isinstance(paths, str | PathLike) else paths
    return tuple(dict.fromkeys(each for path in several for each in find_netlists(path)))


def _read_and(
    work: Callable[[Netlist, Intent, Knowledge], NetlistReview], path: Path, library: _Library
) -> NetlistReview:
    """Read one file and work on it; whatever goes wrong with it stays with it, apart from a wrong call."""
    from .text import read_netlist

    name = path.as_posix()
    try:
        intent = library.intent_for(path)
        known = library.knowledge_for(intent)
        netlist = read_netlist(path, libraries=intent.folders(intent.libraries), style=intent.style)
        return work(netlist, intent, known)
    except UsageError:
        raise
    except AmpwardenError as trouble:
        return NetlistReview(name, "", _digest(path), error=trouble.problems)
    except Exception as trouble:  # a bug must not take the other netlists with it
        return NetlistReview(name, "", _digest(path), error=(bug_problem(trouble, name),))


def bug_problem(trouble: BaseException, netlist: str | None = None) -> Problem:
    """Return the one line by which an unexpected failure is reported."""
    place = ""
    trace = trouble.__traceback__
    own = Path(__file__).parent
    while trace is not None:
        file = Path(trace.tb_frame.f_code.co_filename)
        if file.is_relative_to(own):
            place = f" at {file.relative_to(own).as_posix()}:{trace.tb_lineno}"
        trace = trace.tb_next
    text = " ".join(str(trouble).split())[:200]
    what = f"bug: {type(trouble).__name__}{place}: {text or 'no further word'}; report it with this file"
    return Problem("bug", what, Location(netlist, 1) if netlist else None)


def _digest(path: Path) -> str:
    try:
        return hashlib.sha256(path.read_bytes()).hexdigest()
    except OSError:
        return ""


def _judge(
    netlist: Netlist, intent: Intent, known: Knowledge, only: Sequence[str], skip: Sequence[str], day: date
) -> NetlistReview:
    from .rulebook import apply_pack

    _check_rule_names(known.pack, (*only, *skip))
    seen = inspect(netlist, intent, knowledge=known)
    outcome = apply_pack(known.pack, seen.bench, intent, only=only, skip=skip, today=day)
    described = _describe(netlist, seen)
    return replace(described, findings=outcome.findings, unevaluated=outcome.unevaluated, counts=outcome.counts)


def _describe(netlist: Netlist, seen: Inspection) -> NetlistReview:
    """Return what was found and computed, without judgement."""
    assumptions = list(seen.circuit.assumptions)
    stages = tuple(report_stage(stage, seen.bench, assumptions) for stage in seen.stages)
    return NetlistReview(
        path=netlist.path,
        title=netlist.title,
        sha256=netlist.sha256,
        problems=(*netlist.problems, *seen.circuit.problems),
        rails=tuple((rail.net, rail.volts, rail.origin) for rail in seen.circuit.rails.values()),
        stages=stages,
        assumptions=tuple(dict.fromkeys(assumptions)),
    )


def _check_rule_names(pack: Pack, names: Iterable[str]) -> None:
    known = [rule.name for rule in pack.rules]
    wrong = [
        Problem("rule-unknown", f"no rule is named `{name}`", nearest=nearest_names(name, known))
        for name in dict.fromkeys(names)
        if name not in known
    ]
    if wrong:
        raise UsageError(wrong)


def report_stage(stage: Stage, bench: Bench, assumptions: list[str]) -> StageReport:
    """Return a stage with all its figures; what the figures rest on is added to ``assumptions``."""
    from .analysis.figures import Known

    subject = bench.subject_of_stage(stage.name)
    figures = {name: bench.figure(name, subject) for name in STAGE_MEASURES}
    measures = {name: each.value if isinstance(each, Known) else None for name, each in figures.items()}
    for figure in figures.values():
        if isinstance(figure, Known):
            assumptions.extend(figure.assumptions)
    return StageReport(
        name=stage.name,
        topology=stage.topology,
        amplifiers=stage.amplifiers,
        inputs=stage.inputs,
        output=stage.output,
        roles=stage.roles,
        measures=measures,
        values={role: tuple(_value_of(bench, name) for name in names) for role, names in stage.roles.items()},
        properties=stage.properties,
        notes=_cross_checks(stage, bench, measures),
        reason=stage.reason,
        line=stage.location.line,
        file=stage.location.file,
    )


def _value_of(bench: Bench, designator: str) -> float | None:
    part = bench.circuit.part(designator)
    return part.value if part is not None else None


CROSS_CHECK = 0.01  # share by which the closed form of a topology may differ from the solve without a word
CROSS_CHECKED = ("dc_gain", "midband_gain", "corner_hz", "ratio_mismatch", "transresistance_ohm")


def _cross_checks(stage: Stage, bench: Bench, measures: Mapping[str, Any]) -> tuple[str, ...]:
    """Return a note for every figure whose solve and closed form differ: then something beside the textbook is at work."""
    from .analysis.stage_gain import formula

    notes = []
    for name in (each for each in CROSS_CHECKED if each in stage.formulas):
        closed, solved = formula(bench, stage, name), measures.get(name)
        if isinstance(solved, tuple | list):
            solved = min(solved, key=lambda each: abs(each - closed)) if solved and closed is not None else None
        if closed is None or not isinstance(solved, float) or closed == solved:
            continue
        if abs(solved - closed) > CROSS_CHECK * max(abs(closed), abs(solved)):
            notes.append(f"{name} is {solved:.4g} in this circuit, {closed:.4g} by the formula of the topology")
    return tuple(notes)


def _rule_texts(knowledge: Iterable[Knowledge]) -> tuple[RuleText, ...]:
    texts: dict[str, RuleText] = {}
    for known in knowledge:
        for rule in known.pack.rules:
            text = RuleText(rule.name, rule.level, rule.title, rule.because, tuple(rule.sources))
            texts.setdefault(rule.name, replace(text, concern=rule.concern))
    if texts:
        from .rulebook.waivers import EXPIRED, UNUSED

        texts.update({each.name: each for each in (EXPIRED, UNUSED)})
    return tuple(texts[name] for name in sorted(texts))
