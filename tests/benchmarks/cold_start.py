"""Print how long whole processes of the command take, as ratios to a bare interpreter.

Run it with ``python tests/benchmarks/cold_start.py``. Each case runs in turn with ``python -c pass`` of the same
environment, so that a slow hour of the machine touches both; the median of the pairwise ratios is shown. Compile the
bytecode first (an ordinary install does).
"""

from __future__ import annotations

import argparse
import os
import pty
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path


def deck(stages: int) -> str:
    """Return a chain of inverting stages with bypassed rails: about six parts a stage."""
    rows = ["* chain of inverting stages", "V1 VCC 0 12", "V2 VEE 0 -12", "VIN n0 0 SIN(0 0.01 1k)"]
    for index in range(stages):
        rows += [
            f"R{index}A n{index} s{index} 10k",
            f"R{index}B s{index} n{index + 1} {10 + index}k",
            f"C{index}F s{index} n{index + 1} 10p",
            f"C{index}P VCC 0 100n",
            f"C{index}N VEE 0 100n",
            f"XU{index} 0 s{index} VCC VEE n{index + 1} OPAMP",
        ]
    rows += [".subckt OPAMP inp inn vcc vee out", "E1 out 0 inp inn 100k", ".ends", ".end"]
    return "\n".join(rows) + "\n"


def seconds(command: list[str], folder: str, *, terminal: bool = False) -> float:
    """Return the wall time of one whole process, its output thrown away."""
    if not terminal:
        start = time.perf_counter()
        subprocess.run(command, cwd=folder, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, check=False)
        return time.perf_counter() - start
    near, far = pty.openpty()
    start = time.perf_counter()
    with subprocess.Popen(command, cwd=folder, stdout=far, stderr=subprocess.DEVNULL) as process:
        os.close(far)
        try:
            while os.read(near, 65536):
                pass
        except OSError:
            pass
        process.wait()
    taken = time.perf_counter() - start
    os.close(near)
    return taken


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--pairs", type=int, default=11, help="counted pairs a case")
    pairs = parser.parse_args().pairs
    bare = [sys.executable, "-c", "pass"]
    tool = str(Path(sys.executable).with_name("ampwarden"))
    cases = [
        ("--version", [tool, "--version"], False, "3.5 / 5"),
        ("--help", [tool, "--help"], False, "3.5 / 5"),
        ("rules", [tool, "rules"], False, ""),
        ("parts", [tool, "parts"], False, ""),
        ("review, 60 parts, to a pipe", [tool, "review", "board.cir"], False, "20 / 32"),
        ("review, 60 parts, JSON", [tool, "review", "board.cir", "--format", "json"], False, ""),
        ("review, 60 parts, on a terminal", [tool, "review", "board.cir"], True, "25 / 38"),
    ]
    with tempfile.TemporaryDirectory() as folder:
        (Path(folder) / "board.cir").write_text(deck(10))
        print(f"{'whole process':<34} {'x bare':>7}   {'from .. to':<14} stretch / commit")
        for name, command, terminal, target in cases:
            seconds(command, folder, terminal=terminal)
            ratios = []
            for _ in range(pairs):
                floor = seconds(bare, folder)
                ratios.append(seconds(command, folder, terminal=terminal) / floor)
            spread = f"{min(ratios):.1f} .. {max(ratios):.1f}"
            print(f"{name:<34} {statistics.median(ratios):>7.1f}   {spread:<14} {target}")


if __name__ == "__main__":
    main()
