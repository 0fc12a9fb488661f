"""Linear equations: dense for small circuits, sparse for large ones, one factorization for many right sides."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from .system import Entries

if TYPE_CHECKING:
    import numpy

DENSE_LIMIT = 75  # unknowns; above, sparse elimination wins even with the time its library takes to load


class SingularEquations(ArithmeticError):
    """The equations have no single solution: a loop of ideal sources, or a net that nothing determines."""


class Factors:
    """A factorized matrix of shape ``(n, n)``."""

    def __init__(self, size: int, entries: Entries, *, is_complex: bool = False) -> None:
        import numpy as np

        self.size = size
        self._is_dense = size <= DENSE_LIMIT
        kind: Any = complex if is_complex else float
        if self._is_dense:
            matrix = np.zeros((size, size), dtype=kind)
            np.add.at(matrix, (entries.rows, entries.columns), np.asarray(entries.values, dtype=kind))
            try:
                self._inverse = np.linalg.inv(matrix)
            except np.linalg.LinAlgError as trouble:
                raise SingularEquations(str(trouble)) from trouble
            self._matrix: Any = matrix
            if not np.all(np.isfinite(self._inverse)):
                raise SingularEquations("not finite")
            return
        from scipy.sparse import csc_matrix
        from scipy.sparse.linalg import splu

        self._matrix = csc_matrix(
            (np.asarray(entries.values, dtype=kind), (entries.rows, entries.columns)), shape=(size, size)
        )
        try:
            self._factors = splu(self._matrix, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": False})
        except RuntimeError as trouble:
            raise SingularEquations(str(trouble)) from trouble

    def solve(self, right: numpy.ndarray) -> numpy.ndarray:
        """Solve for one right side of shape ``(n,)`` or several of shape ``(n, k)``, with one step of refinement."""
        return self._refined(right, transposed=False)

    def solve_transposed(self, right: numpy.ndarray) -> numpy.ndarray:
        """Solve the transposed equations: the sensitivity of one figure to every right side."""
        return self._refined(right, transposed=True)

    def _refined(self, right: numpy.ndarray, *, transposed: bool) -> numpy.ndarray:
        import numpy as np

        matrix = self._matrix.T if transposed else self._matrix
        with np.errstate(all="ignore"):
            first = self._once(right, transposed)
            residue = right - matrix @ first
            found: numpy.ndarray = first + self._once(residue, transposed)
        if not np.all(np.isfinite(found)):
            raise SingularEquations("not finite")
        return found

    def _once(self, right: numpy.ndarray, transposed: bool) -> numpy.ndarray:
        found: numpy.ndarray
        if self._is_dense:
            found = (self._inverse.T if transposed else self._inverse) @ right
        else:
            found = self._factors.solve(right, "T" if transposed else "N")
        return found


def solve_once(size: int, entries: Entries, right: numpy.ndarray) -> numpy.ndarray:
    """Solve one set of equations once."""
    import numpy as np

    if size <= DENSE_LIMIT:
        matrix = np.zeros((size, size))
        np.add.at(matrix, (entries.rows, entries.columns), entries.values)
        try:
            found: numpy.ndarray = np.linalg.solve(matrix, right)
        except np.linalg.LinAlgError as trouble:
            raise SingularEquations(str(trouble)) from trouble
        if not np.all(np.isfinite(found)):
            raise SingularEquations("not finite")
        return found
    return Factors(size, entries).solve(right)
