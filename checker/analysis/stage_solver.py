"""The solved region of a stage: gains, impedances, sensitivities, poles and loop gain."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from ..circuit.parts import PartKind
from .small_signal import SmallSignal, linear_matrices
from .system import AmplifierRow, Entries, System
from .transfer import Transfer

if TYPE_CHECKING:
    import numpy

    from .bench import Bench
    from .regions import Region

MODAL_LIMIT = 250  # unknowns; poles of larger regions would take too long


class StageSolver:
    """Equations of one region, factorized on demand.

    Parameters
    ----------
    bench
        Supplies limits, junction conductances and what only switches.
    region
        What to solve.
    """

    def __init__(self, bench: Bench, region: Region) -> None:
        from .regions import region_system

        self.bench = bench
        self.region = region
        self.system: System = region_system(bench, region)
        self._small: dict[tuple[float, bool, bool], SmallSignal] = {}
        self._junctions: Entries | None = None

    @property
    def junctions(self) -> Entries:
        """Conductances of the region's nonlinear parts at the operating point."""
        if self._junctions is None:
            self._junctions = junction_entries(self.bench, self.system)
        return self._junctions

    def small(self, hertz: float = 0.0, *, midband: bool = False, ideal: bool = False) -> SmallSignal:
        """Return the region for small signals at one frequency.

        ``midband`` is DC with the coupling capacitors short; ``ideal`` takes amplifiers without bandwidth.
        """
        key = (hertz, midband, ideal)
        if key not in self._small:
            self._small[key] = SmallSignal(
                self.system,
                self.junctions,
                self.bench.switching,
                hertz,
                shorted=self.bench.coupling_capacitors if midband else (),
                gain_bandwidth_hz=None if ideal else self.bench.gain_bandwidth_hz,
            )
        return self._small[key]

    def gains(
        self, inputs: Sequence[str], output: str, *, midband: bool = False, hertz: float = 0.0, ideal: bool = False
    ) -> numpy.ndarray | None:
        """Return the gains from each input, the others held, to the output: shape ``(k,)``; None when undefined."""
        found = self.small(hertz, midband=midband, ideal=ideal).transfers(inputs, [output])
        return None if found is None else found[0]

    def row_of(self, name: str) -> AmplifierRow | None:
        """Return the row of an amplifier."""
        return next((row for row in self.system.amplifiers if row.amplifier.name == name), None)

    def input_push(self, row: AmplifierRow) -> numpy.ndarray | None:
        """Return the right side that stands for 1 V in series with the amplifier's non-inverting input."""
        import numpy as np

        right = np.zeros(self.system.size)
        if row.is_packaged or (row.row < 0 and not row.has_body):
            return None
        if not row.has_body:
            right[row.row] = 1.0
            return right
        amplifier = row.amplifier
        found = False
        for part in amplifier.inner:
            if part.value is None or set(part.control) != {amplifier.plus, amplifier.minus}:
                continue
            sign = 1.0 if part.control[0] == amplifier.plus else -1.0
            if part.kind is PartKind.VCVS:
                right[self.system.branch_index[part.designator]] += sign * part.value
                found = True
            elif part.kind is PartKind.VCCS:
                for net, direction in zip(part.nets[:2], (-1.0, 1.0), strict=True):
                    index = self.system.index(net)
                    if index >= 0:
                        right[index] += direction * sign * part.value
                found = True
        return right if found else None

    def closed_gain(self, row: AmplifierRow, *, midband: bool = False, hertz: float = 0.0) -> complex | None:
        """Return the output for 1 V in series with the non-inverting input: the closed-loop gain for its own errors."""
        right = self.input_push(row)
        if right is None or row.output < 0:
            return None
        return complex(self.small(hertz, midband=midband).factors.solve(right)[row.output])

    def transfer(
        self, inputs: Sequence[str], output: str, weights: Sequence[float], *, ideal: bool = False
    ) -> Transfer | None:
        """Return a weighted sum of the transfers from the inputs to the output over frequency.

        ``ideal`` takes amplifiers without bandwidth. None when the region is too large or an input cannot be held.
        """
        size = self.system.size
        out = self.system.index(output)
        rows = [self.system.mover(net) for net in inputs]
        if size > MODAL_LIMIT or out < 0 or any(row < 0 for row in rows):
            return None
        products = None if ideal else self.bench.gain_bandwidth_hz
        entries, storages = linear_matrices(self.system, self.junctions, self.bench.switching, (), products)
        matrix, stored = dense_matrix(size, entries), dense_matrix(size, storages)
        for net, row in zip(inputs, rows, strict=True):
            matrix[row, :] = 0.0
            stored[row, :] = 0.0
            matrix[row, self.system.index(net)] = 1.0
        return Transfer(matrix, stored, rows, weights, out)

    def current_transfer(self, net: str, output: str, *, ideal: bool = False) -> Transfer | None:
        """Return the transfer from a current into a net to the output voltage; see :meth:`transfer`."""
        row, out = self.system.index(net), self.system.index(output)
        if self.system.size > MODAL_LIMIT or row < 0 or out < 0:
            return None
        products = None if ideal else self.bench.gain_bandwidth_hz
        entries, storages = linear_matrices(self.system, self.junctions, self.bench.switching, (), products)
        size = self.system.size
        return Transfer(dense_matrix(size, entries), dense_matrix(size, storages), [row], [1.0], out)

    def loop_gain(self, name: str, hertz: numpy.ndarray) -> numpy.ndarray | None:
        """Return the return ratio of one amplifier at frequencies (Hz), all other loops closed; None without a model.

        ``T = -A(f) * (v+ - v-)`` for 1 V forced on the amplifier's output.
        """
        import numpy as np

        row = self.row_of(name)
        if row is None or row.is_packaged or (row.row < 0 and not row.has_body):
            return None
        system = self.system
        products = self.bench.gain_bandwidth_hz
        entries, storages = linear_matrices(system, self.junctions, self.bench.switching, (), products, held=(name,))
        matrix, stored = dense_matrix(system.size, entries), dense_matrix(system.size, storages)
        right = np.zeros(system.size)
        gain = row.amplifier.gain
        if row.has_body:
            branch = next(
                (
                    part
                    for part in row.amplifier.inner
                    if part.kind is PartKind.VCVS
                    and part.value
                    and set(part.control) == {row.amplifier.plus, row.amplifier.minus}
                ),
                None,
            )
            if branch is None:
                return None
            at = system.branch_index[branch.designator]
            for index in (row.plus, row.minus):
                if index >= 0:
                    matrix[at, index] = 0.0
            if row.row >= 0:  # let the body drive
                matrix[row.row, :] = 0.0
                matrix[row.row, row.row] = 1.0
            sign = 1.0 if branch.control[0] == row.amplifier.plus else -1.0
            right[at] = sign
            gain = branch.value or 0.0
            gain = abs(gain)
        else:
            right[row.row] = 1.0
        omega = 2 * math.pi * np.asarray(hertz, dtype=float)
        found = np.empty(omega.shape, dtype=complex)
        for start in range(0, len(omega), 64):
            part_omega = omega[start : start + 64]
            batch = matrix[None] + 1j * part_omega[:, None, None] * stored[None]
            try:
                solved = np.linalg.solve(batch, np.broadcast_to(right[:, None], (len(part_omega), system.size, 1)))[
                    ..., 0
                ]
            except np.linalg.LinAlgError:
                return None
            difference = _column(solved, row.plus) - _column(solved, row.minus)
            product = products.get(name)
            open_loop = (
                1 / (1 / gain + 1j * part_omega / (2 * math.pi * product)) if product and not row.has_body else gain
            )
            found[start : start + 64] = -open_loop * difference
        return found


def _column(solved: numpy.ndarray, index: int) -> numpy.ndarray:
    import numpy as np

    found: numpy.ndarray = solved[:, index] if index >= 0 else np.zeros(solved.shape[0])
    return found


def dense_matrix(size: int, entries: Entries) -> numpy.ndarray:
    """Return entries as an array of shape ``(size, size)``."""
    import numpy as np

    matrix = np.zeros((size, size))
    if entries.values:
        np.add.at(matrix, (entries.rows, entries.columns), entries.values)
    return matrix


def junction_entries(bench: Bench, system: System) -> Entries:
    """Return the conductances of the junctions of a system as matrix entries."""
    entries = Entries()
    if not system.nonlinear:
        return entries
    known = bench.solution.junctions
    for part in system.nonlinear:
        nets, rows = known[part.designator]
        indices = [system.index(net) for net in nets]
        for i, one in enumerate(indices):
            for j, two in enumerate(indices):
                entries.add(one, two, rows[i][j])
    return entries
