"""Whatever is read, only our own errors come out: nothing of lark, pydantic, tomllib, numpy or networkx escapes."""

import string
import subprocess
import sys

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from ampwarden.circuit import build_circuit, load_catalogue
from ampwarden.errors import AmpwardenError, NetlistError
from ampwarden.pipeline import bug_problem, review, review_text
from ampwarden.resources import parse_toml
from ampwarden.text import parse_intent, parse_netlist

WORDS = (
    "R1", "R2", "C1", "U1", "XU1", "Q1", "D1", "V1", "E1", "0", "gnd", "VCC", "VEE", "in", "out", "n1", "10k",
    "4k7", "1M", "1e999", "-5", "{a+b}", "'x'", "SIN(", ")", "AC", "DC", "POLY(2)", "VALUE=", ".subckt", ".ends",
    ".model", ".param", ".include", ".lib", ".if", ".end", "NPN", "D(", "IS=1e-14", ")", "+", "*", ";", "$", "\t",
    ",", "=", "a=1", "a={a}", "TL082", "LM358", "R=0",
)  # fmt: skip

line = st.lists(st.sampled_from(WORDS), max_size=8).map(" ".join)
deck = st.lists(st.one_of(line, st.text(string.printable, max_size=30)), max_size=15).map("\n".join)


def ours(work):
    """Do the work; an error of ours is an answer, any other is what this test is about."""
    try:
        return work()
    except AmpwardenError:
        return None


@settings(deadline=None, max_examples=150)
@given(deck)
def test_reading_a_netlist_raises_only_our_errors(text):
    netlist = ours(lambda: parse_netlist(text))
    if netlist is not None:
        ours(lambda: build_circuit(netlist))


@settings(deadline=None, max_examples=60, suppress_health_check=[HealthCheck.too_slow])
@given(deck)
def test_review_of_any_text_ends_in_a_review(text):
    reviewed = review_text(text)
    assert reviewed.error or reviewed.sha256


@settings(deadline=None, max_examples=150)
@given(
    st.one_of(
        st.text(max_size=60),
        st.sampled_from(
            ["rails", "signals.a", "stages.U1", "tolerance", "limits.x", "parts.P", "waivers", "rules"]
        ).flatmap(
            lambda name: st.lists(
                st.tuples(
                    st.sampled_from(["low", "high", "gain", "resistor", "off", "folders", "rule", "kind", "VCC", "x"]),
                    st.sampled_from(
                        ['"1 V"', "1", "-1e400", "[1]", '["a"]', "{}", "true", '"nonsense"', "2027-01-01", '""']
                    ),
                ),
                unique_by=lambda pair: pair[0],
                max_size=4,
            ).map(lambda pairs: "\n".join([f"[{name}]", *(f"{key} = {value}" for key, value in pairs)]))
        ),
    )
)
def test_reading_an_intent_raises_only_our_errors(text):
    intent = ours(lambda: parse_intent(text))
    if intent is not None:
        ours(lambda: load_catalogue((), intent.parts))


@settings(deadline=None)
@given(st.text(max_size=80))
def test_reading_toml_raises_only_our_errors(text):
    ours(lambda: parse_toml(text, "x.toml"))


@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"\0\0\0",
        b"\xff\xfe",
        b"\x1a",
        b"\xef\xbb\xbf",
        b"(" * 5000,
        b"R1 a b {" + b"(" * 3000,
        b"\n" * 1000,
        b"+ 1",
    ],
    ids=["empty", "nul", "half UTF-16", "end of file byte", "mark alone", "brackets", "deep", "blank", "continuation"],
)
def test_file_of_any_bytes_gives_a_review_or_a_reason(tmp_path, content):
    file = tmp_path / "odd.cir"
    file.write_bytes(content)
    (netlist,) = review(file).netlists
    assert all(problem.kind != "bug" for problem in netlist.error)


def test_folder_named_like_a_netlist_and_unreadable_file_are_told(tmp_path):
    (netlist,) = review(tmp_path / "gone.cir").netlists
    assert netlist.error[0].kind == "file-unreadable"
    assert netlist.sha256 == ""


def test_bug_is_one_line_with_its_place_in_our_code():
    try:
        review_text(None)
    except (AttributeError, TypeError) as trouble:
        problem = bug_problem(trouble, "board.cir")
    assert problem.what.startswith(("bug: AttributeError at ", "bug: TypeError at "))
    assert "report it with this file" in problem.what
    assert "\n" not in problem.what


def test_bug_in_one_netlist_leaves_the_others_alone(tmp_path, monkeypatch):
    import ampwarden.circuit as circuit

    for name in ("a", "b"):
        (tmp_path / f"{name}.cir").write_text(f"* {name}\nR1 x 0 1k\n.end\n")
    real = circuit.build_circuit

    def broken(netlist, *arguments, **options):
        if netlist.path.endswith("a.cir"):
            raise ZeroDivisionError("division by zero")
        return real(netlist, *arguments, **options)

    monkeypatch.setattr(circuit, "build_circuit", broken)
    first, second = review(tmp_path).netlists
    assert first.error[0].kind == "bug"
    assert "ZeroDivisionError" in first.error[0].what
    assert second.error == ()


def test_error_carries_every_problem_and_prints_them():
    with pytest.raises(NetlistError) as caught:
        parse_netlist("* t\nR1 a b 4..7k\nR2 a\n.end\n")
    assert len(caught.value.problems) == 2
    assert "4..7k" in str(caught.value)


def test_interrupt_is_neither_a_bug_nor_a_verdict():
    code = (
        "import sys\nfrom ampwarden.commands import main\n"
        "def stop(*a, **k): raise KeyboardInterrupt\n"
        "main.cli.main = stop\nsys.exit(main.run(['review', 'x']))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 130
    assert "Traceback" not in done.stderr
