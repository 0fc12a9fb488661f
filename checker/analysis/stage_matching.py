"""How well a difference stage rejects what both its inputs share.

Formulas: with a = R2/R1 and b = R4/R3 the common-mode gain is (b - a)/(1 + b), the differential gain
(a + b*(1 + a)/(1 + b))/2. The worst case takes a and b at opposite ends of their tolerance.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from ..circuit.parts import PartKind
from ..topology.stages import Stage
from .figures import Figure, Known, Unknown
from .measures import measure
from .stage_gain import TWO_SIDED, input_gains, stage_of
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench

PERFECT_DB = 200.0  # rejections beyond are rounding of the solve
_ROLES = ("inverting_input", "feedback", "noninverting_input", "reference_leg")


def divider_roles(stage: Stage) -> tuple[str, str, str, str]:
    """Return the roles of R1, R2, R3 and R4; in a stage of three amplifiers those of the last one."""
    feedback = "feedback_3" if "feedback_3" in stage.roles and "feedback" not in stage.roles else "feedback"
    return _ROLES[0], feedback, _ROLES[2], _ROLES[3]


def ratios(stage: Stage) -> tuple[float, float] | None:
    """Return R2/R1 and R4/R3 of a difference stage; None when the resistances are not known."""
    values = [stage.values.get(role) for role in divider_roles(stage)]
    if any(value is None or not 0 < value < 1e29 for value in values):
        return None
    r1, r2, r3, r4 = (float(value) for value in values if value is not None)
    return r2 / r1, r4 / r3


@measure("stage")
def ratio_mismatch(bench: Bench, subject: Subject) -> Figure:
    """|(R2/R1)/(R4/R3) - 1| of a difference stage's two dividers, nominal values."""
    stage = stage_of(subject)
    if stage.topology not in TWO_SIDED:
        return Unknown("the stage has no two dividers to match")
    found = ratios(stage)
    if found is None:
        return Unknown("the dividers lie inside the part or have no known values")
    return Known(abs(found[0] / found[1] - 1))


@measure("stage", unit="dB")
def cmrr_nominal_db(bench: Bench, subject: Subject) -> Figure:
    """20*log10 of differential over common-mode gain with nominal values, from the solve (dB); 200 at most."""
    stage = stage_of(subject)
    if stage.topology not in TWO_SIDED or len(stage.inputs) != 2:
        return Unknown("the stage has no two opposite inputs")
    found = input_gains(bench, stage)
    if isinstance(found, str):
        return Unknown(found)
    return Known(_rejection_db((found[0] - found[1]).real / 2, (found[0] + found[1]).real))


def _rejection_db(differential: float, common: float) -> float:
    if differential == 0:
        return 0.0
    if abs(common) < abs(differential) * 10 ** (-PERFECT_DB / 20):
        return PERFECT_DB
    return 20 * math.log10(abs(differential / common))


def tolerance_of(bench: Bench, designator: str) -> float | None:
    """Return the tolerance of a resistor as a fraction: its own, else the declared one; None without either."""
    part = bench.circuit.part(designator)
    if part is not None and part.tolerance is not None:
        return part.tolerance
    return bench.intent.tolerance.get("resistor")


@measure("stage", unit="dB")
def cmrr_worst_db(bench: Bench, subject: Subject) -> Figure:
    """Lowest rejection over the tolerance of the resistors, each at the end of its tolerance that hurts most (dB).

    A declared ``resistor_ratio`` tolerance (matched networks) takes the place of that of single resistors. Resistors of
    the stages ahead of the difference stage do not change its common-mode gain but raise the differential one, which
    counts at its nominal value.
    """
    stage = stage_of(subject)
    if stage.topology not in TWO_SIDED or len(stage.inputs) != 2:
        return Unknown("the stage has no two opposite inputs")
    gains = input_gains(bench, stage)
    if isinstance(gains, str):
        return Unknown(gains)
    found = ratios(stage)
    if found is None:
        return Unknown("the dividers lie inside the part or have no known values")
    spread = ratio_spread(bench, stage)
    if isinstance(spread, Unknown):
        return spread
    a, b = found
    differential = abs((gains[0] - gains[1]).real / 2)
    nominal = _differential(a, b)
    ahead = differential / nominal if nominal else 1.0  # gain of the stages in front, one for a lone difference stage
    worst = math.inf
    for first in (-1, 1):
        for second in (-1, 1):
            a_end = a * ((1 + spread[1]) / (1 - spread[0]) if first > 0 else (1 - spread[1]) / (1 + spread[0]))
            b_end = b * ((1 + spread[3]) / (1 - spread[2]) if second > 0 else (1 - spread[3]) / (1 + spread[2]))
            common = (b_end - a_end) / (1 + b_end)
            worst = min(worst, _rejection_db(_differential(a_end, b_end) * ahead, common))
    return Known(worst)


def _differential(a: float, b: float) -> float:
    return (a + b * (1 + a) / (1 + b)) / 2


def ratio_spread(bench: Bench, stage: Stage) -> tuple[float, float, float, float] | Unknown:
    """Return the relative tolerance of R1, R2, R3 and R4 as fractions, or what is missing."""
    ratio = bench.intent.tolerance.get("resistor_ratio")
    if ratio is not None:  # a ratio off by t is one resistor off by t
        return 0.0, ratio, 0.0, ratio
    found = []
    for role in divider_roles(stage):
        names = [name for name in stage.roles.get(role, ()) if _is_resistor(bench, name)]
        tolerances = [tolerance_of(bench, name) for name in names]
        if not names or any(each is None for each in tolerances):
            return Unknown("the tolerance of the resistors is not declared", "[tolerance] resistor")
        found.append(max(each for each in tolerances if each is not None))
    return found[0], found[1], found[2], found[3]


def _is_resistor(bench: Bench, name: str) -> bool:
    part = bench.circuit.part(name)
    return part is not None and part.kind is PartKind.RESISTOR


@measure("stage", kind="flag")
def has_own_dividers(bench: Bench, subject: Subject) -> Figure:
    """True when both dividers of a difference stage are drawn with known resistances."""
    return Known(ratios(stage_of(subject)) is not None)


@measure("stage")
def ratio_inverting(bench: Bench, subject: Subject) -> Figure:
    """R2/R1: feedback over input resistor on the inverting side of a difference stage."""
    found = ratios(stage_of(subject))
    return Known(found[0]) if found is not None else Unknown("the dividers have no known values")


@measure("stage")
def ratio_noninverting(bench: Bench, subject: Subject) -> Figure:
    """R4/R3: reference leg over input resistor on the non-inverting side of a difference stage."""
    found = ratios(stage_of(subject))
    return Known(found[1]) if found is not None else Unknown("the dividers have no known values")


@measure("stage", kind="words")
def divider_parts(bench: Bench, subject: Subject) -> Figure:
    """Designators of the four resistors of a difference stage."""
    stage = stage_of(subject)
    return Known(tuple(name for role in divider_roles(stage) for name in stage.roles.get(role, ())))


@measure("stage", unit="%")
def resistor_tolerance(bench: Bench, subject: Subject) -> Figure:
    """Largest tolerance among the resistors of a difference stage's dividers (fraction)."""
    spread = ratio_spread(bench, stage_of(subject))
    return spread if isinstance(spread, Unknown) else Known(max(spread))


@measure("stage", unit="%")
def tolerance_for_rejection(bench: Bench, subject: Subject) -> Figure:
    """Tolerance of the resistors at which the worst-case rejection comes to the wanted one: (1 + G)/(4 * rejection)."""
    stage = stage_of(subject)
    found = ratios(stage)
    wanted = bench.value("declared_rejection", subject)
    if found is None:
        return Unknown("the dividers have no known values")
    if wanted is None:
        limit = bench.intent.limit("difference-ratio-mismatch", "rejection")
        wanted = float(limit) if isinstance(limit, int | float) else 30.0
    ahead = 1.0
    gain = bench.value("dc_gain", subject)
    if gain and _differential(*found):
        ahead = abs(gain) / _differential(*found)
    return Known((1 + found[0]) * ahead / (4 * 10 ** (wanted / 20)))
