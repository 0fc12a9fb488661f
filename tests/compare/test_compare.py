"""Comparing reviews: stages pair by what they are, findings by fingerprint."""

from dataclasses import replace

from ampwarden.compare import compare_findings, compare_netlists, compare_reviews, match_stages, stage_changes
from ampwarden.rulebook.findings import Finding, NetlistReview, Review, StageReport


def stage(
    name, topology="inverting-amplifier", feedback=47e3, given=10e3, gain=-4.7, inputs=("in",), output="out", **parts
):
    return StageReport(
        name=name,
        topology=topology,
        amplifiers=(name,),
        inputs=inputs,
        output=output,
        roles={"feedback": (parts.get("rf", "R2"),), "input": (parts.get("ri", "R1"),)},
        values={"feedback": (feedback,), "input": (given,)},
        measures={"dc_gain": gain},
    )


def finding(rule="output-near-rail", place="U1A", fingerprint="f1"):
    return Finding(
        rule, "warning", "m", None, "b", (place,), (), place, "a.cir", 3, 1.0, 2.0, "V", fingerprint, subject=place
    )


def netlist(path, *stages, findings=(), sha="s"):
    return NetlistReview(path=path, title="t", sha256=sha, stages=tuple(stages), findings=tuple(findings))


def test_renamed_nets_and_renumbered_designators_are_no_change():
    old = netlist("a.cir", stage("U1"), stage("U2", feedback=22e3, gain=-2.2))
    new = netlist(
        "a.cir",
        stage("U7", feedback=22e3, gain=-2.2, inputs=("N5",), output="N6", rf="R9"),
        stage("U1", inputs=("N1",), output="N2", rf="R5"),
    )
    outcome = compare_netlists(old, new)
    assert outcome.kind == "same"
    assert [each.kind for each in outcome.stages] == ["same", "same"]


def test_exchanged_designators_pair_by_structure():
    old = [stage("U1"), stage("U2", topology="voltage-follower", gain=1.0)]
    new = [stage("U1", topology="voltage-follower", gain=1.0), stage("U2")]
    assert {(one.name, two.name) for one, two in match_stages(old, new)} == {("U1", "U2"), ("U2", "U1")}


def test_changed_value_shows_value_and_gain_before_and_after():
    changes = stage_changes(stage("U1"), stage("U1", feedback=22e3, gain=-2.2))
    assert [(each.what, each.before, each.after) for each in changes] == [
        ("feedback (R2)", 47e3, 22e3),
        ("dc_gain", -4.7, -2.2),
    ]


def test_small_capacitor_values_are_told_apart():
    changes = stage_changes(stage("U1", feedback=10e-12), stage("U1", feedback=22e-12))
    assert changes[0].what == "feedback (R2)"


def test_added_and_removed_stages_are_named():
    outcome = compare_netlists(
        netlist("a.cir", stage("U1"), stage("U2", gain=-1, feedback=1.0)), netlist("a.cir", stage("U1"))
    )
    assert [(each.kind, each.name) for each in outcome.stages] == [("same", "U1"), ("removed", "U2")]


def test_finding_with_known_fingerprint_is_not_new():
    fresh, fixed, known = compare_findings(
        [finding(), finding(fingerprint="f2")], [finding(), finding(fingerprint="f3")]
    )
    assert [each.fingerprint for each in fresh] == ["f3"]
    assert [each.fingerprint for each in fixed] == ["f2"]
    assert [each.fingerprint for each in known] == ["f1"]


def test_finding_on_a_renumbered_stage_is_known():
    old = netlist("a.cir", stage("U1"), findings=[finding(place="U1", fingerprint="x")])
    new = netlist("a.cir", stage("U4"), findings=[finding(place="U4", fingerprint="y")])
    outcome = compare_netlists(old, new)
    assert (outcome.new, outcome.fixed, len(outcome.known)) == ((), (), 1)


def test_second_finding_of_one_fingerprint_is_new():
    fresh, _, known = compare_findings([finding()], [finding(), finding()])
    assert (len(fresh), len(known)) == (1, 1)


def test_renamed_file_pairs_by_its_stages():
    old = Review((netlist("a/one.cir", stage("U1"), sha="1"), netlist("a/two.cir", stage("U2", feedback=1e3), sha="2")))
    new = Review(
        (netlist("b/one.cir", stage("U1"), sha="1"), netlist("b/three.cir", stage("U2", feedback=1e3), sha="3"))
    )
    outcome = compare_reviews(old, new, old_root="a", new_root="b")
    assert [(each.old_path, each.path, each.kind) for each in outcome] == [
        ("a/one.cir", "b/one.cir", "same"),
        ("a/two.cir", "b/three.cir", "same"),
    ]


def test_bank_of_equal_stages_pairs_in_order():
    old = [stage(f"U{n}", inputs=(f"i{n}",), output=f"o{n}") for n in range(40)]
    new = [replace(each, name=f"X{each.name}", inputs=("q",), output=f"p{each.name}") for each in old]
    assert len(match_stages(old, new)) == 40
