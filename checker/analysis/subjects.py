"""What can be measured and judged: subjects, and how they are listed from a circuit and its stages."""

from __future__ import annotations

from dataclasses import dataclass

from ..errors import Location

SUBJECT_KINDS = (
    "netlist",
    "rail",
    "net",
    "part",
    "package",
    "amplifier",
    "supply net",
    "supply pin",
    "input pin",
    "stage",
)


CURRENT_INPUT = frozenset(("transimpedance-amplifier",))
"""Topologies whose input is a current: nothing holds their input net."""


@dataclass(frozen=True, slots=True)
class Subject:
    """One thing that a rule is asked of.

    ``name`` is unique within its kind and is what the reader sees (``U1A``, ``IN+ of U1A``, ``VCC``). ``item`` is the
    thing itself (Part, Amplifier, Stage, Rail, net name…). ``parts``, ``nets``, ``stage`` say what a finding about it
    points at.
    """

    kind: str
    name: str
    item: object
    parts: tuple[str, ...]
    nets: tuple[str, ...]
    stage: str | None
    location: Location
