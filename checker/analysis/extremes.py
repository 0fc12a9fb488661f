"""Extremes of a voltage or current over the range of all signals.

A linear circuit answers by superposition: one signal moves all its copies together, several add by their worst signs.
A signal with a known frequency contributes its mean through the gain at DC and its swing through the gain at that
frequency. Where diodes, transistors or switching amplifiers stand in the way, the operating point is solved again at
the ends of the signals and in between.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..circuit.parts import Signal
from ..topology.references import is_bypassed_divider
from .believable import BELIEVABLE_V, RUNS_AWAY, tidy
from .doubts import spread_doubts
from .figures import Unknown
from .operating_point import NoOperatingPoint, OperatingPoint, solve_operating_point
from .solve import SingularEquations

if TYPE_CHECKING:
    import numpy

    from .bench import Bench

NEGLIGIBLE = 1e-9  # gain below which a signal does not reach a net
SAME_SHARE = 0.01  # gains at DC and in the pass band that differ by less are the same
INTEGRATING = 3000.0  # gain at DC above which a stage integrates,
IMPOSSIBLE_V = 100.0  # if it would also take the output beyond this: then its output is known only with a frequency


@dataclass(frozen=True, slots=True)
class Range:
    """Lowest and highest value with the value at rest, and what they rest on."""

    low: float
    high: float
    rest: float
    assumptions: tuple[str, ...] = ()


def _range(low: float, high: float, rest: float, assumptions: tuple[str, ...] = ()) -> Range:
    """Return a range without the dust of the solve: what is a millionth of its span is nothing."""
    dust = 1e-6 * max(abs(low), abs(high))
    low, high, rest = (0.0 if abs(each) < dust else tidy(each) for each in (low, high, rest))
    return Range(min(low, high), max(low, high), rest, assumptions)


class Extremes:
    """Answers for one bench; responses to all signals are solved once per frequency."""

    def __init__(self, bench: Bench) -> None:
        self.bench = bench
        self._responses: dict[tuple[float, bool], dict[str, numpy.ndarray]] = {}
        self._bent: dict[str, str] | None = None
        self._by_junctions: frozenset[str] | None = None
        self._sweep: list[OperatingPoint] | str | None = None

    def of_net(self, net: str) -> Range | Unknown:
        """Return the extremes of a net's voltage (V)."""
        bench = self.bench
        rest = bench.volts(net)
        if isinstance(rest, Unknown):
            return rest
        index = bench.system.index(net)
        if index < 0:
            return Range(0.0, 0.0, 0.0)
        return self._range(index, net)

    def of_branch(self, name: str, net: str) -> Range | Unknown:
        """Return the extremes of a branch current (A); ``net`` is one that the branch drives."""
        reason = self.bench.doubt(net)
        if reason is not None:
            return Unknown(reason)
        row = self.bench.system.branch_index.get(name)
        return Unknown(f"no branch {name} in the equations") if row is None else self._range(row, net)

    def _range(self, index: int, net: str) -> Range | Unknown:
        bench = self.bench
        if not bench.circuit.signals:
            return Unknown("no signal is known", "[signals.NET] in the intent file, or a source in the netlist")
        rest = float(bench.solution.values[index])
        if net in self.bent:
            return self._swept(index, rest)
        low = high = rest
        assumptions: list[str] = []
        for name, signal in bench.circuit.signals.items():
            part = self._contribution(index, name, signal)
            if isinstance(part, Unknown):
                return part
            low += part.low
            high += part.high
            assumptions.extend(part.assumptions)
        if max(abs(low), abs(high)) > BELIEVABLE_V:
            return Unknown(RUNS_AWAY)
        return _range(low, high, rest, tuple(assumptions))

    def _contribution(self, index: int, name: str, signal: Signal) -> Range | Unknown:
        """Return how far one signal moves an unknown below and above its value at rest."""
        at_dc = self._gain(name, index)
        ends = sorted({min(signal.frequencies_hz), max(signal.frequencies_hz)}) if signal.frequencies_hz else []
        in_band = max((self._gain(name, index, hertz) for hertz in ends), key=abs, default=0j)
        if not ends:
            in_band = self._gain(name, index, midband=True)
        if abs(at_dc) < NEGLIGIBLE and abs(in_band) < NEGLIGIBLE:
            return Range(0.0, 0.0, 0.0)
        if signal.low is None or signal.high is None:
            return Unknown(f"the extremes of the signal on {name} are not known", f"low and high of [signals.{name}]")
        rest = self._rest_of(name, signal)
        swing, mean = (signal.high - signal.low) / 2, (signal.high + signal.low) / 2
        if swing == 0.0:
            shift = at_dc.real * (mean - rest)
            return Range(shift, shift, 0.0)
        if ends:
            size = abs(in_band) * swing
            shift = at_dc.real * (mean - rest) if abs(mean - rest) > 1e-12 * (1 + abs(mean)) else 0.0
            return Range(shift - size, shift + size, 0.0)
        if abs(at_dc) > INTEGRATING and abs(at_dc) * swing > IMPOSSIBLE_V:
            return Unknown(
                f"the stage integrates and the frequency of the signal on {name} is not known",
                f"frequency of [signals.{name}]",
            )
        if abs(at_dc - in_band) <= SAME_SHARE * max(abs(at_dc), abs(in_band)):
            ends_v = [at_dc.real * (each - rest) for each in (signal.low, signal.high)]
            return Range(min(ends_v), max(ends_v), 0.0)
        size = max(abs(at_dc), abs(in_band)) * swing
        shift = at_dc.real * (mean - rest)
        note = f"frequency of the signal on {name} not known: its pass-band gain counts"
        return Range(shift - size, shift + size, 0.0, (note,))

    def _rest_of(self, name: str, signal: Signal) -> float:
        """Return the value of a signal at the operating point."""
        bench = self.bench
        if signal.source is not None:
            row = bench.system.branch_index.get(signal.source)
            if row is not None:
                return bench.source_overrides().get(row, bench.system.sources[row])
            part = bench.circuit.part(signal.source)
            if part is not None and part.value is not None:
                return -part.value if part.pins[0].net == name else part.value
        return bench.forced_volts().get(name, 0.0)

    def _gain(self, name: str, index: int, hertz: float = 0.0, *, midband: bool = False) -> complex:
        key = (hertz, midband)
        if key not in self._responses:
            self._responses[key] = self._solve(hertz, midband)
        found = self._responses[key].get(name)
        return 0j if found is None else complex(found[index])

    def _solve(self, hertz: float, midband: bool) -> dict[str, numpy.ndarray]:
        import numpy as np

        bench = self.bench
        system = bench.system
        names = list(bench.circuit.signals)
        right = np.zeros((system.size, len(names)))
        for column, name in enumerate(names):
            row, sign = self.drive_row(name)
            if row >= 0:
                right[row, column] = sign
        found = bench.whole(hertz, midband=midband).factors.solve(right)
        return {name: found[:, column] for column, name in enumerate(names)}

    def drive_row(self, name: str) -> tuple[int, float]:
        """Return the row that a unit of a signal is written into, and its sign; -1 when nothing takes it."""
        bench = self.bench
        system = bench.system
        signal = bench.circuit.signals[name]
        if signal.is_current:
            return system.index(name), 1.0
        if signal.source is not None and signal.source in system.branch_index:
            part = bench.circuit.part(signal.source)
            sign = -1.0 if part is not None and part.pins[0].net != name else 1.0
            return system.branch_index[signal.source], sign
        return system.drivers.get(name, -1), 1.0

    # circuits that are not linear

    @property
    def bent(self) -> dict[str, str]:
        """Nets that a junction or a switching output moves: superposition does not hold there."""
        if self._bent is None:
            bench = self.bench
            origins: dict[str, str] = {}
            for part in bench.system.nonlinear:
                for net in part.nets:
                    if not bench.circuit.is_stiff(net) and net not in bench.system.drivers:
                        origins[net] = part.designator
            for name in bench.switching:
                amplifier = bench.circuit.amplifier(name)
                if amplifier is not None:
                    origins[amplifier.output] = name
            steady = [net for net in bench.circuit.nets if is_bypassed_divider(bench.circuit, net)] if origins else []
            self._bent = spread_doubts(bench, origins, held=steady)
        return self._bent

    @property
    def bent_by_junctions(self) -> frozenset[str]:
        """Nets that a diode or transistor moves."""
        if self._by_junctions is None:
            bench = self.bench
            origins = {
                net: part.designator
                for part in bench.system.nonlinear
                for net in part.nets
                if not bench.circuit.is_stiff(net)
            }
            self._by_junctions = frozenset(spread_doubts(bench, origins))
        return self._by_junctions

    def _swept(self, index: int, rest: float) -> Range | Unknown:
        for name, signal in self.bench.circuit.signals.items():
            if signal.low is not None and signal.low == signal.high:
                continue
            if signal.low is None or signal.high is None:
                if abs(self._gain(name, index)) > NEGLIGIBLE:
                    return Unknown(
                        f"the extremes of the signal on {name} are not known", f"low and high of [signals.{name}]"
                    )
                continue
            at_dc, in_band = self._gain(name, index), self._gain(name, index, midband=True)
            for hertz in signal.frequencies_hz:
                at_signal = self._gain(name, index, hertz)
                in_band = at_signal if abs(at_signal) > abs(in_band) else in_band
            if abs(in_band - at_dc) > SAME_SHARE * max(abs(in_band), abs(at_dc), 1e-6):
                return Unknown(f"the signal on {name} comes over a capacitor to a circuit that is not linear")
        points = self._swept_points()
        if isinstance(points, str):
            return Unknown(points)
        values = [float(each.values[index]) for each in points]
        if max(abs(each) for each in values) > BELIEVABLE_V:
            return Unknown(RUNS_AWAY)
        return _range(min(values), max(values), rest)

    def _swept_points(self) -> list[OperatingPoint] | str:
        if self._sweep is None:
            try:
                self._sweep = [self.bench.solution, *(self._point(each) for each in self._corners())]
            except (NoOperatingPoint, SingularEquations) as trouble:
                self._sweep = f"no operating point at the ends of the signals: {trouble}"
        return self._sweep

    def _corners(self) -> Iterable[dict[str, float]]:
        known = {
            name: (signal.low, signal.high)
            for name, signal in self.bench.circuit.signals.items()
            if signal.low is not None and signal.high is not None and signal.low < signal.high
        }
        if len(known) <= 3:
            yield from (dict(zip(known, each, strict=True)) for each in itertools.product(*known.values()))
        else:
            yield {name: ends[0] for name, ends in known.items()}
            yield {name: ends[1] for name, ends in known.items()}
            for name, ends in known.items():
                yield from ({name: end} for end in ends)
        for name, (low, high) in known.items():
            yield from ({name: low + share * (high - low)} for share in (0.25, 0.5, 0.75))

    def _point(self, at: dict[str, float]) -> OperatingPoint:
        bench = self.bench
        override = dict(bench.source_overrides())
        for name, value in at.items():
            row, sign = self.drive_row(name)
            if row < 0:
                continue
            signal = bench.circuit.signals[name]
            rest = self._rest_of(name, signal)
            override[row] = override.get(row, bench.system.sources[row]) + sign * (value - rest)
        return solve_operating_point(bench.system, bench.switching, override)
