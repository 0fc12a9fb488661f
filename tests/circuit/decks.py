"""Boards in trade words: pieces of netlist text, and the circuit that they make.

Every piece is a list of lines; :func:`deck` joins pieces into a simulation deck, :func:`board` into a schematic export.
"""

from __future__ import annotations

from collections.abc import Iterable

from ampwarden.circuit import Circuit, build_circuit
from ampwarden.text import parse_intent, parse_netlist

IDEAL = [".subckt OA p m o A=1e6", "E1 o 0 p m {A}", ".ends OA"]
POWERED = [".subckt OPAMP inp inn vcc vee out", "E1 out 0 inp inn 1e5", ".ends OPAMP"]


def deck(*pieces: str | Iterable[str], title: str = "a deck") -> str:
    """Join lines and pieces into a simulation deck."""
    lines = [title]
    for piece in pieces:
        lines += [piece] if isinstance(piece, str) else list(piece)
    return "\n".join([*lines, ".end", ""])


def board(*lines: str, title: str = "a board") -> str:
    """Join lines into the netlist that a schematic exporter writes."""
    return "\n".join([title, *lines, ""])


def dual_supply(volts: float = 15.0, plus: str = "vcc", minus: str = "vee") -> list[str]:
    """Two DC sources against ground."""
    return [f"VPOS {plus} 0 {volts:g}", f"VNEG {minus} 0 {-volts:g}"]


def signal(net: str = "in", low: float = -0.5, high: float = 0.5, hertz: float = 1000.0) -> str:
    """A sine between two extremes."""
    return f"VSIG {net} 0 SIN({(low + high) / 2:g} {(high - low) / 2:g} {hertz:g})"


def inverting_stage(
    number: int = 1, source: str = "in", output: str = "out", r_in: str = "10k", r_feedback: str = "47k"
) -> list[str]:
    """Inverting amplifier around an ideal amplifier; needs :data:`IDEAL`."""
    node = f"n{number}"
    return [
        f"R{number}1 {source} {node} {r_in}",
        f"R{number}2 {node} {output} {r_feedback}",
        f"X{number} 0 {node} {output} OA",
    ]


def non_inverting_stage(
    number: int = 1, source: str = "in", output: str = "out", r_ground: str = "10k", r_feedback: str = "47k"
) -> list[str]:
    """Non-inverting amplifier around an ideal amplifier; needs :data:`IDEAL`."""
    node = f"n{number}"
    return [
        f"R{number}1 {node} 0 {r_ground}",
        f"R{number}2 {node} {output} {r_feedback}",
        f"X{number} {source} {node} {output} OA",
    ]


def follower_stage(number: int = 1, source: str = "in", output: str = "out") -> list[str]:
    """Follower around an ideal amplifier; needs :data:`IDEAL`."""
    return [f"X{number} {source} {output} {output} OA"]


def circuit_of(text: str, intent: str = "", *, style: str | None = None) -> Circuit:
    """Build the circuit of a netlist text, with the text of an intent file if need be."""
    declared = parse_intent(intent, "review.toml") if intent else None
    return build_circuit(parse_netlist(text, name="test.cir", style=style), declared)


def amplifier(circuit: Circuit, name: str):
    """Return an amplifier by name; fails when there is none."""
    found = circuit.amplifier(name)
    assert found is not None, f"no amplifier {name}; there are {[each.name for each in circuit.amplifiers]}"
    return found
