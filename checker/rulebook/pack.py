"""Rule files: what a rule is, how it is read and checked, and the pack of all rules that hold.

A rule that is wrong never loads: every problem of every file is raised at once, with file and line.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..errors import Location, Problem, RulePackError
from ..quantities import nearest_names
from ..resources import TomlDocument, compiled, core_folder, gather, parse_toml
from .conditions import Condition, Value, compile_condition, compile_value
from .messages import Text, compile_text, placeholders
from .scopes import RuleScope
from .syntax import prepare

LEVELS = ("error", "warning", "note")
SUBJECTS = (
    "netlist", "rail", "net", "part", "package", "amplifier", "supply net", "supply pin", "input pin", "stage",
)  # fmt: skip
CASE_KEYS = ("level", "when", "require", "message", "remedy", "otherwise", "fix", "measured", "limit", "parts", "nets")
KEYS = (
    "name", "title", "subject", "limits", "because", "sources", "examples", "cases", "follows", *CASE_KEYS,
)  # fmt: skip
_NAME = re.compile(r"^[a-z][a-z0-9]*(-[a-z0-9]+)+$")


@dataclass(frozen=True, slots=True)
class Limit:
    """A figure in a rule that a team may change: default (None when the rule works without), unit, meaning."""

    name: str
    value: float | None
    unit: str
    text: str
    written: str


@dataclass(frozen=True, slots=True)
class Example:
    """A small netlist that the rule must flag or leave alone; ``expect`` is flagged or clean."""

    title: str
    netlist: str
    expect: str
    intent: str
    line: int


@dataclass(frozen=True, slots=True)
class Case:
    """One demand of a rule. The first whose ``when`` holds and whose ``require`` fails makes the finding."""

    level: str
    when: Condition | None
    require: Condition
    message: Text
    remedy: Text
    otherwise: Text | None
    fix: str | None
    measured: Value | None
    limit: Value | None
    parts: Value | None
    nets: Value | None


@dataclass(frozen=True, slots=True)
class Rule:
    """A rule as loaded: texts for people, conditions for the subjects of its kind."""

    name: str
    level: str
    title: str
    subject: str
    when: Condition | None
    cases: tuple[Case, ...]
    limits: Mapping[str, Limit]
    because: str
    sources: tuple[str, ...]
    examples: tuple[Example, ...]
    follows: tuple[str, ...]
    concern: str
    path: str
    conditions: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Pack:
    """All rules, by concern and name; house rules may replace core rules of the same name."""

    rules: tuple[Rule, ...]

    def find(self, name: str) -> Rule | None:
        """Return a rule by name."""
        return next((rule for rule in self.rules if rule.name == name), None)

    def nearest(self, name: str) -> tuple[str, ...]:
        """Return the names that come nearest to a misspelt one."""
        return nearest_names(name, [rule.name for rule in self.rules])


def load_pack(folders: Sequence[Path] = ()) -> Pack:
    """Load the shipped rules and those of house folders (a folder of rule files, or one with ``checks/`` in it).

    Raises
    ------
    RulePackError
        When a rule file is wrong or two files of one pack use one name; every problem is carried.
    """
    problems: list[Problem] = []
    found: dict[str, dict[str, Any]] = {}
    packs = [gather([core_folder("checks")])]
    for folder in folders:
        if not folder.is_dir():
            problems.append(Problem("folder-missing", f"rule folder {folder} does not exist"))
            continue
        inner = folder / "checks"
        packs.append(gather([inner if inner.is_dir() else folder]))
    for number, sources in enumerate(packs):
        if not sources:
            continue
        try:
            rows = _read_all(sources, is_house=number > 0)
        except RulePackError as trouble:
            problems.extend(trouble.problems)
            continue
        names: dict[str, str] = {}
        for row in rows:
            if row["name"] in names:
                place = Location(row["path"], row["lines"].get("name", 1))
                what = f"two files define the rule `{row['name']}`: {names[row['name']]} and {row['path']}"
                problems.append(Problem("rule-twice", what, place, cure="rename one of them"))
            names[row["name"]] = row["path"]
            found[row["name"]] = row
    if problems:
        raise RulePackError(problems)
    prepare(text for row in found.values() for text in row["texts"])
    rules = []
    for row in found.values():
        try:
            rules.append(_rule(row))
        except RulePackError as trouble:
            problems.extend(trouble.problems)
    if problems:
        raise RulePackError(problems)
    return Pack(tuple(sorted(rules, key=lambda rule: (rule.concern, rule.name))))


def _read_all(sources: Sequence[tuple[str, bytes]], *, is_house: bool) -> list[dict[str, Any]]:
    def build() -> list[dict[str, Any]]:
        rows = []
        problems: list[Problem] = []
        for name, content in sources:
            try:
                document = parse_toml(content.decode("utf-8-sig"), name, RulePackError)
                if is_house and "require" not in document.data and "subject" not in document.data:
                    continue  # topologies and parts of the same house folder
                rows.append(read_rule(document))
            except UnicodeDecodeError:
                problems.append(Problem("not-utf8", f"{name} is not UTF-8 text", Location(name, 1)))
            except RulePackError as trouble:
                problems.extend(trouble.problems)
        if problems:
            raise RulePackError(problems)
        return rows

    found: list[dict[str, Any]] = compiled("checks", sources, build)
    return found


def read_rule(document: TomlDocument) -> dict[str, Any]:
    """Check the form of one rule file and return it as JSON-able data; all its problems are raised at once."""
    data = document.data
    problems: list[Problem] = []

    def wrong(what: str, *keys: str | int, cure: str | None = None, nearest: Sequence[str] = ()) -> None:
        problems.append(Problem("rule-wrong", what, document.location(*keys), cure=cure, nearest=tuple(nearest)))

    for key in data:
        if key not in KEYS:
            wrong(f"`{key}` is not a key of a rule file", key, nearest=nearest_names(key, KEYS))
    for key in ("name", "title", "because", "message", "remedy", "require"):
        if not isinstance(data.get(key), str) or not str(data.get(key)).strip():
            wrong(f"a rule needs `{key}`", key, cure=f'{key} = "…"')
    name = str(data.get("name", ""))
    if name and not _NAME.match(name):
        wrong(f"`{name}` is not a rule name", "name", cure="trade words in small letters, joined by hyphens")
    if data.get("subject") not in SUBJECTS:
        wrong(
            f"subject must be one of {', '.join(SUBJECTS)}",
            "subject",
            nearest=nearest_names(str(data.get("subject")), SUBJECTS),
        )
    if not data.get("sources"):
        wrong(
            "a rule needs `sources`", "sources", cure='sources = ["author, title"], or ["common practice, no source"]'
        )
    cases = [(data, ())] + [(each, ("cases", index)) for index, each in enumerate(data.get("cases", []))]
    plain_cases = []
    for case, keys in cases:
        if keys:
            for key in case:
                if key not in CASE_KEYS:
                    wrong(f"`{key}` is not a key of a case", *keys, key, nearest=nearest_names(key, CASE_KEYS))
            for key in ("require", "message", "remedy"):
                if not isinstance(case.get(key), str):
                    wrong(f"a case needs `{key}`", *keys)
        if case.get("level", data.get("level")) not in LEVELS:
            wrong(f"level must be one of {', '.join(LEVELS)}", *keys, "level", cure='level = "warning"')
        plain_cases.append(
            {
                "level": case.get("level", data.get("level")),
                **{key: str(case[key]) if key in case else None for key in CASE_KEYS if key not in {"level"}},
                "when": str(case["when"]) if keys and "when" in case else None,
                "lines": {key: document.line_of(*keys, key) for key in CASE_KEYS},
            }
        )
    limits = [_read_limit(each, value, wrong) for each, value in data.get("limits", {}).items()]
    examples = []
    for index, each in enumerate(data.get("examples", [])):
        for key in ("title", "netlist", "expect"):
            if not isinstance(each.get(key), str):
                wrong(f"an example needs `{key}`", "examples", index)
        if each.get("expect") not in {"flagged", "clean"}:
            wrong('expect must be "flagged" or "clean"', "examples", index, "expect")
        line = document.line_of("examples", index)
        examples.append(
            [each.get("title", ""), each.get("netlist", ""), each.get("expect", ""), each.get("intent", ""), line]
        )
    for wanted in ("flagged", "clean"):
        if not any(each[2] == wanted for each in examples):
            wrong(
                f"a rule needs an example that is {wanted}", "examples", cure=f'[[examples]] with expect = "{wanted}"'
            )
    if problems:
        raise RulePackError(problems)
    texts = [data.get("when"), data.get("require")]
    for plain in plain_cases:
        texts += [plain["when"], plain["require"], plain["measured"], plain["limit"], plain["parts"], plain["nets"]]
        for key in ("message", "remedy", "otherwise"):
            texts += placeholders(str(plain[key] or ""))
    return {
        "name": name,
        "title": data["title"],
        "subject": data["subject"],
        "when": data.get("when"),
        "cases": plain_cases,
        "limits": [each for each in limits if each is not None],
        "because": data["because"].strip(),
        "sources": [str(each) for each in data["sources"]],
        "examples": examples,
        "follows": [str(each) for each in data.get("follows", [])],
        "concern": Path(document.path).parent.name,
        "path": document.path,
        "lines": {key: document.line_of(key) for key in ("name", "when", *CASE_KEYS)},
        "texts": [text for text in texts if text],
    }


def _read_limit(name: str, value: Any, wrong: Any) -> list[Any] | None:
    """Return name, value, unit, meaning, text as written."""
    from ..quantities import parse_quantity, unit_of

    text = ""
    unit: str | None = None
    if isinstance(value, dict):
        text = str(value.get("text", ""))
        unit = str(value["unit"]) if "unit" in value else None
        value = value.get("value")
        if value is None and unit is None:
            wrong(f"limit `{name}` needs a value or a unit", "limits", name)
            return None
        if value is None:
            return [name, None, unit, text, "not set"]
    if isinstance(value, int | float) and not isinstance(value, bool):
        return [name, float(value), unit or "", text, f"{value:g}"]
    if isinstance(value, str):
        match = re.match(r"^\s*[-+0-9.eE]+\s*(.*?)\s*$", value)
        written = match[1] if match else ""
        try:
            base = unit if unit is not None else _si_unit(written)
            unit_of(base)
            return [name, parse_quantity(value, base), base, text, value]
        except ValueError as trouble:
            wrong(f"limit `{name}`: {trouble}", "limits", name)
            return None
    wrong(f"limit `{name}` must be a number or a quantity in quotes", "limits", name)
    return None


def _si_unit(written: str) -> str:
    """Return the SI unit of a written one: ``V`` for ``mV``; units of plain numbers stay as they are written."""
    from .terms import shown_unit

    return shown_unit(written)


def _rule(row: dict[str, Any]) -> Rule:
    path = row["path"]
    limits = {name: Limit(name, value, unit, text, written) for name, value, unit, text, written in row["limits"]}
    scope = RuleScope(row["subject"], {name: each.unit for name, each in limits.items()})

    def at(line: int) -> Location:
        return Location(path, line)

    def condition(text: str | None, line: int) -> Condition | None:
        return None if text is None else compile_condition(text, scope, at(line))

    def value(text: str | None, line: int) -> Value | None:
        return None if text is None else compile_value(text, scope, at(line))

    problems: list[Problem] = []
    cases = []
    for plain in row["cases"]:
        lines = plain["lines"]
        try:
            require = condition(plain["require"], lines["require"])
            assert require is not None
            _check_fix(plain["fix"], at(lines["fix"]))
            cases.append(
                Case(
                    plain["level"],
                    condition(plain["when"], lines["when"]),
                    require,
                    compile_text(plain["message"], scope, at(lines["message"])),
                    compile_text(plain["remedy"], scope, at(lines["remedy"])),
                    compile_text(plain["otherwise"], scope, at(lines["otherwise"])) if plain["otherwise"] else None,
                    plain["fix"],
                    value(plain["measured"], lines["measured"]),
                    value(plain["limit"], lines["limit"]),
                    value(plain["parts"], lines["parts"]),
                    value(plain["nets"], lines["nets"]),
                )
            )
        except RulePackError as trouble:
            problems.extend(trouble.problems)
    when: Condition | None = None
    try:
        when = condition(row["when"], row["lines"]["when"])
    except RulePackError as trouble:
        problems.extend(trouble.problems)
    if problems:
        raise RulePackError(problems)
    return Rule(
        name=row["name"],
        level=cases[0].level,
        title=row["title"],
        subject=row["subject"],
        when=when,
        cases=tuple(cases),
        limits=limits,
        because=row["because"],
        sources=tuple(row["sources"]),
        examples=tuple(Example(*each) for each in row["examples"]),
        follows=tuple(row["follows"]),
        concern=row["concern"],
        path=path,
        conditions=tuple((plain["level"], plain["require"]) for plain in row["cases"]),
    )


def _check_fix(name: str | None, where: Location) -> None:
    if name is None:
        return
    from .remedies import known_fixes

    fixes = known_fixes()
    if name not in fixes:
        near = nearest_names(name, fixes)
        raise RulePackError(Problem("fix-unknown", f"no computed remedy is named `{name}`", where, nearest=near))
