"""``ampwarden review`` as a person and a script meet it: exit status, streams, formats, trouble."""

import json

import pytest


@pytest.mark.parametrize(
    ("arguments", "status"),
    [
        (("good",), 0),
        (("bad",), 1),
        (("bad", "--fail-on", "never"), 0),
        (("bad", "--skip", "supply-decoupling-missing"), 0),
        (("bad", "--only", "input-unbiased"), 0),
        (("bad", "--only", "supply-decoupling-missing"), 1),
        (("torn",), 2),
        (("torn", "--fail-on", "never"), 2),
        (("good", "torn"), 2),
        (("good", "bad"), 1),
        (("missing.cir",), 2),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, tuple) else str(value),
)
def test_exit_status(ampwarden, boards, arguments, status):
    done = ampwarden("review", *arguments)
    assert done.returncode == status, done.stdout + done.stderr
    assert "Traceback" not in done.stderr
    assert "bug:" not in done.stderr


def test_finding_names_part_net_place_and_rule(ampwarden, boards):
    done = ampwarden("review", "bad/bad.cir")
    assert "supply-decoupling-missing" in done.stdout
    assert "VCC" in done.stdout
    assert "U1" in done.stdout
    assert "bad/bad.cir:" in done.stdout
    assert done.stderr == ""


def test_unreadable_netlist_is_told_with_line_column_and_caret_on_standard_error(ampwarden, boards):
    done = ampwarden("review", "torn/torn.cir", "--format", "json")
    assert "torn/torn.cir:2:" in done.stderr
    assert "R1 in out 4..7k" in done.stderr
    assert "^" in done.stderr
    assert "torn/torn.cir:3" in done.stderr
    assert json.loads(done.stdout)["netlists"][0]["error"]["line"] == 2


def test_unreadable_netlist_does_not_hide_the_others(ampwarden, boards):
    done = ampwarden("review", ".", "--format", "json")
    netlists = {each["path"]: each for each in json.loads(done.stdout)["netlists"]}
    assert list(netlists) == ["bad/bad.cir", "good/good.cir", "torn/torn.cir"]
    assert netlists["bad/bad.cir"]["findings"]
    assert netlists["torn/torn.cir"]["error"]


@pytest.mark.parametrize("form", ["text", "json", "sarif", "junit", "csv"])
def test_every_format_goes_to_standard_output_and_to_a_file_alike(ampwarden, boards, form, tmp_path):
    shown = ampwarden("review", "bad/bad.cir", "--format", form)
    kept = ampwarden("review", "bad/bad.cir", "--format", form, "--output", "report.out")
    assert (shown.returncode, kept.returncode) == (1, 1)
    assert kept.stdout == ""
    assert (tmp_path / "report.out").read_bytes().decode().replace("\r\n", "\n") == shown.stdout.replace("\r\n", "\n")


def test_report_that_cannot_be_written_is_one_line_and_status_2(ampwarden, boards):
    done = ampwarden("review", "good/good.cir", "--output", "no/such/folder/report.txt")
    assert done.returncode == 2
    assert "cannot write no/such/folder/report.txt" in done.stderr
    assert len(done.stderr.splitlines()) == 1


def test_unknown_rule_is_answered_with_the_nearest(ampwarden, boards):
    done = ampwarden("review", "good/good.cir", "--only", "output-near-rails")
    assert done.returncode == 2
    assert "no rule is named `output-near-rails`" in done.stderr
    assert "output-near-rail\n" in done.stderr


def test_folder_without_netlists_says_which_endings_count(ampwarden, tmp_path):
    (tmp_path / "empty").mkdir()
    done = ampwarden("review", "empty")
    assert done.returncode == 2
    assert ".cir" in done.stderr


def test_nearest_intent_file_is_used_and_a_given_one_wins(ampwarden, boards):
    (boards / "review.toml").write_text('[rules]\noff = ["supply-decoupling-missing"]\n')
    (boards / "strict.toml").write_text("[rules]\noff = []\n")
    assert ampwarden("review", "bad").returncode == 0
    assert ampwarden("review", "bad", "--intent", "strict.toml").returncode == 1


def test_wrong_intent_file_names_file_line_and_key(ampwarden, boards):
    (boards / "review.toml").write_text('[rails]\nVCC = "12 V"\n[tolerences]\nresistor = "1 %"\n')
    done = ampwarden("review", "good", "--intent", "review.toml")
    assert done.returncode == 2
    assert "review.toml:3" in done.stderr
    assert "tolerance" in done.stderr


def test_wrong_intent_file_beside_one_netlist_stays_with_it(ampwarden, boards):
    (boards / "bad" / "review.toml").write_text("[rails]\nVCC = 12 volts\n")
    done = ampwarden("review", "good", "bad", "--format", "json")
    assert done.returncode == 2
    good, bad = json.loads(done.stdout)["netlists"]
    assert good["error"] is None
    assert "review.toml" in bad["error"]["file"]


def test_missing_intent_file_is_a_wrong_call(ampwarden, boards):
    done = ampwarden("review", "good", "--intent", "nowhere.toml")
    assert done.returncode == 2
    assert "nowhere.toml" in done.stderr


def test_same_netlist_named_twice_is_reviewed_once(ampwarden, boards):
    done = ampwarden("review", "good/good.cir", "good", "--format", "json")
    assert len(json.loads(done.stdout)["netlists"]) == 1


def test_waiver_silences_a_finding_but_keeps_it_on_the_page(ampwarden, boards):
    waiver = '[[waivers]]\nrule = "supply-decoupling-missing"\nwhere = "VCC"\nreason = "bench jig"\n'
    (boards / "bad" / "review.toml").write_text(waiver)
    done = ampwarden("review", "bad")
    assert done.returncode == 0, done.stdout
    assert "waived: bench jig" in done.stdout


def test_two_runs_give_the_same_bytes(ampwarden, boards):
    first = ampwarden("review", "bad", "good", "--format", "json", PYTHONHASHSEED="1")
    second = ampwarden("review", "bad", "good", "--format", "json", PYTHONHASHSEED="2")
    assert first.stdout == second.stdout


def test_stages_lists_figures_without_judgement(ampwarden, boards):
    done = ampwarden("stages", "bad/bad.cir")
    assert done.returncode == 0
    assert "voltage-follower" in done.stdout
    assert "supply-decoupling-missing" not in done.stdout


def test_stages_as_json_has_the_measures_of_the_contract(ampwarden, boards):
    done = ampwarden("stages", "good/good.cir", "--format", "json")
    stage = json.loads(done.stdout)["netlists"][0]["stages"][0]
    assert stage["topology"] == "voltage-follower"
    assert stage["measures"]["dc_gain"] == pytest.approx(1, rel=1e-3)


def test_stages_of_an_unreadable_netlist_end_with_2(ampwarden, boards):
    done = ampwarden("stages", "torn", "good")
    assert done.returncode == 2
    assert "voltage-follower" in done.stdout
