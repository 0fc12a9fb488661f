"""The shape of the house: layers, sizes, names of modules, what lies at the top."""

import ast
import os
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
MODULES = sorted((ROOT / "checker").rglob("*.py"))
VISIBLE = {
    "README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", "checker", "rules", "grammar", "tests", "samples",
}  # fmt: skip
VAGUE = {"utils", "util", "helpers", "helper", "common", "misc", "base", "manager", "core", "stuff"}


def tracked():
    """Names at the top of what git tracks, or of the folder where there is no git."""
    try:
        done = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True)
    except (OSError, subprocess.CalledProcessError):
        pytest.skip("no git here: the tracked files cannot be listed")
    return {line.split("/")[0] for line in done.stdout.splitlines()}


def test_nothing_else_lies_at_the_top():
    assert {name for name in tracked() if not name.startswith(".")} <= VISIBLE


def test_imports_point_backwards_only():
    tool = Path(sys.executable).with_name("lint-imports")
    if not tool.exists():
        pytest.skip("import-linter is not installed beside this interpreter")
    done = subprocess.run([tool, "--no-cache"], cwd=ROOT, capture_output=True, text=True)
    assert done.returncode == 0, done.stdout


@pytest.mark.parametrize("module", MODULES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_module_is_of_a_size_to_be_read_in_one_sitting(module):
    assert len(module.read_text(encoding="utf-8").splitlines()) <= 600


def test_no_module_has_a_vague_name_or_one_of_the_standard_library():
    names = {module.stem for module in MODULES} - {"__init__", "__main__"}
    assert not names & VAGUE
    # A room's own module is always imported relatively; only a twin of a name that we import ourselves would confuse.
    assert not names & {"json", "csv", "html", "xml", "types", "logging", "typing"}


@pytest.mark.parametrize("module", MODULES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_module_tells_what_it_does(module):
    tree = ast.parse(module.read_text(encoding="utf-8"))
    assert ast.get_docstring(tree), "a module opens with what it does"


def test_package_imports_itself_relatively():
    pattern = re.compile(r"^\s*(?:from|import) ampwarden\b", re.MULTILINE)
    assert [module.name for module in MODULES if pattern.search(module.read_text(encoding="utf-8"))] == []


def test_every_room_is_declared_as_a_package():
    settings = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["tool"]["setuptools"]
    rooms = {
        ".".join(("ampwarden", *place.parent.relative_to(ROOT / "checker").parts))
        for place in (ROOT / "checker").rglob("__init__.py")
    }
    assert set(settings["packages"]) == rooms | {"ampwarden.rules", "ampwarden.grammar"}


def test_ci_runs_the_test_command_of_the_readme():
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    assert "python -m pytest -q -n 2" in readme
    assert 'python" -m pytest -q -n 2' in (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert os.access(ROOT / ".ci" / "run", os.X_OK)
