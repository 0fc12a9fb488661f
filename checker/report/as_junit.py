"""The JUnit XML report: a test suite for each netlist, a test case for reading it and one for each finding.

A finding at or above the level that fails the review is a failure, a lesser one a passed case whose text stands in its
output, a waived one is skipped. Checks that could not be made are skipped cases, folded by rule.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from xml.sax.saxutils import escape, quoteattr

from ..errors import render_problem
from ..rulebook.findings import Finding, NetlistReview, Review
from .formats import Options
from .wording import fails, figures_of, plural, remedy_words, waiver_words


@dataclass(frozen=True, slots=True)
class Case:
    """One test case: ``outcome`` is passed, failure, error or skipped."""

    name: str
    outcome: str
    message: str = ""
    kind: str = ""
    text: str = ""


def render(review: Review, options: Options) -> Iterator[str]:
    """Yield the document, one suite after the other."""
    suites = [(netlist, list(_cases(netlist, options.fail_on))) for netlist in review.netlists]
    everything = [case for _, cases in suites for case in cases]
    yield '<?xml version="1.0" encoding="UTF-8"?>\n'
    yield f'<testsuites name="ampwarden" {_counts(everything)} time="0">\n'
    for netlist, cases in suites:
        yield f'  <testsuite name={_attribute(netlist.path)} {_counts(cases)} time="0">\n'
        for case in cases:
            yield from _case(netlist.path, case)
        yield "  </testsuite>\n"
    yield "</testsuites>\n"


def _counts(cases: list[Case]) -> str:
    outcomes = [case.outcome for case in cases]
    return (
        f'tests="{len(outcomes)}" failures="{outcomes.count("failure")}" '
        f'errors="{outcomes.count("error")}" skipped="{outcomes.count("skipped")}"'
    )


def _cases(netlist: NetlistReview, fail_on: str) -> Iterator[Case]:
    if netlist.error:
        text = "\n".join(render_problem(problem) for problem in netlist.error)
        yield Case("netlist is read", "error", netlist.error[0].what, netlist.error[0].kind, text)
        return
    yield Case("netlist is read", "passed")
    for finding in netlist.findings:
        name = f"{finding.rule}: {finding.subject}"
        waived = waiver_words(finding)
        if waived:
            yield Case(name, "skipped", waived)
        elif fails(finding.level, fail_on):
            yield Case(name, "failure", finding.message, finding.level, _finding_text(finding))
        else:
            yield Case(name, "passed", finding.message, finding.level, _finding_text(finding))
    by_rule: dict[str, list[str]] = {}
    for each in netlist.unevaluated:
        by_rule.setdefault(each.rule, []).append(f"{each.subject}: {each.reason}")
    for rule, reasons in by_rule.items():
        yield Case(f"{rule}: not evaluated", "skipped", f"{plural(len(reasons), 'subject')}; {'; '.join(reasons)}")


def _finding_text(finding: Finding) -> str:
    rows = [f"{finding.file}:{finding.line}  {finding.message}"]
    rows += [f"{label}: {text}" for label, text in figures_of(finding)]
    remedy = remedy_words(finding)
    if remedy:
        rows.append(f"remedy: {remedy}")
    rows.append(f"because: {finding.because}")
    return "\n".join(rows)


def _case(path: str, case: Case) -> Iterator[str]:
    head = f'    <testcase classname={_attribute(path)} name={_attribute(case.name)} time="0"'
    if case.outcome == "passed" and not case.text:
        yield f"{head}/>\n"
        return
    yield f"{head}>\n"
    if case.outcome == "passed":
        yield f"      <system-out>{_text(case.text)}</system-out>\n"
    elif case.outcome == "skipped":
        yield f"      <skipped message={_attribute(case.message)}/>\n"
    else:
        kind = f"type={_attribute(case.kind)}"
        message = f"message={_attribute(case.message)}"
        yield f"      <{case.outcome} {kind} {message}>{_text(case.text)}</{case.outcome}>\n"
    yield "    </testcase>\n"


def _text(text: str) -> str:
    return escape(_allowed(text))


def _attribute(text: str) -> str:
    return quoteattr(_allowed(text), {"\n": "&#10;", "\t": "&#9;"})


def _allowed(text: str) -> str:
    """Replace what XML 1.0 cannot carry (control characters, lone surrogates) by a question mark."""
    return "".join(
        sign if sign in "\t\n" or " " <= sign <= "\ud7ff" or "\ue000" <= sign <= "\ufffd" or sign > "\uffff" else "?"
        for sign in text
    )
