"""The SARIF 2.1.0 report, for code hosts, editors and build servers.

A rule carries its own default level, a result the level of the finding, so that a team that changed a level does not
break the assumption of one level a rule. A waiver is a suppression; a netlist that could not be read, and checks that
could not be made, are notifications of the tool, never results.
"""

from __future__ import annotations

import json
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from urllib.parse import quote

from ..errors import Location, Problem
from ..rulebook.findings import Finding, NetlistReview, Review, RuleText
from ..version import __version__
from .as_json import finite
from .formats import Options
from .wording import listing, remedy_words, waiver_words

SCHEMA = "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
FINGERPRINT = "ampwarden/v1"
ROOT = "SRCROOT"


def render(review: Review, options: Options) -> Iterator[str]:
    """Yield the log: tool and notifications first, then one result after the other."""
    root = Path(options.root or os.curdir).resolve()
    rules = _rules(review)
    order = {name: index for index, name in enumerate(rules)}
    run = {
        "tool": {"driver": {"name": "ampwarden", "version": __version__, "rules": list(rules.values())}},
        "columnKind": "unicodeCodePoints",
        "originalUriBaseIds": {ROOT: {"description": {"text": "the folder that the review was started in"}}},
        "invocations": [_invocation(review, root)],
    }
    log = json.dumps({"$schema": SCHEMA, "version": "2.1.0", "runs": [run]}, indent=2, ensure_ascii=False)
    yield log.removesuffix("\n    }\n  ]\n}") + ',\n      "results": ['
    for index, finding in enumerate(review.findings):
        text = json.dumps(_result(finding, order, root), indent=2, ensure_ascii=False, allow_nan=False)
        yield ("," if index else "") + "\n        " + text.replace("\n", "\n        ")
    yield ("\n      ]" if review.findings else "]") + "\n    }\n  ]\n}\n"


def _rules(review: Review) -> dict[str, dict[str, Any]]:
    """Return the rules that have results, with their texts, in the order of their names."""
    known = {each.name: each for each in review.rules}
    named = {each.rule: each for each in reversed(review.findings)}
    rules = {}
    for name in sorted(named):
        finding = named[name]
        rule = known.get(name) or RuleText(name, finding.level, name.replace("-", " "), finding.because)
        because = " ".join(rule.because.split())
        sources = "; ".join(rule.sources)
        help_text = because + (f" Sources: {sources}." if sources else "")
        entry: dict[str, Any] = {
            "id": name,
            "shortDescription": {"text": rule.title or name},
            "fullDescription": {"text": because or rule.title or name},
            "help": {"text": help_text or rule.title or name},
            "defaultConfiguration": {"level": rule.level},
        }
        if rule.concern:
            entry["properties"] = {"tags": [rule.concern]}
        rules[name] = entry
    return rules


def _result(finding: Finding, order: dict[str, int], root: Path) -> dict[str, Any]:
    remedy = remedy_words(finding)
    result: dict[str, Any] = {
        "ruleId": finding.rule,
        "ruleIndex": order[finding.rule],
        "level": finding.level,
        "message": {"text": f"{finding.message}\nremedy: {remedy}" if remedy else finding.message},
        "locations": [_location(finding, root)],
        "partialFingerprints": {FINGERPRINT: finding.fingerprint},
        "properties": {
            "subject": finding.subject,
            "stage": finding.stage,
            "parts": list(finding.parts),
            "nets": list(finding.nets),
            "measured": finite(finding.measured),
            "limit": finite(finding.limit),
            "unit": finding.unit,
            "remedyVerified": bool(finding.remedy and finding.remedy.is_verified),
            "assumptions": list(finding.assumptions),
        },
    }
    waived = waiver_words(finding)
    if waived:
        result["suppressions"] = [{"kind": "external", "status": "accepted", "justification": waived}]
    else:
        result["suppressions"] = []
    return result


def _location(finding: Finding, root: Path) -> dict[str, Any]:
    location: dict[str, Any] = {"physicalLocation": _place(finding.file, finding.line, root)}
    logical = [{"name": name, "kind": "part"} for name in finding.parts]
    logical += [{"name": name, "kind": "net"} for name in finding.nets]
    if logical:
        location["logicalLocations"] = logical
    return location


def _place(file: str, line: int | None, root: Path, column: int | None = None) -> dict[str, Any]:
    place: dict[str, Any] = {"artifactLocation": _artifact(file, root)}
    if line:
        place["region"] = {"startLine": line, **({"startColumn": column} if column else {})}
    return place


def _artifact(file: str, root: Path) -> dict[str, str]:
    """Return a URI relative to the root, or an absolute one for a file outside it."""
    path = Path(os.path.abspath(file))  # noqa: PTH100 - links stay as the caller named them
    for base in (root, Path.cwd()):
        if path.is_relative_to(base):
            return {"uri": quote(path.relative_to(base).as_posix()), "uriBaseId": ROOT}
    return {"uri": path.as_uri()}


def _invocation(review: Review, root: Path) -> dict[str, Any]:
    notifications = [_unread(problem, netlist, root) for netlist in review.netlists for problem in netlist.error]
    for netlist in review.netlists:
        notifications += _open_questions(netlist, root)
    return {
        "executionSuccessful": not any(netlist.error for netlist in review.netlists),
        "toolExecutionNotifications": notifications,
    }


def _unread(problem: Problem, netlist: NetlistReview, root: Path) -> dict[str, Any]:
    place = problem.location or Location(netlist.path, 0)
    return {
        "descriptor": {"id": problem.kind},
        "level": "error",
        "message": {"text": f"cannot be read: {problem.what}"},
        "locations": [{"physicalLocation": _place(place.file, place.line, root, place.column)}],
    }


def _open_questions(netlist: NetlistReview, root: Path) -> list[dict[str, Any]]:
    by_reason: dict[tuple[str, str], list[str]] = {}
    for each in netlist.unevaluated:
        by_reason.setdefault((each.rule, each.reason), []).append(each.subject)
    return [
        {
            "descriptor": {"id": "not-evaluated"},
            "level": "note",
            "message": {"text": f"{rule} not evaluated for {listing(subjects)}: {reason}"},
            "locations": [{"physicalLocation": _place(netlist.path, None, root)}],
        }
        for (rule, reason), subjects in by_reason.items()
    ]
