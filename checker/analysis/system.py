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

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from ..circuit.graph import Circuit
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


@dataclass(slots=True)
class AmplifierRow:
    """Where an amplifier's equation stands: ``row`` is its branch, -1 for those whose linear body is stamped."""

    amplifier: Amplifier
    row: int
    plus: int
    minus: int
    output: int
    limits: OutputLimits | None


@dataclass(slots=True)
class System:
    """The equations of one circuit.

    ``unknowns`` names each row: nets first, then ``I(name)`` of the branches. ``floating`` lists nets without a DC
    path to ground; a conductance of 1e-12 S holds them so that the rest can be solved.
    """

    circuit: Circuit
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
    left_out: tuple[str, ...] = ()

    @property
    def size(self) -> int:
        """Number of unknowns."""
        return len(self.unknowns)

    def index(self, net: str | None) -> int:
        """Return the row of a net; -1 for ground and for nets that are not in the system."""
        return -1 if net is None else self.net_index.get(net, -1)


def build_system(
    circuit: Circuit, limits: Mapping[str, OutputLimits | None], forced_v: Mapping[str, float] | None = None
) -> System:
    """Write the equations of a circuit.

    Parameters
    ----------
    circuit
        The circuit.
    limits
        Output limits by amplifier name, None where they are not known.
    forced_v
        Nets that a declared signal drives and no source of the netlist does, with their mean voltage (V); each gets
        an ideal source named ``signal:NET``.
    """
    from .stamps import stamp_part

    nets = [net for net in circuit.nets if net != circuit.ground]
    inner_parts = [part for each in circuit.amplifiers for part in each.inner]
    known = set(nets)
    for part in inner_parts:
        for net in part.nets:
            if net not in known and net != circuit.ground:
                known.add(net)
                nets.append(net)
    net_index = {net: index for index, net in enumerate(nets)}
    system = System(
        circuit=circuit,
        unknowns=list(nets),
        net_index=net_index,
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
    ideal = {each.designator for each in circuit.amplifiers if not each.inner}
    parts: Iterable[Part] = [*circuit.parts.values(), *inner_parts]
    left_out = []
    for part in parts:
        if not part.is_fitted or (part.kind is PartKind.VCVS and part.designator in ideal):
            continue
        if not stamp_part(system, part):
            left_out.append(part.designator)
    for amplifier in circuit.amplifiers:
        _stamp_amplifier(system, amplifier, limits.get(amplifier.name))
    for net, volts in (forced_v or {}).items():
        if net in net_index:
            add_source(system, f"signal:{net}", net_index[net], -1, volts)
    system.left_out = tuple(left_out)
    system.floating = _hold_floating(system)
    return system


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


def _stamp_amplifier(system: System, amplifier: Amplifier, limits: OutputLimits | None) -> None:
    plus, minus = system.index(amplifier.plus), system.index(amplifier.minus)
    output = system.index(amplifier.output)
    if amplifier.inner:
        driver = next(
            (
                system.branch_index.get(part.designator)
                for part in amplifier.inner
                if part.kind is PartKind.VCVS and amplifier.output in part.nets[:2]
            ),
            None,
        )
        if driver is not None:
            system.drivers[amplifier.output] = driver
        system.amplifiers.append(AmplifierRow(amplifier, -1, plus, minus, output, limits))
        return
    row = add_branch(system, amplifier.name)
    system.conductances.add(output, row, -1.0)
    system.drivers.setdefault(amplifier.output, row)
    system.amplifiers.append(AmplifierRow(amplifier, row, plus, minus, output, limits))


def _hold_floating(system: System) -> tuple[str, ...]:
    """Find nets that no DC path ties to ground and hold them with a tiny conductance."""
    parent = list(range(system.size + 1))  # the last one is ground

    def root(index: int) -> int:
        while parent[index] != index:
            parent[index] = parent[parent[index]]
            index = parent[index]
        return index

    ground = system.size
    circuit = system.circuit
    parts = [*circuit.parts.values(), *(part for each in circuit.amplifiers for part in each.inner)]
    for part in parts:
        if not part.is_fitted:
            continue
        for one, two in _dc_links(part):
            first, second = system.index(one), system.index(two)
            parent[root(first if first >= 0 else ground)] = root(second if second >= 0 else ground)
    for each in system.amplifiers:
        if each.output >= 0:
            parent[root(each.output)] = root(ground)
    for name in system.branch_index:
        if name.startswith("signal:"):
            parent[root(system.net_index[name[7:]])] = root(ground)
    floating = []
    anchor = root(ground)
    for net, index in system.net_index.items():
        if root(index) != anchor:
            floating.append(net)
            system.conductances.add(index, index, GMIN_S)
    return tuple(floating)


_LINKS = {
    PartKind.RESISTOR, PartKind.INDUCTOR, PartKind.VOLTAGE_SOURCE, PartKind.VCVS, PartKind.CCVS, PartKind.DIODE,
}  # fmt: skip


def _dc_links(part: Part) -> list[tuple[str, str]]:
    nets = part.nets
    if part.kind in _LINKS and len(nets) >= 2:
        return [(nets[0], nets[1])]
    if part.kind is PartKind.BJT and len(nets) >= 3:
        return [(nets[0], nets[1]), (nets[1], nets[2])]
    if part.kind in {PartKind.MOSFET, PartKind.JFET} and len(nets) >= 3:
        return [(nets[0], nets[2])]
    return []
