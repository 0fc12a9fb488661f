"""DC gains of a small linear subcircuit between its ports, in plain Python: bodies have a dozen parts at most."""

from __future__ import annotations

from ..text.expressions import ExpressionError
from ..text.netlist import Subcircuit
from .levels import Level

_OPEN = 1e-12  # conductance to ground of every net, S: keeps nets that only capacitors hold in the system


def body_gains(definition: Subcircuit, level: Level) -> list[list[float]] | None:
    """Return the matrix of DC gains, row: output port, column: driven port; None when the body cannot be solved.

    The driven port is at 1 V, the output port open, the others at 0 V.
    """
    try:
        stamps = _Body(definition, level)
    except (ExpressionError, KeyError, ZeroDivisionError, TypeError):
        return None
    count = len(definition.ports)
    gains = [[0.0] * count for _ in range(count)]
    for output in range(count):
        held = [port for port in range(count) if port != output]
        for driven in held:
            answer = stamps.solve({port: 1.0 if port == driven else 0.0 for port in held})
            if answer is None:
                continue
            gains[output][driven] = answer[output]
    return gains


class _Body:
    """Nodal equations of the body; unknowns are its nets, then the currents of sources and inductors."""

    def __init__(self, definition: Subcircuit, level: Level) -> None:
        self.nets: dict[str, int] = {}
        self.entries: list[tuple[int, int, float]] = []
        self.branches = 0
        self._branch_rows: list[list[tuple[int, float]]] = []
        self._branch_of: dict[str, int] = {}
        self.ports = [self._index(port) for port in definition.ports]
        pending = []
        for element in definition.scope.elements:
            nets = [self._index(each) for each in element.nets]
            if element.letter == "R":
                resistance = level.value(element.value)  # type: ignore[arg-type]
                self._conductance(nets[0], nets[1], 1 / resistance if resistance else 1e9)
            elif element.letter == "G" and element.control is not None and element.control.form == "linear":
                one, two = (self._index(each) for each in element.control.nets)
                gm = level.value(element.control.gain)  # type: ignore[arg-type]
                for net, sign in ((nets[0], 1), (nets[1], -1)):
                    self.entries += [(net, one, sign * gm), (net, two, -sign * gm)]
            elif element.letter in "EVL":
                row = [(nets[0], 1.0), (nets[1], -1.0)]
                if element.letter == "E" and element.control is not None:
                    row += self._controls(
                        element.control.nets, element.control.coefficients, element.control.gain, level
                    )
                self._branch_of[element.designator.lower()] = len(self._branch_rows)
                self._branch_rows.append(row)
                pending.append(nets)
            elif element.letter == "C":
                continue
            else:
                raise KeyError(element.letter)
        self._branch_nets = pending

    def _controls(
        self, nets: tuple[str, ...], coefficients: tuple[object, ...], gain: object, level: Level
    ) -> list[tuple[int, float]]:
        row: list[tuple[int, float]] = []
        gains = [gain] if gain is not None else list(coefficients[1:])
        for index in range(min(len(nets) // 2, len(gains))):
            number = level.value(gains[index])  # type: ignore[arg-type]
            row.append((self._index(nets[2 * index]), -number))
            row.append((self._index(nets[2 * index + 1]), number))
        return row

    def _index(self, net: str) -> int:
        folded = net.casefold()
        if folded in {"0", "gnd"}:
            return -1
        return self.nets.setdefault(folded, len(self.nets))

    def _conductance(self, one: int, two: int, value: float) -> None:
        self.entries += [(one, one, value), (two, two, value), (one, two, -value), (two, one, -value)]

    def solve(self, held: dict[int, float]) -> list[float] | None:
        """Return the port voltages with some ports held; None when the system is singular."""
        count = len(self.nets)
        size = count + len(self._branch_rows)
        matrix = [[0.0] * (size + 1) for _ in range(size)]
        for net in range(count):
            matrix[net][net] += _OPEN
        for row, column, value in self.entries:
            if row >= 0 and column >= 0:
                matrix[row][column] += value
        for index, row_entries in enumerate(self._branch_rows):
            branch = count + index
            for net, value in row_entries:
                if net >= 0:
                    matrix[branch][net] += value
            for net, sign in zip(self._branch_nets[index], (1.0, -1.0), strict=False):
                if net >= 0:
                    matrix[net][branch] += sign
        for port, voltage in held.items():
            net = self.ports[port]
            if net >= 0:
                matrix[net] = [0.0] * (size + 1)
                matrix[net][net] = 1.0
                matrix[net][size] = voltage
        answer = _eliminate(matrix)
        if answer is None:
            return None
        return [answer[net] if net >= 0 else 0.0 for net in self.ports]


def _eliminate(matrix: list[list[float]]) -> list[float] | None:
    """Solve by Gaussian elimination with partial pivoting; the last column is the right-hand side."""
    size = len(matrix)
    for column in range(size):
        pivot = max(range(column, size), key=lambda row: abs(matrix[row][column]))
        if abs(matrix[pivot][column]) < 1e-30:
            return None
        matrix[column], matrix[pivot] = matrix[pivot], matrix[column]
        head = matrix[column]
        for row in range(column + 1, size):
            factor = matrix[row][column] / head[column]
            if factor:
                for index in range(column, size + 1):
                    matrix[row][index] -= factor * head[index]
    answer = [0.0] * size
    for row in range(size - 1, -1, -1):
        total = matrix[row][size] - sum(matrix[row][index] * answer[index] for index in range(row + 1, size))
        answer[row] = total / matrix[row][row]
    return answer
