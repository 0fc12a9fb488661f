"""Poles, corners, bandwidth and loop gain of a stage."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from ..topology.stages import Stage
from .figures import Figure, Known, Unknown
from .measures import measure
from .stage_gain import JUNCTION_TOPOLOGIES, TWO_SIDED, current_input, formula, gain_doubt, has_no_gain, stage_of
from .stage_solver import MODAL_LIMIT
from .subjects import CURRENT_INPUT, Subject
from .transfer import Transfer

if TYPE_CHECKING:
    import numpy

    from .bench import Bench

SECOND_ORDER = frozenset(
    (
        "sallen-key-low-pass", "sallen-key-high-pass", "multiple-feedback-low-pass", "multiple-feedback-band-pass",
        "state-variable-filter", "notch-filter",
    )
)  # fmt: skip
LOWEST_HZ, HIGHEST_HZ, POINTS = 1e-4, 1e10, 280
LOOP_LOWEST_HZ, LOOP_POINTS = 0.1, 220


def stage_transfer(bench: Bench, stage: Stage, *, ideal: bool) -> Transfer | str:
    """Return the headline transfer of a stage over frequency, or why there is none."""
    key = (stage.name, ideal)
    if key not in bench.transfers:
        bench.transfers[key] = _transfer(bench, stage, ideal)
    return bench.transfers[key]


def _transfer(bench: Bench, stage: Stage, ideal: bool) -> Transfer | str:
    is_current = stage.topology in CURRENT_INPUT
    reason = (None if is_current else has_no_gain(bench, stage)) or gain_doubt(bench, stage)
    if reason is not None:
        return reason
    if stage.output is None:
        return "the stage has no output net"
    solver = bench.solver(stage)
    if is_current:
        net = current_input(bench, stage)
        found = solver.current_transfer(net, stage.output, ideal=ideal) if net is not None else None
        return "the poles of the stage could not be found" if found is None else found
    floating = [net for net in solver.system.floating if net not in stage.inputs]
    if floating:
        return f"net {floating[0]} has no DC path"
    weights = [0.0] * len(stage.inputs)
    weights[0] = 1.0
    if stage.topology in TWO_SIDED and len(stage.inputs) == 2:
        weights = [0.5, -0.5]
    found = solver.transfer(stage.inputs, stage.output, weights, ideal=ideal)
    return "the poles of the stage could not be found" if found is None else found


def peak_gain(bench: Bench, stage: Stage) -> float | None:
    """Return the signed gain where its magnitude over frequency is largest (V/V)."""
    import numpy as np

    found = stage_transfer(bench, stage, ideal=True)
    if isinstance(found, str):
        return None
    hertz = np.geomspace(LOWEST_HZ, HIGHEST_HZ, POINTS)
    size = np.abs(found.at(hertz))
    best = int(size.argmax())
    near = np.geomspace(hertz[max(best - 1, 0)], hertz[min(best + 1, POINTS - 1)], 300)
    values = found.at(near)
    top = values[int(np.abs(values).argmax())]
    return float(math.copysign(abs(top), top.real))


@measure("stage", unit="Hz", kind="numbers")
def corner_hz(bench: Bench, subject: Subject) -> Figure:
    """Natural frequencies of the poles that the stage's transfer shows, amplifiers without bandwidth (Hz), ascending.

    A pair of complex poles counts once; second-order filters report the natural frequency of their pair.
    """
    stage = stage_of(subject)
    found = stage_transfer(bench, stage, ideal=True)
    if isinstance(found, str):
        closed = formula(bench, stage, "corner_hz")
        return Known((closed,)) if closed is not None else Unknown(found)
    natural = [each[0] for each in _pairs(stage, found.poles())]
    if not natural:
        return Unknown("no capacitor shapes the response of the stage")
    return Known(tuple(natural))


@measure("stage")
def quality(bench: Bench, subject: Subject) -> Figure:
    """Quality factor of the stage's pair of poles: ``w0 / (2*|Re p|)``, or ``sqrt(p1*p2)/(p1+p2)`` for real ones."""
    stage = stage_of(subject)
    found = stage_transfer(bench, stage, ideal=True)
    if isinstance(found, str):
        return Unknown(found)
    pairs = [each for each in _pairs(stage, found.poles()) if each[1] is not None]
    if not pairs:
        return Unknown("the stage has no pair of poles")
    return Known(max(each[1] for each in pairs if each[1] is not None))


def _pairs(stage: Stage, poles: list[complex]) -> list[tuple[float, float | None]]:
    """Return natural frequency (Hz) and quality of each pole or pair; lone poles have no quality."""
    found: list[tuple[float, float | None]] = []
    real = []
    for pole in poles:
        if abs(pole.imag) > 1e-6 * abs(pole):
            if pole.imag > 0:
                found.append((abs(pole) / (2 * math.pi), abs(pole) / (2 * abs(pole.real)) if pole.real else math.inf))
        else:
            real.append(abs(pole.real))
    if stage.topology in SECOND_ORDER and len(real) == 2 and not found:
        product = math.sqrt(real[0] * real[1])
        return [(product / (2 * math.pi), product / (real[0] + real[1]))]
    found.extend((each / (2 * math.pi), None) for each in real)
    return sorted(found, key=lambda each: each[0])


@measure("stage", unit="s")
def time_constant_s(bench: Bench, subject: Subject) -> Figure:
    """Time constant that the topology is built on, from its closed form: RC of an integrator, hold of a detector (s)."""
    stage = stage_of(subject)
    closed = formula(bench, stage, "time_constant_s")
    if closed is not None:
        return Known(closed)
    return Unknown("the topology has no time constant of its own")


@measure("stage", unit="Hz")
def bandwidth_hz(bench: Bench, subject: Subject) -> Figure:
    """Frequency at which the gain has fallen by 3 dB from the pass band, amplifiers with their gain-bandwidth (Hz)."""
    import numpy as np

    stage = stage_of(subject)
    found = stage_transfer(bench, stage, ideal=False)
    if isinstance(found, str):
        return Unknown(found)
    if not found.poles():
        names = ", ".join(stage.amplifiers)
        return Unknown(f"the gain-bandwidth product of {names} is not known", f"part data of {names}")
    hertz = np.geomspace(LOWEST_HZ, HIGHEST_HZ, POINTS)
    size = np.abs(found.at(hertz))
    reference = _reference_level(size)
    above = np.nonzero(size >= reference / math.sqrt(2))[0]
    last = int(above[-1])
    if last + 1 >= POINTS:
        names = ", ".join(stage.amplifiers)
        return Unknown(
            f"nothing limits the bandwidth: the gain-bandwidth product of {names} is not known", f"part data of {names}"
        )
    low, high = float(hertz[last]), float(hertz[last + 1])
    for _ in range(3):  # each round narrows the bracket 47 times
        fine = np.geomspace(low, high, 48)
        place = int(np.nonzero(np.abs(found.at(fine)) >= reference / math.sqrt(2))[0][-1])
        low, high = float(fine[place]), float(fine[min(place + 1, 47)])
    return Known(math.sqrt(low * high))


def _reference_level(size: numpy.ndarray) -> float:
    """Return the pass-band level of a sampled magnitude: DC where the stage passes it, else the flattest high part."""
    import numpy as np

    if size[0] > 0.5 * size.max() or size[0] > 1e-3 * size.max() and _is_flat(size[:50]):
        return float(size[0])
    slope = np.abs(np.diff(np.log(np.maximum(size, 1e-300))))
    high = size[:-1] > 0.7 * size.max()
    if not high.any():
        return float(size.max())
    index = int(np.where(high, slope, np.inf).argmin())
    return float(size[index])


def _is_flat(size: numpy.ndarray) -> bool:
    return bool(abs(size[-1] / size[0] - 1) < 0.01)


@measure("stage", unit="deg")
def phase_margin_deg(bench: Bench, subject: Subject) -> Figure:
    """Smallest phase margin over the stage's amplifiers: 180 deg plus the phase of the return ratio at its crossover."""
    margins = []
    stage = stage_of(subject)
    for name in stage.amplifiers:
        found = loop_crossing(bench, stage, name)
        if isinstance(found, Unknown):
            return found
        if found is not None:
            margins.append(found[1])
    return Known(min(margins)) if margins else Unknown("the loop gain never passes one")


@measure("stage", unit="Hz")
def crossover_hz(bench: Bench, subject: Subject) -> Figure:
    """Frequency at which the magnitude of the return ratio of the stage's first amplifier passes one (Hz)."""
    stage = stage_of(subject)
    if not stage.amplifiers:
        return Unknown("the stage has no amplifier")
    found = loop_crossing(bench, stage, stage.amplifiers[0])
    if isinstance(found, Unknown):
        return found
    return Known(found[0]) if found is not None else Unknown("the loop gain never passes one")


@measure("stage", unit="dB")
def gain_margin_db(bench: Bench, subject: Subject) -> Figure:
    """Distance of the return ratio from one where its phase reaches 180 deg (dB)."""
    import numpy as np

    stage = stage_of(subject)
    if not stage.amplifiers:
        return Unknown("the stage has no amplifier")
    found = _loop(bench, stage, stage.amplifiers[0])
    if isinstance(found, Unknown):
        return found
    _, ratio = found
    phase = np.degrees(np.unwrap(np.angle(ratio)))
    phase -= 360 * np.round(phase[0] / 360)
    below = np.nonzero((phase[:-1] > -180) & (phase[1:] <= -180))[0]
    if not len(below):
        return Unknown("the phase of the loop gain does not reach 180 deg")
    index = int(below[0])
    share = (phase[index] + 180) / (phase[index] - phase[index + 1])
    size = math.log10(abs(ratio[index])) * (1 - share) + math.log10(abs(ratio[index + 1])) * share
    return Known(-20 * size)


def _loop(bench: Bench, stage: Stage, name: str) -> tuple[numpy.ndarray, numpy.ndarray] | Unknown:
    import numpy as np

    if name in bench.switching:
        return Unknown("the stage switches: no loop is closed")
    if stage.topology in JUNCTION_TOPOLOGIES:
        return Unknown("the loop depends on which diodes conduct")
    if stage.topology == "unrecognized" and bench.solver(stage).system.nonlinear:
        return Unknown("diodes or transistors stand in a loop that is not recognized")
    reason = gain_doubt(bench, stage)
    if reason is not None:
        return Unknown(reason)
    amplifier = bench.circuit.amplifier(name)
    solver = bench.solver(stage)
    row = solver.row_of(name)
    if amplifier is None or row is None or row.is_packaged:
        return Unknown("the loop lies inside the part")
    if not row.has_body and name not in bench.gain_bandwidth_hz:
        return Unknown(f"the gain-bandwidth product of {name} is not known", f"part data of {name}")
    if row.has_body and not solver.system.storages.values:
        return Unknown(f"the bandwidth of {name} is not known", f"part data of {name}")
    if solver.system.size > MODAL_LIMIT:
        return Unknown("the region of the stage is too large for its loop gain")
    hertz = np.geomspace(LOOP_LOWEST_HZ, HIGHEST_HZ, LOOP_POINTS)
    ratio = solver.loop_gain(name, hertz)
    return Unknown("the loop gain could not be computed") if ratio is None else (hertz, ratio)


def loop_crossing(bench: Bench, stage: Stage, name: str) -> tuple[float, float] | None | Unknown:
    """Return crossover (Hz) and phase margin (deg) of one amplifier; None when the loop gain stays below one."""
    import numpy as np

    found = _loop(bench, stage, name)
    if isinstance(found, Unknown):
        return found
    hertz, ratio = found
    size = np.abs(ratio)
    if size[0] < 1:
        return None if not (size >= 1).any() else Unknown("the loop gain rises through one")
    crossings = np.nonzero((size[:-1] >= 1) & (size[1:] < 1))[0]
    if not len(crossings):
        return Unknown("the loop gain does not fall below one")
    worst: tuple[float, float] | None = None
    solver = bench.solver(stage)
    sign = 1.0 if ratio[0].real > 0 else -1.0
    if sign < 0:
        return Unknown("the feedback is positive at DC")
    for index in crossings:
        low, high = float(hertz[index]), float(hertz[index + 1])
        fine = np.geomspace(low, high, 60)
        inner = solver.loop_gain(name, fine)
        if inner is None:
            return Unknown("the loop gain could not be computed")
        place = int(np.nonzero(np.abs(inner) >= 1)[0][-1])
        following = min(place + 1, len(fine) - 1)
        above, below = math.log(abs(inner[place])), math.log(abs(inner[following]))
        share = above / (above - below) if above != below else 0.0
        at = math.exp(math.log(fine[place]) * (1 - share) + math.log(fine[following]) * share)
        phase = np.unwrap(np.concatenate([np.angle(ratio[: index + 1]), [np.angle(inner[place])]]))
        margin = 180 + math.degrees(float(phase[-1] - 2 * math.pi * round(float(phase[0]) / (2 * math.pi))))
        if worst is None or margin < worst[1]:
            worst = (at, margin)
    return worst


@measure("stage", unit="dB")
def peaking_db(bench: Bench, subject: Subject) -> Figure:
    """How far the magnitude over frequency rises above its pass-band level, amplifiers with their bandwidth (dB)."""
    import numpy as np

    found = stage_transfer(bench, stage_of(subject), ideal=False)
    if isinstance(found, str):
        return Unknown(found)
    if not found.poles():
        return Unknown("nothing shapes the response of the stage")
    size = np.abs(found.at(np.geomspace(LOWEST_HZ, HIGHEST_HZ, 4 * POINTS)))
    reference = _reference_level(size)
    return (
        Known(max(0.0, 20 * math.log10(size.max() / reference)))
        if reference > 0
        else Unknown("the stage passes nothing")
    )
