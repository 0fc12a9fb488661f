"""Netlists as texts: lines, comments, errors with their place, files that may be read and those that may not."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ampwarden.errors import AmpwardenError, NetlistError, render_problem
from ampwarden.text import parse_netlist, read_netlist
from ampwarden.text.elements import LineError
from ampwarden.text.grammar import fields_by_grammar
from ampwarden.text.lines import LogicalLine
from ampwarden.text.tokens import split_fields


def elements(text):
    return {each.designator: each for each in parse_netlist(text, name="t.cir").scope.elements}


def test_title_comments_and_continuations():
    found = elements("the title\n* remark\nR1 a b ; behind\n* between\n+ 4k7 $ more\nC1 a 0 100n\n.end\nR9 a b 1\n")
    assert list(found) == ["R1", "C1"]
    assert found["R1"].value == 4700.0
    assert found["R1"].location.line == 3


@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_line_ends_make_no_difference(ending):
    assert list(elements(ending.join(["t", "R1 a b 1k", "R2 b 0 2k", ".end", ""]))) == ["R1", "R2"]


def test_every_error_of_a_file_is_told_with_line_column_and_caret():
    with pytest.raises(NetlistError) as caught:
        parse_netlist("t\nR1 a\nC1 a 0 {1n\nR2 b 0 1k\nE1 x\n", name="bad.cir")
    problems = caught.value.problems
    assert [each.location.line for each in problems] == [2, 3, 5]
    shown = render_problem(problems[1])
    assert "bad.cir:3" in shown
    assert "^" in shown
    assert all(each.expected for each in problems)


def test_include_below_the_folder_is_read_and_one_outside_is_refused(tmp_path):
    sheet = tmp_path / "sheets"
    sheet.mkdir()
    (sheet / "part.inc").write_text("R2 b 0 2k\n", encoding="utf-8")
    (tmp_path / "secret.inc").write_text("R3 c 0 3k\n", encoding="utf-8")
    good = sheet / "good.cir"
    good.write_text("t\n.include part.inc\nR1 a b 1k\n.end\n", encoding="utf-8")
    assert {each.designator for each in read_netlist(good).scope.elements} == {"R1", "R2"}
    for wanted in ("../secret.inc", str(tmp_path / "secret.inc")):
        bad = sheet / "bad.cir"
        bad.write_text(f"t\n.include {wanted}\nR1 a b 1k\n.end\n", encoding="utf-8")
        with pytest.raises(NetlistError) as caught:
            read_netlist(bad)
        assert caught.value.problems[0].location.line == 2


def test_link_that_leaves_the_folder_is_refused(tmp_path):
    sheet = tmp_path / "sheets"
    sheet.mkdir()
    (tmp_path / "secret.inc").write_text("R3 c 0 3k\n", encoding="utf-8")
    (sheet / "link.inc").symlink_to(tmp_path / "secret.inc")
    bad = sheet / "bad.cir"
    bad.write_text("t\n.include link.inc\nR1 a b 1k\n.end\n", encoding="utf-8")
    with pytest.raises(NetlistError):
        read_netlist(bad)


WORDS = st.text("abRC019.+-_:/#[]<>", min_size=1, max_size=8)


@settings(max_examples=150, deadline=None)
@given(
    st.lists(
        st.one_of(WORDS, WORDS.map("{{{}}}".format), st.tuples(WORDS, WORDS).map("=".join)), min_size=1, max_size=6
    )
)
def test_plain_splitter_and_grammar_read_the_same_fields(words):
    text = "R1 a b " + " ".join(words)
    plain = split_fields(text)
    try:
        by_grammar = fields_by_grammar(LogicalLine(text, None, ((0, 1, 1),)))
    except LineError:
        by_grammar = None
    if plain is not None and by_grammar is not None:
        assert [(each.bare, each.name) for each in plain] == [(each.bare, each.name) for each in by_grammar]


def problems_of(read):
    """Return what a reader complains about; anything but our own error comes through."""
    try:
        read()
    except AmpwardenError as trouble:
        return trouble.problems
    return ()


@settings(max_examples=200, deadline=None)
@given(st.text(max_size=300))
def test_any_text_is_read_or_refused_in_our_own_words(text):
    assert all(each.what for each in problems_of(lambda: parse_netlist(text, name="any.cir")))


@settings(max_examples=100, deadline=None)
@given(st.binary(max_size=300))
def test_any_bytes_are_read_or_refused_in_our_own_words(tmp_path_factory, data):
    place = tmp_path_factory.mktemp("bytes") / "any.cir"
    place.write_bytes(data)
    assert all(each.what for each in problems_of(lambda: read_netlist(place)))


NAMES = st.from_regex(r"[a-z][a-z0-9_]{0,5}", fullmatch=True)


@settings(max_examples=100, deadline=None)
@given(
    st.lists(st.tuples(st.sampled_from("RCL"), NAMES, NAMES, st.floats(1e-12, 1e9)), min_size=1, max_size=8),
)
def test_printed_parts_parse_back(parts):
    text = "t\n" + "".join(
        f"{kind}{number} {one} {two} {value!r}\n" for number, (kind, one, two, value) in enumerate(parts)
    )
    found = elements(text)
    assert len(found) == len(parts)
    for number, (kind, one, two, value) in enumerate(parts):
        each = found[f"{kind}{number}"]
        assert each.nets == (one, two)
        assert each.value == pytest.approx(value, rel=1e-12)
