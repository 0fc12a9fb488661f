"""Benches for tests: a netlist text in, figures out."""

from __future__ import annotations

from typing import Any

from ampwarden.analysis import Bench, Known, Unknown
from ampwarden.circuit import build_circuit
from ampwarden.text import parse_intent, parse_netlist
from ampwarden.topology import find_stages

IDEAL = ".subckt OA p m o A=1e9\nE1 o 0 p m {A}\n.ends OA\n"
POWERED = ".subckt OPX inp inn vcc vee out\nE1 out 0 inp inn 1e6\n.ends OPX\n"
RAILS = "VP vcc 0 12\nVN vee 0 -12\nCP vcc 0 100n\nCN vee 0 100n\n"


def bench_of(netlist: str, intent: str = "") -> Bench:
    """Return the bench of a netlist without title line; ideal amplifiers OA and powered ones OPX are at hand."""
    declared = parse_intent(intent, "review.toml")
    circuit = build_circuit(parse_netlist(f"a test\n{IDEAL}{POWERED}{netlist}\n.end\n", name="test.cir"), declared)
    return Bench(circuit, find_stages(circuit), declared)


def figure(bench: Bench, name: str, stage: str = "X1") -> Any:
    """Return the value of a stage's figure; fails with the reason when it is not known."""
    found = bench.figure(name, bench.subject_of_stage(stage))
    assert isinstance(found, Known), f"{name} of {stage}: {found}"
    return found.value


def reason(bench: Bench, name: str, stage: str = "X1") -> str:
    """Return why a figure of a stage is not known; fails when it is."""
    found = bench.figure(name, bench.subject_of_stage(stage))
    assert isinstance(found, Unknown), f"{name} of {stage} is {found}"
    return found.reason
