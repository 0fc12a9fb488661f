"""What a call loads, counted without a clock: the cold start is made of imports."""

import json
import subprocess
import sys

import pytest

# Libraries that a review of a small deck to a pipe must not load: each has its own feature.
BARRED = {"scipy", "sqlalchemy", "jinja2", "schemdraw", "matplotlib", "dask", "rich"}

BOARD = """\
* follower
V1 VCC 0 5
V2 VEE 0 -5
VIN in 0 SIN(0 1 1k)
XU1 in out VCC VEE out OPAMP
C1 VCC 0 100n
C2 VEE 0 100n
.subckt OPAMP inp inn vcc vee out
E1 out 0 inp inn 100k
.ends
.end
"""


def modules_after(*arguments, cwd):
    """Run the command in a fresh interpreter and return the modules it holds at the end."""
    code = (
        "import sys, json\n"
        "from ampwarden.commands.main import run\n"
        f"run({list(arguments)!r})\n"
        "sys.stdout.flush()\n"
        "print(json.dumps(sorted(sys.modules)), file=sys.stderr)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=cwd, capture_output=True, text=True, check=True)
    return set(json.loads(done.stderr.splitlines()[-1]))


def packages(modules):
    return {name.split(".")[0] for name in modules}


@pytest.mark.parametrize("option", ["--version", "--help"])
def test_version_and_help_load_click_and_no_room(option, tmp_path):
    own = {name for name in modules_after(option, cwd=tmp_path) if name.startswith("ampwarden.")}
    assert own <= {
        "ampwarden.version",
        "ampwarden.errors",
        "ampwarden.commands",
        "ampwarden.commands.main",
        "ampwarden.commands.streams",
    }


@pytest.mark.parametrize("arguments", [("--version",), ("--help",), ("review", "--help"), ("stages", "--help")])
def test_help_loads_no_heavy_library(arguments, tmp_path):
    heavy = BARRED | {"numpy", "networkx", "lark", "pydantic"}
    assert not packages(modules_after(*arguments, cwd=tmp_path)) & heavy


@pytest.mark.parametrize("form", ["text", "json", "sarif", "csv", "junit"])
def test_review_of_a_small_deck_to_a_pipe_loads_no_library_of_another_feature(form, tmp_path):
    (tmp_path / "board.cir").write_text(BOARD)
    assert not packages(modules_after("review", "board.cir", "--format", form, cwd=tmp_path)) & BARRED


@pytest.mark.parametrize("command", ["rules", "parts"])
def test_listing_knowledge_loads_no_numerics_and_no_graph(command, tmp_path):
    assert not packages(modules_after(command, cwd=tmp_path)) & (BARRED | {"numpy", "networkx"})
