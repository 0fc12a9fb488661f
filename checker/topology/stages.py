"""What the topology room hands on: stages with their roles, and why they were recognized."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from ..errors import Location


@dataclass(frozen=True, slots=True)
class Branch:
    """Two-terminal parts between two nets that act as one: series chains and parallel groups reduced.

    ``parts`` are the designators in order of the netlist. ``elements`` is the reduced structure as a nested tuple:
    ``("R", "R3")`` leaf (letter, designator), ``("series", a, b…)`` or ``("parallel", a, b…)``.
    ``resistance_ohm`` is the DC resistance (``inf`` through a capacitor, None when it holds a junction or an unknown
    value); ``letters`` the set of element letters (``R C L D V I``), e.g. ``frozenset("RC")``.
    """

    ends: tuple[str, str]
    parts: tuple[str, ...]
    elements: tuple[object, ...]
    resistance_ohm: float | None
    letters: frozenset[str]


@dataclass(frozen=True, slots=True)
class Stage:
    """One recognized stage.

    ``name`` is that of its first amplifier (or its first active part). ``inputs`` are the nets that signals enter by,
    the stage's first input first; for a difference stage the first is the one with positive gain. ``references`` are
    stiff nets that act as offset inputs. ``roles`` maps a template's role names to designators; ``branches`` maps the
    same names to the reduced branches. ``properties`` are facts beside the name: ``ac_coupled``, ``input_filter``,
    ``t_network``, ``isolation_resistor``, ``level_shift``, ``load`` … with the designators that show them.
    ``formulas`` are those of the template by measure, ``values`` what they read (see ``recognize.role_values``).
    ``reason`` says why nothing fits when the topology is ``unrecognized``.
    """

    name: str
    topology: str
    amplifiers: tuple[str, ...]
    inputs: tuple[str, ...]
    output: str | None
    location: Location
    references: tuple[str, ...] = ()
    roles: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    branches: Mapping[str, tuple[Branch, ...]] = field(default_factory=dict)
    properties: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    inner_nets: Mapping[str, str] = field(default_factory=dict)
    evidence: tuple[str, ...] = ()
    formulas: Mapping[str, str] = field(default_factory=dict)
    values: Mapping[str, float] = field(default_factory=dict)
    reason: str | None = None
