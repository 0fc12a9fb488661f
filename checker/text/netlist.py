"""What the text room hands on: a netlist as its author wrote it, each line with its place.

Nothing is computed here: a value is a number or an :class:`Expression` that the circuit room evaluates in the scope
of its instance. Names keep their spelling; lookups fold the case.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TypeAlias

from ..errors import Location, Problem


@dataclass(frozen=True, slots=True)
class Expression:
    """Text of a parameter expression, without its braces or quotes."""

    text: str


Value: TypeAlias = float | Expression


@dataclass(frozen=True, slots=True)
class Waveform:
    """A transient function of a source: ``kind`` in capitals (SIN, PULSE, EXP, PWL, SFFM), values in their order."""

    kind: str
    values: tuple[Value, ...]


@dataclass(frozen=True, slots=True)
class Excitation:
    """What an independent source does: DC value, AC magnitude and phase (degrees), transient function."""

    dc: Value | None = None
    ac_magnitude: Value | None = None
    ac_phase: Value | None = None
    waveform: Waveform | None = None


@dataclass(frozen=True, slots=True)
class Control:
    """What steers an E, F, G, H or B element.

    ``form`` is ``linear`` (one gain), ``poly`` (``coefficients``), ``value`` (``expression``), ``table`` or
    ``laplace``. ``nets`` are controlling nets in pairs (E, G), ``sources`` the controlling voltage sources (F, H).
    For B elements ``output`` tells whether the expression gives a voltage (``V``) or a current (``I``).
    """

    form: str
    nets: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()
    gain: Value | None = None
    coefficients: tuple[Value, ...] = ()
    expression: Expression | None = None
    output: str | None = None


@dataclass(frozen=True, slots=True)
class ElementLine:
    """One element line.

    ``letter`` is the kind of element in capitals; ``nets`` are in the order of the line. ``model`` is the model,
    subcircuit or part name where the line gives one. ``params`` holds ``name=value`` pairs (names in lower case),
    ``marks`` what a board export writes behind a value (``DNP``, ``50V``, ``X7R``, ``1%``), ``coupled`` the inductors
    of a K line.
    """

    designator: str
    letter: str
    nets: tuple[str, ...]
    location: Location
    value: Value | None = None
    model: str | None = None
    params: Mapping[str, Value] = field(default_factory=dict)
    excitation: Excitation | None = None
    control: Control | None = None
    coupled: tuple[str, ...] = ()
    marks: tuple[str, ...] = ()
    value_text: str | None = None


@dataclass(frozen=True, slots=True)
class ModelLine:
    """One ``.model`` line: ``kind`` in capitals (D, NPN, NJF, NMOS, R, SW …), ``params`` with lower-case names."""

    name: str
    kind: str
    params: Mapping[str, Value]
    location: Location
    base: str | None = None


@dataclass(frozen=True, slots=True)
class FunctionLine:
    """One ``.func`` line."""

    name: str
    arguments: tuple[str, ...]
    body: Expression
    location: Location


@dataclass(slots=True)
class Scope:
    """What one level of a netlist defines; keys of the mappings are in lower case."""

    elements: list[ElementLine] = field(default_factory=list)
    models: dict[str, ModelLine] = field(default_factory=dict)
    subcircuits: dict[str, Subcircuit] = field(default_factory=dict)
    params: dict[str, Value] = field(default_factory=dict)
    functions: dict[str, FunctionLine] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Subcircuit:
    """One ``.subckt`` definition; ``remarks`` are the comment lines that stand directly before and after its head."""

    name: str
    ports: tuple[str, ...]
    params: Mapping[str, Value]
    scope: Scope
    location: Location
    remarks: tuple[str, ...] = ()


@dataclass(slots=True)
class Netlist:
    """A netlist as read.

    ``sha256`` is that of the file's bytes; ``files`` names every file that was read (the netlist first) with its
    sha256; ``problems`` holds the warnings met (errors raise). ``style`` is ``simulation`` or ``board``: a board
    export has no sources and no analysis lines.
    """

    path: str
    title: str
    sha256: str
    scope: Scope
    globals: frozenset[str] = frozenset()
    files: tuple[tuple[str, str], ...] = ()
    problems: tuple[Problem, ...] = ()
    style: str = "simulation"
