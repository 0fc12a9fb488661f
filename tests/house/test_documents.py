"""The documents are true: what they print is what the tool prints, what they show can be used.

``AMPWARDEN_REWRITE=1`` writes the present output into the console blocks; read the difference before it is committed.
"""

import doctest
import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from ampwarden.text import parse_intent

ROOT = Path(__file__).parents[2]
DOCUMENTS = ("README.md", "DEVELOPERS.md")
BLOCK = re.compile(r"^```(\w+)\n(.*?)^```$", re.MULTILINE | re.DOTALL)


def blocks(language):
    """Return (document, number within it, text) of every fenced block of a language."""
    found = []
    for name in DOCUMENTS:
        document = ROOT / name
        text = document.read_text(encoding="utf-8") if document.exists() else ""
        found += [(name, index, match[2]) for index, match in enumerate(BLOCK.finditer(text)) if match[1] == language]
    return found


def named(block):
    return f"{block[0]}-{block[1]}"


@pytest.fixture(scope="module")
def desk(tmp_path_factory):
    """A folder with a copy of the samples, as a reader of the documents has it."""
    place = tmp_path_factory.mktemp("desk")
    shutil.copytree(ROOT / "samples", place / "samples")
    return place


def run(command, desk):
    path = f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}"
    environment = os.environ | {"PATH": path, "COLUMNS": "80", "PYTHONUTF8": "1", "NO_COLOR": "1"}
    done = subprocess.run(
        ["bash", "-c", command], cwd=desk, env=environment, capture_output=True, text=True, encoding="utf-8"
    )
    return done.stdout + done.stderr


@pytest.mark.parametrize("block", blocks("console"), ids=named)
def test_printed_output_is_what_the_command_prints(block, desk):
    document, index, text = block
    parts = re.split(r"^\$ (.*)\n", text, flags=re.MULTILINE)[1:]
    expected = list(zip(parts[::2], parts[1::2], strict=True))
    assert expected, "a console block holds at least one command"
    now = [(command, run(command, desk)) for command, _ in expected]
    if os.environ.get("AMPWARDEN_REWRITE"):
        rewrite(document, index, "".join(f"$ {command}\n{output}" for command, output in now))
        return
    for (command, shown), (_, output) in zip(expected, now, strict=True):
        assert shown == output, command


def rewrite(document, index, text):
    file = ROOT / document
    whole = file.read_text(encoding="utf-8")
    match = list(BLOCK.finditer(whole))[index]
    file.write_text(whole[: match.start(2)] + text + whole[match.end(2) :], encoding="utf-8")


@pytest.mark.parametrize("block", blocks("pycon"), ids=named)
def test_python_examples_answer_as_printed(block, desk, monkeypatch):
    monkeypatch.chdir(desk)
    test = doctest.DocTestParser().get_doctest(block[2], {}, named(block), block[0], 0)
    result = doctest.DocTestRunner().run(test)
    assert (result.failed, result.attempted > 0) == (0, True)


def test_intent_of_the_readme_can_be_read():
    (text,) = [text for document, _, text in blocks("toml") if document == "README.md"]
    intent = parse_intent(text)
    assert intent.rails == {"VCC": 12.0}
    assert intent.limit("output-near-rail", "headroom") == "0.5 V"


def test_job_is_told_in_one_paragraph_before_the_commands():
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    head = readme.split("```sh", 1)[0].strip().split("\n\n")
    assert head[0] == "# ampwarden"
    assert "reviews analog schematics" in head[1]
    assert len(head) == 3


def test_readme_carries_the_cautions():
    readme = " ".join((ROOT / "README.md").read_text(encoding="utf-8").split())
    for words in ("licensed engineer", "simulation", "measurement", "mains", "medical", "hazardous", "local codes"):
        assert words in readme


@pytest.mark.slow
def test_first_command_of_the_readme_reviews_the_samples_on_a_fresh_machine(tmp_path):
    (first, _) = [text for document, _, text in blocks("sh") if document == "README.md"]
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(ROOT / name, tmp_path)
    for name in ("checker", "rules", "grammar", "samples"):
        shutil.copytree(ROOT / name, tmp_path / name, ignore=shutil.ignore_patterns("__pycache__"))
    environment = {key: value for key, value in os.environ.items() if not key.startswith("AMPWARDEN")}
    done = subprocess.run(
        ["bash", "-c", first], cwd=tmp_path, env=environment | {"PYTHONUTF8": "1"}, capture_output=True, text=True
    )
    if "No matching distribution" in done.stderr:
        pytest.skip("dependencies cannot be fetched here: no package index")
    assert done.returncode in {0, 1}, done.stderr
    assert done.stdout.splitlines()[-1].startswith("verdict")


def test_first_rule_of_the_contributor_guide_loads_and_its_examples_hold(tmp_path):
    text = next(text for document, _, text in blocks("toml") if document == "DEVELOPERS.md")
    place = tmp_path / "house-rules" / "checks" / "gain"
    place.mkdir(parents=True)
    (place / "house-gain-high.toml").write_text(text, encoding="utf-8")
    done = run("ampwarden rules --check house-rules", tmp_path)
    assert done == "1 rule, 2 examples, 0 not as expected\n"
