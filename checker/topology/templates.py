"""Topology files: ``rules/topologies/<name>.toml``, checked and compiled to :class:`Template`.

A template is a small netlist with named roles. Its lines are

``A plus minus out``
    an amplifier; the anchor is the first one. Where a pin's net is ``in``, ``ref`` or ``out`` the pin itself has to be
    a signal entry, a reference, or the output.
``R.feedback out minus``
    a branch with its role. The letter says what it may be: ``R`` passes DC, ``C`` blocks DC, ``Z`` either, ``D`` holds
    a junction, ``I`` is a current source or a junction, ``X`` anything. A mark behind the role counts: ``?`` none or
    one, ``*`` any number, ``+`` one or more, ``++`` two or more.

``template`` may be a list: variants of one topology, tried each on its own.

Nets: ``plus minus out`` of the amplifier, ``in`` … for signal entries (``in1`` and ``in2`` are different nets), ``ref``
for anything that stands at a reference, other names for inner nets that must be the same wherever they stand.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

from ..errors import Problem, RulePackError
from ..resources import TomlDocument, compiled, core_folder, gather, parse_toml
from ..text.expressions import ExpressionError, parse_expression, prepare

DEPTHS = ("full", "plain")

_BRANCH = re.compile(r"^(?P<letter>[RCZDIX])\.(?P<role>[a-z][a-z0-9_]*)(?P<count>\?|\*|\+\+|\+)?$")
_NET = re.compile(r"^[a-z][a-z0-9_]*$")
_NAME = re.compile(r"^[a-z][a-z0-9]*(?:-[a-z0-9]+)*$")

KEYS = {
    "name", "title", "template", "depth", "rank", "amplifiers", "requires", "formulas", "sources", "examples",
    "output", "notes", "inputs",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class AmplifierLine:
    """An amplifier of a template: its name and the template nets of its pins."""

    name: str
    plus: str
    minus: str
    output: str


@dataclass(frozen=True, slots=True)
class BranchLine:
    """A branch of a template: letter, role, nets, and how many of it there may be."""

    letter: str
    role: str
    one: str
    two: str
    least: int = 1
    most: int = 1


@dataclass(frozen=True, slots=True)
class Example:
    """A netlist that shows a template: ``expect`` is a topology name for ``stage``, or ``not`` that of the template."""

    title: str
    netlist: str
    expect: str
    stage: str | None
    line: int


@dataclass(frozen=True, slots=True)
class Template:
    """One topology as data."""

    name: str
    title: str
    amplifiers: tuple[AmplifierLine, ...]
    branches: tuple[BranchLine, ...]
    depth: str
    rank: int
    kinds: tuple[str, ...]
    requires: tuple[str, ...]
    formulas: Mapping[str, str]
    sources: tuple[str, ...]
    output: str
    inputs: tuple[str, ...]
    examples: tuple[Example, ...]
    path: str


def load_templates(folders: Sequence[Path] = ()) -> tuple[Template, ...]:
    """Return all templates, the most specific first; those of house folders (``topologies/`` below each) come along.

    Raises
    ------
    RulePackError
        When a topology file is wrong; every problem of all files is listed.
    """
    if not folders:
        return _core()
    own = _load(gather(folder / "topologies" for folder in folders))
    names = {template.name for template in own}
    return _sorted([*own, *(template for template in _core() if template.name not in names)])


@lru_cache(maxsize=1)
def _core() -> tuple[Template, ...]:
    return _sorted(_load(gather((core_folder("topologies"),))))


def _sorted(templates: Iterable[Template]) -> tuple[Template, ...]:
    return tuple(sorted(templates, key=lambda each: (-each.rank, each.name)))


def _load(sources: tuple[tuple[str, bytes], ...]) -> list[Template]:
    def build() -> list[dict[str, Any]]:
        problems: list[Problem] = []
        read = []
        for name, content in sources:
            try:
                read.extend(read_template(parse_toml(content.decode("utf-8"), name)))
            except RulePackError as trouble:
                problems.extend(trouble.problems)
        if problems:
            raise RulePackError(problems)
        return read

    if not sources:
        return []
    found = [_from_plain(each) for each in compiled("topologies", sources, build)]
    prepare(text for each in found for text in (*each.requires, *each.formulas.values()))
    return found


def _from_plain(data: Mapping[str, Any]) -> Template:
    return Template(
        name=data["name"],
        title=data["title"],
        amplifiers=tuple(AmplifierLine(*each) for each in data["amplifier_lines"]),
        branches=tuple(BranchLine(*each) for each in data["branch_lines"]),
        depth=data["depth"],
        rank=data["rank"],
        kinds=tuple(data["kinds"]),
        requires=tuple(data["requires"]),
        formulas=data["formulas"],
        sources=tuple(data["sources"]),
        output=data["output"],
        inputs=tuple(data["inputs"]),
        examples=tuple(Example(*each) for each in data["examples"]),
        path=data["path"],
    )


def read_template(document: TomlDocument) -> list[dict[str, Any]]:
    """Check one topology file and return its variants as JSON-able data; all its problems are raised at once."""
    data = document.data
    problems: list[Problem] = []

    def wrong(what: str, *keys: str | int, cure: str | None = None) -> None:
        problems.append(Problem("topology-wrong", what, document.location(*keys), cure=cure))

    for key in data:
        if key not in KEYS:
            wrong(f"`{key}` is not a key of a topology file", key)
    for key in ("name", "title"):
        if not isinstance(data.get(key), str) or not data.get(key):
            wrong(f"a topology needs `{key}`", key)
    written = data.get("template", [])
    texts = [written] if isinstance(written, str) else list(written)
    if not texts:
        wrong("a topology needs `template`", "template")
    name = str(data.get("name", ""))
    if name and not _NAME.match(name):
        wrong(f"`{name}` is not a topology name", "name", cure="small letters, digits and hyphens")
    variants = [_read_lines(str(text), wrong) for text in texts]
    depth = data.get("depth", "plain")
    if depth not in DEPTHS:
        wrong(f"depth must be one of {', '.join(DEPTHS)}", "depth")
    formulas = data.get("formulas", {})
    for measure, text in formulas.items():
        _check_expression(
            str(text), lambda what, measure=measure: wrong(f"formula of {measure}: {what}", "formulas", measure)
        )
    requires = [str(each) for each in data.get("requires", [])]
    for text in requires:
        _check_expression(text, lambda what: wrong(f"requires: {what}", "requires"))
    if formulas and not data.get("sources"):
        wrong("formulas need their published source", "sources", cure='sources = ["author, title, equation"]')
    examples = [
        [
            str(each.get("title", "")),
            str(each.get("netlist", "")),
            str(each.get("expect", name)),
            each.get("stage"),
            document.line_of("examples", index),
        ]
        for index, each in enumerate(data.get("examples", []))
    ]
    if len(examples) < 3:
        wrong("a topology needs three examples: plain, disguised, near miss", "examples")
    if problems:
        raise RulePackError(problems)
    return [_plain(data, name, depth, requires, formulas, examples, document.path, *variant) for variant in variants]


def _plain(
    data: Mapping[str, Any],
    name: str,
    depth: str,
    requires: list[str],
    formulas: Mapping[str, Any],
    examples: list[list[Any]],
    path: str,
    amplifiers: list[AmplifierLine],
    branches: list[BranchLine],
) -> dict[str, Any]:
    needed = sum(line.least for line in branches)
    literal = sum(net in {"in", "ref", "out"} for each in amplifiers for net in (each.plus, each.minus))
    return {
        "name": name,
        "title": data["title"],
        "amplifier_lines": [[each.name, each.plus, each.minus, each.output] for each in amplifiers],
        "branch_lines": [[each.letter, each.role, each.one, each.two, each.least, each.most] for each in branches],
        "depth": depth,
        "rank": int(data.get("rank", 100 * (len(amplifiers) - 1) + 10 * needed + literal)),
        "kinds": list(data.get("amplifiers", [])),
        "requires": requires,
        "formulas": {measure: str(text) for measure, text in formulas.items()},
        "sources": list(data.get("sources", [])),
        "output": str(data.get("output", amplifiers[0].output if amplifiers else "out")),
        "inputs": [str(each) for each in data.get("inputs", [])],
        "examples": examples,
        "path": path,
    }


def _check_expression(text: str, wrong: Any) -> None:
    try:
        parse_expression(text)
    except ExpressionError as trouble:
        wrong(str(trouble))


_COUNTS = {None: (1, 1), "?": (0, 1), "*": (0, 99), "+": (1, 99), "++": (2, 99)}


def _read_lines(text: str, wrong: Any) -> tuple[list[AmplifierLine], list[BranchLine]]:
    amplifiers: list[AmplifierLine] = []
    branches: list[BranchLine] = []
    for row in text.splitlines():
        words = row.split("#", 1)[0].split()
        if not words:
            continue
        nets = words[1:]
        if not all(_NET.match(net) for net in nets):
            wrong(f"template line `{row.strip()}`: nets are small letters and digits", "template")
        elif re.match(r"^A\d*$", words[0]) and len(nets) == 3:
            amplifiers.append(AmplifierLine(words[0], *nets))
        elif (match := _BRANCH.match(words[0])) and len(nets) == 2:
            least, most = _COUNTS[match["count"]]
            branches.append(BranchLine(match["letter"], match["role"], nets[0], nets[1], least, most))
        else:
            wrong(
                f"template line `{row.strip()}` is neither an amplifier nor a branch",
                "template",
                cure="`A plus minus out` or `R.role net net`",
            )
    if text and not amplifiers:
        wrong("a template needs an amplifier line", "template")
    return amplifiers, branches
