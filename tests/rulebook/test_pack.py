"""Rule files: what loads, what does not and why, and that every example does what its file says."""

from pathlib import Path

import pytest

from ampwarden.errors import RulePackError
from ampwarden.examples import run_rule_example, run_rule_examples
from ampwarden.pipeline import load_knowledge
from ampwarden.rulebook import load_pack

KNOWN = load_knowledge()
GOOD = """
name = "house-gain-high"
level = "note"
title = "more gain than the house likes"
subject = "stage"
require = "abs(dc_gain) <= most"
message = "{subject} has a gain of {dc_gain|x}, more than {most|x}"
remedy = "split the gain over two stages"
because = "House rule."
sources = ["house rule"]
[limits]
most = 50
[[examples]]
title = "a gain of 100"
expect = "flagged"
netlist = '''
t
V1 in 0 SIN(0 1m 1k)
R1 in n 1k
R2 n out 100k
E1 out 0 0 n 1MEG
'''
[[examples]]
title = "a gain of 10"
expect = "clean"
netlist = '''
t
V1 in 0 SIN(0 1m 1k)
R1 in n 1k
R2 n out 10k
E1 out 0 0 n 1MEG
'''
"""


def house(tmp_path, text, name="rule.toml"):
    folder = tmp_path / "house" / "checks" / "gain"
    folder.mkdir(parents=True, exist_ok=True)
    (folder / name).write_text(text, encoding="utf-8")
    return tmp_path / "house"


@pytest.mark.parametrize(
    ("rule", "example"),
    [pytest.param(rule, each, id=f"{rule.name}: {each.title}") for rule in KNOWN.pack.rules for each in rule.examples],
)
def test_example_of_a_rule_does_what_its_file_says(rule, example):
    assert run_rule_example(rule, example, KNOWN).trouble is None


def test_the_five_core_rules_are_there_under_their_names():
    names = {rule.name for rule in load_pack().rules}
    assert names >= {
        "supply-decoupling-missing", "input-unbiased", "follower-gain-below-one", "output-near-rail", "difference-ratio-mismatch",
    }  # fmt: skip


@pytest.mark.parametrize("rule", KNOWN.pack.rules, ids=lambda rule: rule.name)
def test_rule_is_told_in_full(rule):
    assert len(rule.because.split()) >= 15
    assert rule.sources
    assert all(limit.text for limit in rule.limits.values())
    assert sum(each.expect == "flagged" for each in rule.examples) >= 2
    assert sum(each.expect == "clean" for each in rule.examples) >= 3


@pytest.mark.parametrize("rule", KNOWN.pack.rules, ids=lambda rule: rule.name)
def test_texts_of_a_rule_keep_the_house_style(rule):
    for text in (
        rule.title,
        *(case.message.written for case in rule.cases),
        *(case.remedy.written for case in rule.cases),
    ):
        assert not text.endswith((".", "!", "?")), text
        assert "please" not in text.lower()
    assert not rule.title[:1].isupper() or rule.title.split()[0].isupper()


def test_house_rule_is_loaded_beside_the_core_rules(tmp_path):
    pack = load_pack([house(tmp_path, GOOD)])
    assert pack.find("house-gain-high").concern == "gain"
    assert pack.find("input-unbiased") is not None


def test_house_rule_of_the_same_name_replaces_the_core_rule(tmp_path):
    pack = load_pack([house(tmp_path, GOOD.replace("house-gain-high", "output-near-rail"))])
    assert [rule.title for rule in pack.rules if rule.name == "output-near-rail"] == ["more gain than the house likes"]


def test_examples_of_a_house_rule_are_run(tmp_path):
    known = load_knowledge([house(tmp_path, GOOD)])
    outcomes = list(run_rule_examples([known.pack.find("house-gain-high")], known))
    assert [each.trouble for each in outcomes] == [None, None]
    spoiled = load_knowledge([house(tmp_path, GOOD.replace("most = 50", "most = 500"))])
    troubles = [each.trouble for each in run_rule_examples([spoiled.pack.find("house-gain-high")], spoiled)]
    assert troubles[0] is not None
    assert troubles[1] is None


@pytest.mark.parametrize(
    ("spoil", "line", "told"),
    [
        (('level = "note"', 'level = "severe"'), 3, "level must be one of error, warning, note"),
        (('subject = "stage"', 'subject = "stag"'), 5, "subject must be one of"),
        (("abs(dc_gain)", "abs(dc_gian)"), 6, "dc_gian"),
        (("<= most", "<= 3 V"), 6, "V"),
        (('title = "more gain than the house likes"\n', ""), None, "a rule needs `title`"),
        (('name = "house-gain-high"', 'name = "House Gain"'), 2, "is not a rule name"),
        (('because = "House rule."', 'becuase = "House rule."'), 9, "`becuase` is not a key of a rule file"),
        (('expect = "clean"', 'expect = "flagged"'), None, "needs an example that is clean"),
        (("most = 50", 'most = "50 parsecs"'), None, "parsecs"),
        (("{dc_gain|x}", "{dc_gane|x}"), 7, "dc_gane"),
        (('level = "note"', "level = note"), 3, "not valid TOML"),
        (('sources = ["house rule"]\n', ""), None, "a rule needs `sources`"),
        (("remedy =", 'fix = "magic"\nremedy ='), 8, "no computed remedy is named `magic`"),
    ],
)
def test_wrong_rule_file_is_an_error_with_file_and_line(tmp_path, spoil, line, told):
    folder = house(tmp_path, GOOD.replace(*spoil))
    with pytest.raises(RulePackError) as caught:
        load_pack([folder])
    problem = next(
        each
        for each in caught.value.problems
        if told in each.what or told in str(each.expected) or told in str(each.cure)
    )
    assert Path(problem.location.file).name == "rule.toml"
    if line is not None:
        assert problem.location.line == line


def test_two_files_with_one_name_are_refused(tmp_path):
    house(tmp_path, GOOD, "one.toml")
    with pytest.raises(RulePackError, match="two files define"):
        load_pack([house(tmp_path, GOOD, "two.toml")])


def test_folder_that_does_not_exist_is_named(tmp_path):
    with pytest.raises(RulePackError, match="nowhere"):
        load_pack([tmp_path / "nowhere"])
