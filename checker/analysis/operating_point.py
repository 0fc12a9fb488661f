"""The operating point: Newton's method over the junctions, and over the states of the amplifiers.

An amplifier is linear, limited at one of its rails, or (open outputs) off. Comparators, Schmitt triggers and
oscillators only switch: they are high or low. States change until none contradicts its voltages. Where Newton does not
converge, the junctions are bridged by conductances that are taken away step by step, then the sources are raised step
by step. A circuit whose states go round in a circle has no operating point, and that is said.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from .junctions import Device
from .solve import SingularEquations, solve_once
from .system import AmplifierRow, Entries, System

if TYPE_CHECKING:
    import numpy

LINEAR, HIGH, LOW, OFF = "linear", "high", "low", "off"

VOLT_TOLERANCE = 1e-9
RELATIVE_TOLERANCE = 1e-9
ITERATIONS = 150
STATE_CHANGES = 80


class NoOperatingPoint(ArithmeticError):
    """No solution was found; the text says why in the reader's words."""


Junctions = dict[str, tuple[tuple[str, ...], list[list[float]]]]


@dataclass(slots=True)
class OperatingPoint:
    """A solution: ``values`` of shape ``(n,)`` in the order of the system's unknowns, and the amplifiers' states.

    ``junctions`` holds the linearized devices by designator, each with its nets and its conductances (S): what small
    signals see.
    """

    system: System
    values: numpy.ndarray
    states: dict[str, str]
    junctions: Junctions
    open_limits: tuple[str, ...] = ()
    uncertain: dict[str, str] = field(default_factory=dict)

    def voltage(self, net: str) -> float:
        """Return the voltage of a net against ground (V).

        Raises
        ------
        KeyError
            When the circuit has no such net.
        """
        circuit = self.system.circuit
        found = net if net in self.system.net_index else circuit.net(net)
        if found is None:
            raise KeyError(net)
        index = self.system.index(found)
        return 0.0 if index < 0 else float(self.values[index])

    def current(self, branch: str) -> float:
        """Return the current of a branch: into the plus pin of a source, out of an amplifier's output (A)."""
        return float(self.values[self.system.branch_index[branch]])


def amplifier_entries(row: AmplifierRow, state: str, entries: Entries, right: list[float]) -> None:
    """Write the equation of one amplifier in a state: its gain, or the limit at which its output stands."""
    if row.row < 0:
        return
    limits = row.limits
    if state == OFF:
        entries.add(row.row, row.row, 1.0)
        return
    if state in (HIGH, LOW):
        entries.add(row.row, row.output, 1.0)
        if limits is not None:
            right[row.row] += limits.high_v if state == HIGH else limits.low_v
        if row.output < 0:
            entries.add(row.row, row.row, 1.0)
        return
    if row.has_body:
        entries.add(row.row, row.row, 1.0)
        return
    if row.is_packaged:
        gain = row.fixed_gain if row.fixed_gain is not None else 0.0
        entries.add(row.row, row.output, 1.0)
        entries.add(row.row, row.plus, -gain)
        if row.amplifier.kind != "buffer":
            entries.add(row.row, row.minus, gain)
            entries.add(row.row, row.reference, -1.0)
        return
    gain = row.amplifier.gain
    entries.add(row.row, row.output, 1 / gain)
    entries.add(row.row, row.plus, -1.0)
    entries.add(row.row, row.minus, 1.0)
    right[row.row] += middle(row) / gain


def middle(row: AmplifierRow) -> float:
    """Return the output voltage of an amplifier at equal inputs: half way between its limits."""
    if row.limits is None or row.amplifier.gain_origin == "netlist":
        return 0.0
    return (row.limits.low_v + row.limits.high_v) / 2


def solve_operating_point(
    system: System, switching: Mapping[str, str], override: Mapping[int, float] | None = None
) -> OperatingPoint:
    """Find the operating point.

    Parameters
    ----------
    system
        The equations.
    switching
        Amplifiers that only switch, with the state to start from.
    override
        Values of source rows in place of those of the system (V), by row.

    Raises
    ------
    NoOperatingPoint
        When the equations are singular, do not converge, or the amplifiers' states go round in a circle.
    """
    import numpy as np

    made = [Device(part) for part in system.nonlinear]
    devices = [(device, [system.index(net) for net in device.nets]) for device in made]
    sources = list(system.sources)
    for row, value in (override or {}).items():
        sources[row] = value
    states = {each.amplifier.name: switching.get(each.amplifier.name, LINEAR) for each in system.amplifiers}
    seen: set[tuple[str, ...]] = set()
    guess = np.zeros(system.size)
    is_careful = False
    for _ in range(STATE_CHANGES):
        values, junctions = _newton_with_help(system, states, sources, devices, guess)
        wanted = _contradicting(system, states, values, switching)
        if not wanted:
            return OperatingPoint(
                system,
                values,
                states,
                junctions,
                open_limits=tuple(
                    each.amplifier.name
                    for each in system.amplifiers
                    if each.limits is None and each.amplifier.name in switching
                ),
            )
        key = tuple(states.values())
        if key in seen:
            if is_careful:
                names = ", ".join(list(wanted)[:3])
                raise NoOperatingPoint(f"the output of {names} has no state at which it can rest")
            is_careful = True
            seen.clear()
        seen.add(key)
        if is_careful:
            first = next(iter(wanted))
            states[first] = wanted[first]
        else:
            states.update(wanted)
        guess = values
        for device, _nets in devices:
            device.reset()
    raise NoOperatingPoint("the amplifiers' states do not settle")


def _contradicting(
    system: System, states: Mapping[str, str], values: numpy.ndarray, switching: Mapping[str, str]
) -> dict[str, str]:
    """Return the amplifiers whose state does not fit the voltages, with the state that does."""
    found = {}
    for row in system.amplifiers:
        name = row.amplifier.name
        state = states[name]
        if row.row < 0:
            continue
        difference = _at(values, row.plus) - _at(values, row.minus)
        if name in switching:
            better = (OFF if row.amplifier.is_open_output else HIGH) if difference >= 0 else LOW
            if better != state:
                found[name] = better
            continue
        limits = row.limits
        if limits is None:
            continue
        out = _at(values, row.output)
        slack = 1e-6 * max(1.0, abs(limits.high_v), abs(limits.low_v))
        if state == LINEAR:
            if out > limits.high_v + slack:
                found[name] = HIGH
            elif out < limits.low_v - slack:
                found[name] = LOW
            continue
        if row.has_body:  # the branch must push against the body, else the body alone would stay within the limits
            current = float(values[row.row])
            if (state == HIGH and current > 1e-12) or (state == LOW and current < -1e-12):
                found[name] = LINEAR
            continue
        if row.is_packaged:
            gain = row.fixed_gain or 0.0
            free = gain * difference + _at(values, row.reference)
        else:
            free = middle(row) + row.amplifier.gain * difference
        if (state == HIGH and free < limits.high_v - slack) or (state == LOW and free > limits.low_v + slack):
            found[name] = LINEAR
    return found


def _at(values: numpy.ndarray, index: int) -> float:
    return 0.0 if index < 0 else float(values[index])


_Devices = list[tuple[Device, list[int]]]


def _newton_with_help(
    system: System, states: Mapping[str, str], sources: list[float], devices: _Devices, guess: numpy.ndarray
) -> tuple[numpy.ndarray, Junctions]:
    import numpy as np

    try:
        found = _newton(system, states, sources, devices, guess, 0.0)
    except SingularEquations as trouble:
        raise NoOperatingPoint(_singular_text(system)) from trouble
    if found is not None:
        return found
    for start in (guess, np.zeros(system.size)):  # conductances across the junctions, taken away step by step
        at = start
        for exponent in range(2, 14):
            step = _newton(system, states, sources, devices, at, 10.0**-exponent)
            if step is None:
                break
            at = step[0]
        else:
            last = _newton(system, states, sources, devices, at, 0.0)
            if last is not None:
                return last
    at = np.zeros(system.size)
    for share in (0.0, 0.01, 0.03, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0):  # sources raised step by step
        step = _newton(system, states, [share * each for each in sources], devices, at, 0.0)
        if step is None:
            raise NoOperatingPoint("the junctions do not settle: no operating point was found")
        at = step[0]
    return step  # type: ignore[return-value]


def _singular_text(system: System) -> str:
    return "the equations have no single solution: a loop of ideal sources, or a net that nothing determines"


def _newton(
    system: System,
    states: Mapping[str, str],
    sources: list[float],
    devices: _Devices,
    guess: numpy.ndarray,
    bridge_s: float,
) -> tuple[numpy.ndarray, Junctions] | None:
    """Iterate with fixed amplifier states; None when it does not converge."""
    import numpy as np

    fixed = Entries(list(system.conductances.rows), list(system.conductances.columns), list(system.conductances.values))
    right = list(sources)
    for row in system.amplifiers:
        amplifier_entries(row, states[row.amplifier.name], fixed, right)
    if not devices:
        return solve_once(system.size, fixed, np.asarray(right)), {}
    values = guess
    nets = len(system.net_index)
    for count in range(ITERATIONS):
        junctions = Entries()
        found_rows: Junctions = {}
        pushed = np.asarray(right)
        for device, indices in devices:
            volts = tuple(_at(values, index) for index in indices)
            currents, rows = device.at(volts)
            found_rows[device.part.designator] = (device.nets, rows)
            for i, one in enumerate(indices):
                if one >= 0:
                    pushed[one] -= currents[i] - sum(rows[i][j] * volts[j] for j in range(len(indices)))
                for j, two in enumerate(indices):
                    junctions.add(one, two, rows[i][j])
            if bridge_s:
                for one, two in zip(indices, indices[1:], strict=False):
                    junctions.conductance(one, two, bridge_s)
        try:
            found = solve_once(system.size, fixed.extended(junctions), pushed)
        except SingularEquations:
            return None  # all junctions of a loop are off at the guess; bridged ones are not
        change = np.abs(found - values)[:nets]
        is_close = bool(np.all(change <= VOLT_TOLERANCE + RELATIVE_TOLERANCE * np.abs(found[:nets])))
        if count > 20:  # damp what goes round in a circle
            found = values + 0.5 * (found - values)
        values = found
        if is_close and all(device.is_settled for device, _ in devices):
            return values, found_rows
    return None
