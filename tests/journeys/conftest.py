"""The real command in a process of its own, with its streams apart."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

SAMPLES = Path(__file__).parents[2] / "samples"

GOOD = """\
* follower with both rails bypassed
V1 VCC 0 5
V2 VEE 0 -5
VIN in 0 SIN(0 1 1k)
RIN in 0 100k
XU1 in out VCC VEE out OPAMP
RL out 0 10k
C1 VCC 0 100n
C2 VEE 0 100n
.subckt OPAMP inp inn vcc vee out
E1 out 0 inp inn 100k
.ends
.end
"""
BAD = GOOD.replace("C1 VCC 0 100n\n", "").replace("bypassed", "named, one bypassed")
TORN = """\
* two lines that nobody can read
R1 in out 4..7k
R2 in
.end
"""


@pytest.fixture
def boards(tmp_path):
    """A folder with one good, one bad and one unreadable netlist, each in a folder of its own."""
    for name, text in (("good", GOOD), ("bad", BAD), ("torn", TORN)):
        folder = tmp_path / name
        folder.mkdir()
        (folder / f"{name}.cir").write_text(text)
    return tmp_path


@pytest.fixture
def ampwarden(tmp_path):
    """Return a function that runs the command in the test's folder."""

    def run(*arguments, cwd=tmp_path, **variables):
        kept = {key: value for key, value in os.environ.items() if key not in {"NO_COLOR", "COLUMNS"}}
        environment = kept | {"PYTHONUTF8": "1"} | variables
        command = [sys.executable, "-m", "ampwarden", *map(str, arguments)]
        return subprocess.run(
            command,
            cwd=cwd,
            env=environment,
            capture_output=True,
            text=True,
            encoding="utf-8",
            stdin=subprocess.DEVNULL,
        )

    return run
