"""Output limits of amplifiers: rails less headroom, from part data or a stated assumption."""

from __future__ import annotations

from dataclasses import dataclass

from ..circuit.graph import Circuit
from ..circuit.parts import Amplifier
from ..quantities import engineering

CONVENTIONAL_HEADROOM_V = 2.0  # rule catalogue: fallback for conventional outputs (from memory, judgement)
RAIL_TO_RAIL_HEADROOM_V = 0.1  # the same for rail-to-rail outputs


@dataclass(frozen=True, slots=True)
class OutputLimits:
    """Range of an output: ``low_v`` and ``high_v`` against ground, the headrooms, what they rest on."""

    low_v: float
    high_v: float
    low_headroom_v: float
    high_headroom_v: float
    rail_low_v: float
    rail_high_v: float
    assumptions: tuple[str, ...] = ()


def net_volts(circuit: Circuit, net: str | None) -> float | None:
    """Return the voltage of a rail or ground, None for other nets."""
    if net is None:
        return None
    if net == circuit.ground:
        return 0.0
    rail = circuit.rails.get(net)
    return rail.volts if rail is not None else None


def headrooms(amplifier: Amplifier) -> tuple[float, float, tuple[str, ...]]:
    """Return low and high output headroom (V) with the assumption made where the part data do not tell."""
    data = amplifier.data
    low = data.output_low_headroom_v if data is not None else None
    high = data.output_high_headroom_v if data is not None else None
    if amplifier.is_open_output:
        high = 0.0
    if low is not None and high is not None:
        notes: tuple[str, ...] = ()
        if data is not None and data.verified == "no":
            notes = (f"headroom of {data.name} from unverified part data",)
        return low, high, notes
    is_rail_to_rail = data is not None and data.output_stage == "rail-to-rail"
    fallback = RAIL_TO_RAIL_HEADROOM_V if is_rail_to_rail else CONVENTIONAL_HEADROOM_V
    note = f"output headroom of {engineering(fallback, 'V')} assumed for {amplifier.name}: no part data"
    return (low if low is not None else fallback, high if high is not None else fallback, (note,))


def output_limits(circuit: Circuit, amplifier: Amplifier) -> OutputLimits | None:
    """Return the range of an amplifier's output; None for ideal amplifiers and unknown rails."""
    high_rail, low_rail = net_volts(circuit, amplifier.supply_plus), net_volts(circuit, amplifier.supply_minus)
    if high_rail is None or low_rail is None:
        return None
    low, high, notes = headrooms(amplifier)
    if high_rail - high <= low_rail + low:
        return None
    return OutputLimits(low_rail + low, high_rail - high, low, high, low_rail, high_rail, notes)
