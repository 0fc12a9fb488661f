"""Two reviews of the same netlists: what changed, stage by stage, and which findings are new or fixed.

Stages are matched by what they are (topology, roles, values) as well as by name, so that renamed nets and renumbered
designators are no change. Each pass only takes pairs that are unique on both sides, the strictest evidence first:
same name and same structure, same structure, same name and topology, same topology and roles, same name.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Callable, Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass

from .rulebook.findings import Finding, NetlistReview, Review, StageReport

# Figures that a reader compares, with their units, in the order of the sheet.
COMPARED: dict[str, str] = {
    "dc_gain": "",
    "midband_gain": "",
    "signal_gain": "",
    "noise_gain": "",
    "bandwidth_hz": "Hz",
    "phase_margin_deg": "deg",
    "corner_hz": "Hz",
    "quality": "",
    "time_constant_s": "s",
    "output_dc_v": "V",
    "output_low_v": "V",
    "output_high_v": "V",
    "input_cm_low_v": "V",
    "input_cm_high_v": "V",
    "cmrr_nominal_db": "dB",
    "cmrr_worst_db": "dB",
    "ratio_mismatch": "",
    "threshold_low_v": "V",
    "threshold_high_v": "V",
    "hysteresis_v": "V",
    "offset_v": "V",
    "output_current_a": "A",
    "transresistance_ohm": "ohm",
}

SAME = 1e-4  # relative change below which a figure counts as unchanged
_NOISE = 1e-9  # figures of the solve closer than this differ by rounding only; part values have no such floor


@dataclass(frozen=True, slots=True)
class Change:
    """One figure, value or name before and after; ``unit`` is empty for ratios and words."""

    what: str
    before: object
    after: object
    unit: str = ""


@dataclass(frozen=True, slots=True)
class StageChange:
    """One stage in both revisions: ``kind`` is added, removed, changed or same; ``old``/``new`` its two forms."""

    kind: str
    old: StageReport | None
    new: StageReport | None
    changes: tuple[Change, ...] = ()

    @property
    def name(self) -> str:
        """The stage's name, with the old one before it when it was renamed."""
        if self.old is None or self.new is None:
            return (self.new or self.old).name  # type: ignore[union-attr]
        return self.new.name if self.old.name == self.new.name else f"{self.old.name} -> {self.new.name}"


@dataclass(frozen=True, slots=True)
class NetlistComparison:
    """One netlist in both revisions. ``kind`` is added, removed, changed, same or unreadable."""

    path: str
    old_path: str | None
    kind: str
    stages: tuple[StageChange, ...]
    new: tuple[Finding, ...]
    fixed: tuple[Finding, ...]
    known: tuple[Finding, ...]
    old_review: NetlistReview | None = None
    new_review: NetlistReview | None = None


def compare_reviews(
    old: Review, new: Review, *, old_root: str = "", new_root: str = ""
) -> tuple[NetlistComparison, ...]:
    """Compare two reviews netlist by netlist.

    Netlists pair by their path below the roots; what is left pairs by equal content, then by the share of equal
    stages (a renamed file). A single netlist on either side always pairs.
    """
    before = {_relative(each.path, old_root): each for each in old.netlists}
    after = {_relative(each.path, new_root): each for each in new.netlists}
    pairs: list[tuple[str | None, str | None]] = []
    if len(before) == 1 and len(after) == 1:
        pairs.append((next(iter(before)), next(iter(after))))
    else:
        pairs.extend((path, path) for path in before if path in after)
        gone = [path for path in before if path not in after]
        come = [path for path in after if path not in before]
        pairs.extend(_renamed_files(gone, come, before, after))
        paired_old = {each for each, _ in pairs}
        paired_new = {each for _, each in pairs}
        pairs.extend((path, None) for path in before if path not in paired_old)
        pairs.extend((None, path) for path in after if path not in paired_new)
    pairs.sort(key=lambda pair: pair[1] or pair[0] or "")
    return tuple(
        compare_netlists(before[one] if one is not None else None, after[two] if two is not None else None)
        for one, two in pairs
    )


def compare_netlists(old: NetlistReview | None, new: NetlistReview | None) -> NetlistComparison:
    """Compare one netlist in two revisions; either may be absent."""
    shown = new or old
    if shown is None:
        raise ValueError("nothing to compare")
    if (old is not None and old.error) or (new is not None and new.error):
        return NetlistComparison(shown.path, old.path if old else None, "unreadable", (), (), (), (), old, new)
    old_stages = old.stages if old else ()
    new_stages = new.stages if new else ()
    matches = match_stages(old_stages, new_stages)
    partner = {id(two): one for one, two in matches}
    stages: list[StageChange] = []
    for two in new_stages:
        one = partner.get(id(two))
        if one is None:
            stages.append(StageChange("added", None, two))
        else:
            changes = stage_changes(one, two)
            stages.append(StageChange("changed" if changes else "same", one, two, changes))
    matched_old = {id(one) for one, _ in matches}
    stages.extend(StageChange("removed", one, None) for one in old_stages if id(one) not in matched_old)
    fresh, fixed, known = compare_findings(
        old.findings if old else (), new.findings if new else (), {one.name: two.name for one, two in matches}
    )
    if old is None:
        kind = "added"
    elif new is None:
        kind = "removed"
    else:
        kind = "changed" if fresh or fixed or any(each.kind != "same" for each in stages) else "same"
    path = shown.path
    return NetlistComparison(path, old.path if old else None, kind, tuple(stages), fresh, fixed, known, old, new)


def match_stages(old: Sequence[StageReport], new: Sequence[StageReport]) -> tuple[tuple[StageReport, StageReport], ...]:
    """Pair the stages of two revisions; cost linear in their number."""
    left, right = list(old), list(new)
    pairs: list[tuple[StageReport, StageReport]] = []
    evidence: tuple[Callable[[StageReport], Hashable], ...] = (
        lambda stage: (stage.name.casefold(), _structure(stage)),
        lambda stage: (_structure(stage), _fold(stage.output), tuple(map(_fold, stage.inputs))),
        _structure,
        lambda stage: (stage.name.casefold(), stage.topology),
        lambda stage: (stage.topology, _fold(stage.output)),
        lambda stage: stage.name.casefold(),
        lambda stage: (stage.topology, tuple(sorted((role, len(parts)) for role, parts in stage.roles.items()))),
    )
    for key in evidence:
        found = _unique_pairs(left, right, key)
        pairs.extend(found)
        taken_left = {id(one) for one, _ in found}
        taken_right = {id(two) for _, two in found}
        left = [each for each in left if id(each) not in taken_left]
        right = [each for each in right if id(each) not in taken_right]
        if not left or not right:
            break
    # Equal stages that nothing tells apart (channels of a filter bank) pair in their order.
    leftovers: dict[Hashable, list[StageReport]] = defaultdict(list)
    for one in left:
        leftovers[_structure(one)].append(one)
    for two in right:
        if leftovers[_structure(two)]:
            pairs.append((leftovers[_structure(two)].pop(0), two))
    return tuple(pairs)


def stage_changes(old: StageReport, new: StageReport) -> tuple[Change, ...]:
    """List what differs between two forms of a stage: topology, values of its roles, figures."""
    changes: list[Change] = []
    if old.topology != new.topology:
        changes.append(Change("topology", old.topology, new.topology))
    for role in dict.fromkeys([*old.values, *new.values]):
        before, after = old.values.get(role), new.values.get(role)
        if not _equal(before, after):
            parts = "+".join(new.roles.get(role) or old.roles.get(role) or ())
            changes.append(Change(f"{role} ({parts})" if parts else role, _single(before), _single(after)))
    for name, unit in COMPARED.items():
        before, after = old.measures.get(name), new.measures.get(name)
        if not _equal(before, after, _NOISE):
            changes.append(Change(name, before, after, unit))
    return tuple(changes)


def compare_findings(
    old: Iterable[Finding], new: Iterable[Finding], renamed: Mapping[str, str] | None = None
) -> tuple[tuple[Finding, ...], tuple[Finding, ...], tuple[Finding, ...]]:
    """Return (new, fixed, known) findings.

    A finding is known when its fingerprint was there before, or when the earlier one of the same rule sat on the
    stage that ``renamed`` (old name -> new name) pairs with its own.
    """
    earlier: dict[str, list[Finding]] = defaultdict(list)
    for finding in old:
        earlier[finding.fingerprint].append(finding)
    fresh: list[Finding] = []
    known: list[Finding] = []
    for finding in new:
        if earlier[finding.fingerprint]:
            earlier[finding.fingerprint].pop()
            known.append(finding)
        else:
            fresh.append(finding)
    gone = [finding for findings in earlier.values() for finding in findings]
    names = renamed or {}
    moved: dict[tuple[str, str], list[Finding]] = defaultdict(list)
    for finding in gone:
        if finding.stage is not None and names.get(finding.stage, finding.stage) != finding.stage:
            moved[finding.rule, names[finding.stage]].append(finding)
    still_new: list[Finding] = []
    for finding in fresh:
        twins = moved.get((finding.rule, finding.stage or ""), [])
        if twins:
            gone.remove(twins.pop())
            known.append(finding)
        else:
            still_new.append(finding)
    return tuple(still_new), tuple(gone), tuple(known)


def _relative(path: str, root: str) -> str:
    text = path.replace("\\", "/")
    base = root.replace("\\", "/").rstrip("/")
    return text[len(base) + 1 :] if base and text.startswith(base + "/") else text


def _renamed_files(
    gone: Sequence[str], come: Sequence[str], before: Mapping[str, NetlistReview], after: Mapping[str, NetlistReview]
) -> list[tuple[str, str]]:
    pairs: list[tuple[str, str]] = []
    by_content: dict[str, list[str]] = defaultdict(list)
    for path in gone:
        by_content[before[path].sha256].append(path)
    rest = []
    for path in come:
        if by_content[after[path].sha256]:
            pairs.append((by_content[after[path].sha256].pop(0), path))
        else:
            rest.append(path)
    free = [path for path in gone if path not in {one for one, _ in pairs}]
    shapes = {path: frozenset(map(_structure, before[path].stages)) for path in free}
    for path in rest:
        shape = frozenset(map(_structure, after[path].stages))
        likeness = {each: len(shape & shapes[each]) / max(1, len(shape | shapes[each])) for each in free}
        best = max(likeness, key=lambda each: likeness[each], default=None)
        if best is not None and likeness[best] >= 0.5:
            pairs.append((best, path))
            free.remove(best)
    return pairs


def _structure(stage: StageReport) -> Hashable:
    values = tuple(sorted((role, tuple(map(_rounded, values))) for role, values in stage.values.items()))
    return stage.topology, values, len(stage.inputs), len(stage.amplifiers)


def _rounded(value: float | None) -> str | None:
    return None if value is None else f"{value:.6g}"


def _fold(name: str | None) -> str | None:
    return None if name is None else name.casefold()


def _unique_pairs(
    left: Sequence[StageReport], right: Sequence[StageReport], key: Callable[[StageReport], Hashable]
) -> list[tuple[StageReport, StageReport]]:
    ones: dict[Hashable, list[StageReport]] = defaultdict(list)
    twos: dict[Hashable, list[StageReport]] = defaultdict(list)
    for each in left:
        ones[key(each)].append(each)
    for each in right:
        twos[key(each)].append(each)
    return [(ones[mark][0], twos[mark][0]) for mark in ones if len(ones[mark]) == 1 and len(twos.get(mark, ())) == 1]


def _single(values: object) -> object:
    return values[0] if isinstance(values, tuple) and len(values) == 1 else values


def _equal(one: object, two: object, noise: float = 0.0) -> bool:
    if isinstance(one, bool) or isinstance(two, bool) or one is None or two is None:
        return one == two
    if isinstance(one, int | float) and isinstance(two, int | float):
        return math.isclose(one, two, rel_tol=SAME, abs_tol=noise)
    if isinstance(one, Mapping) and isinstance(two, Mapping):
        return one.keys() == two.keys() and all(_equal(one[key], two[key], noise) for key in one)
    if isinstance(one, Sequence) and isinstance(two, Sequence) and not isinstance(one, str):
        return len(one) == len(two) and all(_equal(a, b, noise) for a, b in zip(one, two, strict=True))
    return one == two
