"""Modified nodal equations of a circuit: which unknowns there are, and what each part contributes.

Unknowns are the net voltages against ground, then the currents of branches that need one (voltage sources, inductors,
controlled voltage sources, amplifier outputs). Part kinds write their entries through one function each
(:mod:`.stamps`); nonlinear parts are listed and linearized by the operating point.

symbol  meaning
G       conductances and gains at DC, real
C       capacitances and inductances: the matrix at angular frequency w is G + jwC
b       independent sources
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Protocol

from ..circuit.parts import Amplifier, Part, PartKind
from .limits import OutputLimits

GMIN_S = 1e-12  # conductance across junctions and from floating nets to ground, S

SHORT_S = 1e6  # conductance of a link or of a capacitor taken as short, S


@dataclass(slots=True)
class Entries:
    """A sparse matrix being written: rows, columns, values (repeated places add up)."""

    rows: list[int] = field(default_factory=list)
    columns: list[int] = field(default_factory=list)
    values: list[float] = field(default_factory=list)

    def add(self, row: int, column: int, value: float) -> None:
        """Add to one place; ground (index -1) is left out."""
        if row >= 0 and column >= 0 and value != 0.0:
            self.rows.append(row)
            self.columns.append(column)
            self.values.append(value)

    def conductance(self, one: int, two: int, value: float) -> None:
        """Add a conductance between two nets."""
        self.add(one, one, value)
        self.add(two, two, value)
        self.add(one, two, -value)
        self.add(two, one, -value)

    def extended(self, other: Entries) -> Entries:
        """Return these entries followed by those of another matrix."""
        return Entries(self.rows + other.rows, self.columns + other.columns, self.values + other.values)


@dataclass(frozen=True, slots=True)
class AmplifierRow:
    """Where an amplifier's equation stands.

    ``row`` is its branch; -1 when its linear body stands in the matrix and nothing limits it. ``has_body`` tells that
    the body is written and the branch only holds the output when it is limited. ``reference`` is the net that a
    one-chip amplifier adds to its output, -1 for ground.
    """

    amplifier: Amplifier
    row: int
    plus: int
    minus: int
    output: int
    limits: OutputLimits | None
    has_body: bool = False
    reference: int = -1
    fixed_gain: float | None = None

    @property
    def is_packaged(self) -> bool:
        """True for one-chip instrumentation and difference amplifiers and buffers, whose gain is set inside."""
        return self.amplifier.kind in PACKAGED


PACKAGED = ("instrumentation amplifier", "difference amplifier", "buffer")


@dataclass(slots=True)
class System:
    """The equations of one circuit.

    ``unknowns`` names each row: nets first, then ``I(name)`` of the branches. ``floating`` lists nets without a DC
    path to ground; a conductance of 1e-12 S holds them so that the rest can be solved. ``drivers`` gives the branch
    that holds a net, ``between`` that of a source between two nets, by either. ``left_out`` are parts that could not
    be written, with the reason.
    """

    circuit: Board
    unknowns: list[str]
    net_index: dict[str, int]
    branch_index: dict[str, int]
    conductances: Entries
    storages: Entries
    sources: list[float]
    amplifiers: list[AmplifierRow]
    nonlinear: list[Part]
    capacitors: dict[str, tuple[int, int]]
    drivers: dict[str, int]
    floating: tuple[str, ...]
    between: dict[str, int] = field(default_factory=dict)
    left_out: dict[str, str] = field(default_factory=dict)

    @property
    def size(self) -> int:
        """Number of unknowns."""
        return len(self.unknowns)

    def mover(self, net: str) -> int:
        """Return the row by which a net can be moved: the branch that holds it, else its own."""
        held = self.drivers.get(net, self.between.get(net))
        return self.index(net) if held is None else held

    def index(self, net: str | None) -> int:
        """Return the row of a net; -1 for ground and for nets that are not in the system."""
        return -1 if net is None else self.net_index.get(net, -1)


class Board(Protocol):
    """What equations are written for: a circuit, or a region of one."""

    @property
    def nets(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def parts(self) -> Mapping[str, Part]: ...  # noqa: D102
    @property
    def amplifiers(self) -> tuple[Amplifier, ...]: ...  # noqa: D102
    @property
    def ground(self) -> str | None: ...  # noqa: D102
    def net(self, name: str) -> str | None: ...  # noqa: D102
    def parts_on(self, net: str) -> tuple[Part, ...]: ...  # noqa: D102


def build_system(
    circuit: Board, limits: Mapping[str, OutputLimits | None], forced_v: Mapping[str, float] | None = None
) -> System:
    """Write the equations of a circuit.

    Parameters
    ----------
    circuit
        The circuit.
    limits
        Output limits by amplifier name, None where they are not known.
    forced_v
        Nets that a declared signal, a declared rail or a rail of a part drives and no source of the netlist does, with
        their voltage (V); each gets an ideal source named ``net:NET``.
    """
    from .stamps import stamp_part

    with_body = {each.name: each for each in circuit.amplifiers if _uses_body(each, limits.get(each.name))}
    nets = [net for net in circuit.nets if net != circuit.ground]
    known = {*nets, circuit.ground}
    inner_parts = [part for each in with_body.values() for part in each.inner]
    for net in _further_nets(circuit, inner_parts):
        if net not in known:
            known.add(net)
            nets.append(net)
    system = System(
        circuit=circuit,
        unknowns=list(nets),
        net_index={net: index for index, net in enumerate(nets)},
        branch_index={},
        conductances=Entries(),
        storages=Entries(),
        sources=[0.0] * len(nets),
        amplifiers=[],
        nonlinear=[],
        capacitors={},
        drivers={},
        floating=(),
    )
    bare = {each.designator for each in circuit.amplifiers if not each.inner}
    parts: Iterable[Part] = [*circuit.parts.values(), *inner_parts]
    later = []
    for part in parts:
        if not part.is_fitted or (part.kind in _BARE_KINDS and part.designator in bare):
            continue
        if part.kind in (PartKind.CCCS, PartKind.CCVS):
            later.append(part)  # they read the branch of another source
        elif (reason := stamp_part(system, part)) is not None:
            system.left_out[part.designator] = reason
    for part in later:
        if (reason := stamp_part(system, part)) is not None:
            system.left_out[part.designator] = reason
    for amplifier in circuit.amplifiers:
        _stamp_amplifier(system, amplifier, limits.get(amplifier.name), amplifier.name in with_body)
    forced = {net: volts for net, volts in (forced_v or {}).items() if net in system.net_index}
    for net, volts in forced.items():
        row = add_source(system, f"net:{net}", system.net_index[net], -1, volts)
        system.drivers.setdefault(net, row)
    system.floating = _hold_floating(system, [*parts, *later], forced)
    return system


def _further_nets(circuit: Board, inner_parts: Iterable[Part]) -> Iterator[str]:
    """Yield nets that no pin of the circuit meets: inside of bodies, or only read by a controlled source."""
    for part in inner_parts:
        yield from part.nets
        if part.kind in _NET_CONTROLLED:
            yield from part.control
    for part in circuit.parts.values():
        if part.kind in _NET_CONTROLLED:
            yield from part.control
    for amplifier in circuit.amplifiers:
        yield from (amplifier.plus, amplifier.minus, amplifier.output)


_NET_CONTROLLED = (PartKind.VCVS, PartKind.VCCS)
_BARE_KINDS = (PartKind.VCVS, PartKind.BEHAVIOURAL)


def _uses_body(amplifier: Amplifier, limits: OutputLimits | None) -> bool:
    """True when the linear body stands in the equations: it says more than a gain, or nothing limits the output."""
    if not amplifier.inner:
        return False
    if limits is None:
        return True
    kinds = {part.kind for part in amplifier.inner}
    return PartKind.CAPACITOR in kinds or PartKind.INDUCTOR in kinds or not _drives_straight(amplifier)


def _drives_straight(amplifier: Amplifier) -> bool:
    sources = (PartKind.VCVS, PartKind.CCVS, PartKind.VOLTAGE_SOURCE)
    return any(part.kind in sources and amplifier.output in part.nets for part in amplifier.inner)


def add_branch(system: System, name: str) -> int:
    """Add a branch current and return its row."""
    row = len(system.unknowns)
    system.unknowns.append(f"I({name})")
    system.branch_index[name] = row
    system.sources.append(0.0)
    return row


def add_source(system: System, name: str, plus: int, minus: int, volts: float) -> int:
    """Add an ideal voltage source and return its row."""
    row = add_branch(system, name)
    for net, sign in ((plus, 1.0), (minus, -1.0)):
        system.conductances.add(net, row, sign)
        system.conductances.add(row, net, sign)
    system.sources[row] = volts
    return row


def _stamp_amplifier(system: System, amplifier: Amplifier, limits: OutputLimits | None, has_body: bool) -> None:
    plus, minus = system.index(amplifier.plus), system.index(amplifier.minus)
    output = system.index(amplifier.output)
    row = -1
    if has_body:
        for part in amplifier.inner:
            if part.kind is PartKind.VCVS and amplifier.output in part.nets[:2]:
                system.drivers[amplifier.output] = system.branch_index[part.designator]
        if limits is not None and not _drives_straight(amplifier):
            row = add_branch(system, amplifier.name)
            system.conductances.add(output, row, -1.0)
    else:
        row = add_branch(system, amplifier.name)
        system.conductances.add(output, row, -1.0)
        system.drivers.setdefault(amplifier.output, row)
    others = dict(amplifier.others)
    system.amplifiers.append(
        AmplifierRow(
            amplifier,
            row,
            plus,
            minus,
            output,
            limits,
            has_body,
            system.index(others.get("REF")),
            packaged_gain(system.circuit, amplifier),
        )
    )


def packaged_gain(circuit: Board, amplifier: Amplifier) -> float | None:
    """Return the gain (V/V) that a one-chip amplifier has by its data and its external resistor; None if not known."""
    if amplifier.kind == "buffer":
        return 1.0
    data = amplifier.data
    if amplifier.kind not in PACKAGED or data is None:
        return None
    pins = [net for role, net in amplifier.others if role.startswith("RG")]
    if data.gain_formula is None or len(pins) != 2:
        return data.fixed_gain
    conductance = 0.0
    for part in circuit.parts_on(pins[0]):
        if len(part.pins) == 2 and set(part.nets) == set(pins):
            if part.kind is not PartKind.RESISTOR or not part.value:
                return None
            conductance += 1 / part.value
    from ..text.expressions import ExpressionError, evaluate

    try:
        return evaluate(data.gain_formula, {"rg": 1 / conductance if conductance else 1e30})
    except ExpressionError:
        return None


def _hold_floating(system: System, parts: Iterable[Part], forced: Mapping[str, float]) -> tuple[str, ...]:
    """Find nets that no DC path ties to ground and hold them with a tiny conductance."""
    ground = len(system.net_index)
    parent = list(range(ground + 1))

    def root(index: int) -> int:
        while parent[index] != index:
            parent[index] = parent[parent[index]]
            index = parent[index]
        return index

    def join(one: int, two: int) -> None:
        parent[root(one if one >= 0 else ground)] = root(two if two >= 0 else ground)

    for part in parts:
        if part.is_fitted and part.designator not in system.left_out:
            for one, two in _dc_links(part):
                join(system.index(one), system.index(two))
    for each in system.amplifiers:
        if each.output >= 0:
            join(each.output, -1)
    for net in forced:
        join(system.net_index[net], -1)
    floating = []
    anchor = root(ground)
    for net, index in system.net_index.items():
        if root(index) != anchor:
            floating.append(net)
            system.conductances.add(index, index, GMIN_S)
    return tuple(floating)


_LINKS = frozenset(
    (PartKind.RESISTOR, PartKind.INDUCTOR, PartKind.VOLTAGE_SOURCE, PartKind.VCVS, PartKind.CCVS, PartKind.DIODE)
)


def _dc_links(part: Part) -> list[tuple[str, str]]:
    nets = part.nets
    if part.kind in _LINKS and len(nets) >= 2:
        return [(nets[0], nets[1])]
    if part.kind is PartKind.BJT and len(nets) >= 3:
        return [(nets[0], nets[1]), (nets[1], nets[2])]
    if part.kind is PartKind.MOSFET and len(nets) >= 3:
        return [(nets[0], nets[2])]
    if part.kind is PartKind.JFET and len(nets) >= 3:
        return [(nets[0], nets[2]), (nets[1], nets[2])]
    return []
