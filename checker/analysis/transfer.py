"""A transfer over frequency: exact values by solving, poles by the eigenvalues of the region.

With ``(G + sC) x = b`` and ``y = c x`` the poles are ``-1/u`` for the eigenvalues ``u`` of ``G^-1 C``; the residue of one
is ``(c v)(w G^-1 b)/(w v)`` with its right and left vectors. Values come from solving at each frequency, so that loops
of capacitors and ideal sources, whose infinite poles spoil a sum of residues, do no harm.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy

BATCH = 64


class Transfer:
    """One transfer.

    Parameters
    ----------
    matrix, stored
        G and C of shape ``(n, n)``, the driving rows already written.
    rows, weights
        Where the excitation enters and how much of it.
    out
        Index of the answer.
    """

    def __init__(
        self, matrix: numpy.ndarray, stored: numpy.ndarray, rows: Sequence[int], weights: Sequence[float], out: int
    ) -> None:
        import numpy as np

        self.matrix = matrix
        self.stored = stored
        self.out = out
        self.right = np.zeros(matrix.shape[0])
        for row, weight in zip(rows, weights, strict=True):
            self.right[row] += weight
        self._poles: list[complex] | None = None

    def at(self, hertz: numpy.ndarray | Sequence[float]) -> numpy.ndarray:
        """Return the complex gain at frequencies (Hz), shape ``(k,)``; not a number where there is none."""
        import numpy as np

        omega = 2 * math.pi * np.atleast_1d(np.asarray(hertz, dtype=float))
        found = np.empty(omega.shape, dtype=complex)
        size = len(self.right)
        for start in range(0, len(omega), BATCH):
            part = omega[start : start + BATCH]
            batch = self.matrix[None] + 1j * part[:, None, None] * self.stored[None]
            right = np.broadcast_to(self.right[:, None], (len(part), size, 1))
            try:
                found[start : start + BATCH] = np.linalg.solve(batch, right)[:, self.out, 0]
            except np.linalg.LinAlgError:
                found[start : start + BATCH] = np.nan
        return found

    def poles(self, share: float = 1e-6) -> list[complex]:
        """Return the poles (rad/s) that the transfer shows, by magnitude; those with a residue below ``share`` are left out."""
        if self._poles is None:
            self._poles = self._find(share)
        return self._poles

    def _find(self, share: float) -> list[complex]:
        import numpy as np

        try:
            inverse = np.linalg.inv(self.matrix)
            product = inverse @ self.stored
            periods, vectors = np.linalg.eig(product)
            left_periods, left = np.linalg.eig(product.T)
        except np.linalg.LinAlgError:
            return []
        start = inverse @ self.right
        scale = np.abs(periods).max(initial=0.0)
        if scale == 0:
            return []
        found: list[tuple[complex, float]] = []
        taken: set[int] = set()
        for index in range(len(periods)):
            period = periods[index]
            if abs(period) <= max(1e-13 * scale, 1e-16):
                continue
            distance = np.abs(left_periods - period)
            distance[list(taken)] = np.inf
            match = int(distance.argmin())
            taken.add(match)
            right_vector, left_vector = vectors[:, index], left[:, match]
            overlap = left_vector @ right_vector
            # poles that coincide have vectors without overlap: then both count as shown
            strength = abs(right_vector[self.out] * (left_vector @ start)) / max(abs(overlap), 1e-30)
            found.append((complex(-1 / period), float(strength)))
        top = max([*(each[1] for each in found), abs(float(start[self.out]))], default=0.0)
        shown = [pole for pole, strength in found if strength > share * top]
        return sorted(shown, key=lambda pole: (abs(pole), pole.imag))
