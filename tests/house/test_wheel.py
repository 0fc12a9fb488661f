"""A wheel holds everything, and installed into an empty environment it reviews a file away from the repository."""

import json
import os
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]

BOARD = """\
* inverting stage, both rails without a capacitor
V1 VCC 0 12
V2 VEE 0 -12
VIN in 0 SIN(0 0.5 1k)
R1 in n1 10k
R2 n1 out 47k
XU1 0 n1 VCC VEE out TL082
.subckt TL082 inp inn vcc vee out
E1 out 0 inp inn 100k
.ends
.end
"""

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module")
def wheel(tmp_path_factory):
    """Build the wheel from a copy of the sources, so that no build folder is left in the repository."""
    copy = tmp_path_factory.mktemp("source")
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        if (ROOT / name).exists():
            shutil.copy(ROOT / name, copy)
    for name in ("checker", "rules", "grammar"):
        shutil.copytree(ROOT / name, copy / name, ignore=shutil.ignore_patterns("__pycache__"))
    out = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", out, copy]
    done = subprocess.run(command, capture_output=True, text=True)
    assert done.returncode == 0, done.stdout[-3000:] + done.stderr[-3000:]
    return next(out.glob("*.whl"))


@pytest.fixture(scope="module")
def installed(wheel, tmp_path_factory):
    """Install the wheel with its dependencies into an environment that holds nothing else."""
    place = tmp_path_factory.mktemp("empty")
    subprocess.run([sys.executable, "-m", "venv", place], check=True, capture_output=True)
    python = place / ("Scripts" if os.name == "nt" else "bin") / "python"
    command = [python, "-m", "pip", "install", "--quiet", "--disable-pip-version-check", wheel]
    done = subprocess.run(command, capture_output=True, text=True)
    if done.returncode:
        reasons = ("No matching distribution", "Connection", "Temporary failure", "timed out", "Network")
        if any(reason in done.stderr for reason in reasons):
            pytest.skip("dependencies cannot be fetched here: no package index")
        pytest.fail(done.stderr[-3000:])
    return python


def run(python, *arguments, cwd):
    quiet = {key: value for key, value in os.environ.items() if not key.startswith(("PYTHON", "AMPWARDEN"))}
    quiet["PYTHONUTF8"] = "1"
    return subprocess.run([python, *arguments], cwd=cwd, env=quiet, capture_output=True, text=True)


def test_wheel_holds_every_module_and_every_piece_of_knowledge(wheel):
    with zipfile.ZipFile(wheel) as archive:
        packed = set(archive.namelist())
    expected = set()
    for folder, package in (("checker", "ampwarden"), ("rules", "ampwarden/rules"), ("grammar", "ampwarden/grammar")):
        for file in (ROOT / folder).rglob("*"):
            if file.suffix in {".py", ".toml", ".lark", ".json", ".html", ".css", ".js"} or file.name == "py.typed":
                expected.add(f"{package}/{file.relative_to(ROOT / folder).as_posix()}")
    assert expected - packed == set()
    assert "ampwarden/py.typed" in packed
    assert any(name.endswith("licenses/LICENSE") for name in packed)


def test_wheel_holds_no_tests_and_no_samples(wheel):
    with zipfile.ZipFile(wheel) as archive:
        assert not [name for name in archive.namelist() if name.startswith(("tests", "samples", "checker"))]


def test_installed_command_reviews_a_file_away_from_the_repository(installed, tmp_path):
    (tmp_path / "board.cir").write_text(BOARD)
    done = run(installed, "-m", "ampwarden", "review", "board.cir", "--format", "json", cwd=tmp_path)
    assert done.returncode == 1, done.stderr
    netlist = json.loads(done.stdout)["netlists"][0]
    assert [stage["topology"] for stage in netlist["stages"]] == ["inverting-amplifier"]
    # common practice, no source: 10 k and 47 k make an inverting gain of -4.7
    assert netlist["stages"][0]["measures"]["dc_gain"] == pytest.approx(-4.7, rel=1e-2)
    assert "supply-decoupling-missing" in {finding["rule"] for finding in netlist["findings"]}


def test_installed_package_answers_python(installed, tmp_path):
    (tmp_path / "board.cir").write_text(BOARD)
    code = "import ampwarden; r = ampwarden.review('board.cir'); print(len(r.netlists), len(r.findings) > 0)"
    done = run(installed, "-c", code, cwd=tmp_path)
    assert done.stdout.split() == ["1", "True"], done.stderr
    assert not Path(tmp_path / "ampwarden").exists()
