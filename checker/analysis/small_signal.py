"""Small signals: one factorization of the linearized circuit serves transfers, impedances and sensitivities.

At the operating point every junction is its conductance, every amplifier its gain (also one that the operating point
drives into a rail: the figure is that of the stage, the rail has its own rule); what only switches stands still.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from .operating_point import HIGH, LINEAR, amplifier_entries
from .solve import Factors
from .system import SHORT_S, Entries, System

if TYPE_CHECKING:
    import numpy


class SmallSignal:
    """The circuit for small changes at one frequency.

    Parameters
    ----------
    system
        The equations.
    junctions
        Conductances of the nonlinear parts.
    switching
        Amplifiers that do not follow small signals.
    hertz
        Frequency; 0 is DC with capacitors open.
    shorted
        Capacitors taken as short (DC only).
    gain_bandwidth_hz
        Gain-bandwidth product of amplifiers by name (Hz), where known.
    held
        Amplifiers whose outputs are kept still beside those that only switch.
    """

    def __init__(
        self,
        system: System,
        junctions: Entries,
        switching: Iterable[str],
        hertz: float = 0.0,
        shorted: Iterable[str] = (),
        gain_bandwidth_hz: dict[str, float] | None = None,
        held: Iterable[str] = (),
    ) -> None:
        self.system = system
        entries, storages = linear_matrices(system, junctions, switching, shorted, gain_bandwidth_hz, held)
        if hertz:
            omega = 2j * 3.141592653589793 * hertz
            values: list[complex] = [*entries.values, *(omega * each for each in storages.values)]
            merged = Entries(entries.rows + storages.rows, entries.columns + storages.columns, values)  # type: ignore[arg-type]
            self.factors = Factors(system.size, merged, is_complex=True)
        else:
            self.factors = Factors(system.size, entries)

    def response(self, nets: Sequence[str]) -> numpy.ndarray:
        """Return all unknowns for a unit push at each net: shape ``(n, k)``.

        A net that a source or an amplifier holds is pushed through that branch, any other by a current of 1 A into it.
        """
        import numpy as np

        right = np.zeros((self.system.size, len(nets)))
        for column, net in enumerate(nets):
            row = self.system.mover(net)
            if row >= 0:
                right[row, column] = 1.0
        return self.factors.solve(right)

    def transfers(self, inputs: Sequence[str], outputs: Sequence[str]) -> numpy.ndarray | None:
        """Return the gains from each input net, the others held, to each output net: shape ``(outputs, inputs)``.

        None when the inputs cannot be moved independently.
        """
        import numpy as np

        rows = [self.system.index(net) for net in inputs]
        if any(row < 0 for row in rows):
            return None
        pushed = self.response(inputs)
        base = pushed[rows, :]
        wanted = np.array(
            [
                pushed[self.system.index(net), :] if self.system.index(net) >= 0 else np.zeros(len(inputs))
                for net in outputs
            ]
        )
        scale = np.abs(base).max(axis=0)
        if not np.all(scale > 0):
            return None
        try:
            gains: numpy.ndarray = np.linalg.solve((base / scale).T, (wanted / scale).T).T
        except np.linalg.LinAlgError:
            return None
        return gains if np.all(np.isfinite(gains)) else None

    def impedance(self, net: str) -> complex:
        """Return the impedance between a net and ground (ohm), what holds the net included."""
        import numpy as np

        row = self.system.index(net)
        right = np.zeros(self.system.size)
        right[row] = 1.0
        return complex(self.factors.solve(right)[row])


def linear_matrices(
    system: System,
    junctions: Entries,
    switching: Iterable[str],
    shorted: Iterable[str] = (),
    gain_bandwidth_hz: dict[str, float] | None = None,
    held: Iterable[str] = (),
) -> tuple[Entries, Entries]:
    """Return G and C of the linearized circuit; ``held`` amplifiers keep their outputs still."""
    entries = system.conductances.extended(junctions)
    storages = Entries(list(system.storages.rows), list(system.storages.columns), list(system.storages.values))
    still = {*switching, *held}
    unread = [0.0] * system.size
    for row in system.amplifiers:
        amplifier = row.amplifier
        state = HIGH if amplifier.name in still else LINEAR
        amplifier_entries(row, state, entries, unread)
        product = (gain_bandwidth_hz or {}).get(amplifier.name)
        if product and state == LINEAR and row.row >= 0 and not row.has_body:
            gain = abs(row.fixed_gain or 1.0) if row.is_packaged else 1.0
            storages.add(row.row, row.output, gain / (2 * 3.141592653589793 * product))
    for name in shorted:
        ends = system.capacitors.get(name)
        if ends is not None:
            entries.conductance(*ends, SHORT_S)
    return entries, storages
