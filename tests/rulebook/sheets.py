"""Small sheets for the tests of rules, and how they are judged."""

from __future__ import annotations

from ampwarden.pipeline import review_text
from ampwarden.text import parse_intent

IDEAL = ".subckt OA p m o A=1e6\nE1 o 0 p m {A}\n.ends OA\n"
RAILS = "VP VCC 0 12\nVN VEE 0 -12\n"
DECOUPLED = f"{RAILS}C91 VCC 0 100n\nC92 VEE 0 100n\n"


def judged(netlist, intent="", **options):
    """Return the review of a netlist without title."""
    found = review_text(
        f"a sheet\n{IDEAL}{netlist}\n.end\n", parse_intent(intent, "review.toml"), name="sheet.cir", **options
    )
    assert found.error == (), [each.what for each in found.error]
    return found


def findings(reviewed, rule):
    """Return the findings of one rule."""
    return [each for each in reviewed.findings if each.rule == rule]


def only(reviewed, rule):
    """Return the one finding of a rule; fails when there is none or several."""
    found = findings(reviewed, rule)
    assert len(found) == 1, [(each.rule, each.message) for each in reviewed.findings]
    return found[0]
