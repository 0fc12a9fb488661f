"""Nonlinear parts for the operating point: currents and conductances at given voltages.

Each device gives the currents into its terminals and their derivatives; :class:`Device` remembers junction voltages
from step to step so that exponentials are limited.

References
----------
Shockley's diode law; Ebers-Moll transport equations with Early effect; Shichman-Hodges square law for field-effect
transistors; junction limiting after L. Nagel, "SPICE2", memorandum ERL-M520, 1975 (from memory).
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from ..circuit.parts import Part, PartKind
from .system import GMIN_S

BOLTZMANN_J_PER_K = 1.380649e-23  # SI, exact
CHARGE_C = 1.602176634e-19  # SI, exact
TEMPERATURE_K = 300.15  # 27 degC, the usual reference of models


def thermal_voltage(kelvin: float = TEMPERATURE_K) -> float:
    """Return kT/q in volt."""
    return BOLTZMANN_J_PER_K * kelvin / CHARGE_C


_VT = thermal_voltage()


def limit_junction(new: float, old: float, scale: float, critical: float) -> float:
    """Return a junction voltage that moved no further than its exponential allows."""
    if new <= critical or abs(new - old) <= 2 * scale:
        return new
    if old > 0:
        arg = 1 + (new - old) / scale
        return old + scale * math.log(arg) if arg > 0 else critical
    return scale * math.log(new / scale) if new > scale else critical


def exponential(voltage: float, scale: float) -> tuple[float, float]:
    """Return ``exp(v/scale) - 1`` and its derivative, continued by a straight line above 80 scales."""
    ratio = voltage / scale
    if ratio > 80:
        top = math.exp(80.0)
        return top * (1 + ratio - 80) - 1, top / scale
    grown = math.exp(ratio) if ratio > -80 else 0.0
    return grown - 1, grown / scale


Terminals = tuple[float, ...]


class Device:
    """One nonlinear part: ``nets`` of its terminals; :meth:`at` gives currents and conductances."""

    def __init__(self, part: Part) -> None:
        self.part = part
        self.nets: tuple[str, ...]
        self.params: Mapping[str, float] = part.model.params if part.model is not None else {}
        self.area = part.value if part.value is not None and part.value > 0 else 1.0
        self.last: list[float] = []
        kind = part.kind
        if kind is PartKind.DIODE:
            self.nets = part.nets[:2]
            self.at = self._diode
            self.last = [0.0, 0.0]
        elif kind is PartKind.BJT:
            self.nets = part.nets[:3]
            self.at = self._bipolar
            self.last = [0.0, 0.0]
        else:
            self.nets = part.nets[:3]
            self.at = self._square_law
            self.last = [0.0]
        name = part.model.kind.upper() if part.model is not None else ""
        self.sign = -1.0 if name in {"PNP", "PJF", "PMOS"} else 1.0
        self.is_settled = True

    def reset(self) -> None:
        """Forget the junction voltages of an earlier solve."""
        self.last = [0.0] * len(self.last)

    def _get(self, name: str, default: float) -> float:
        value = self.params.get(name)
        return default if value is None else value

    def _limited(self, index: int, new: float, scale: float, saturation: float) -> float:
        critical = scale * math.log(scale / (math.sqrt(2) * saturation)) if saturation > 0 else 1.0
        limited = limit_junction(new, self.last[index], scale, critical)
        if abs(limited - new) > 1e-9 + 1e-6 * abs(new):
            self.is_settled = False
        self.last[index] = limited
        return limited

    def _diode(self, volts: Terminals) -> tuple[list[float], list[list[float]]]:
        """Anode, cathode."""
        saturation = self._get("is", 1e-14) * self.area
        scale = self._get("n", 1.0) * _VT
        breakdown = self.params.get("bv")
        wanted = volts[0] - volts[1]
        self.is_settled = True
        if breakdown is not None and breakdown > 0 and wanted < -breakdown / 2:
            # reverse conduction rises like the junction itself, from the current that the model states at breakdown
            start = self._get("ibv", 1e-3) * self.area
            over = self._limited(1, -wanted - breakdown, scale, start)
            grown, slope = exponential(over, scale)
            current = -start * (grown + 1)
            conductance = start * slope
            at = -over - breakdown
        else:
            at = self._limited(0, wanted, scale, saturation)
            grown, slope = exponential(at, scale)
            current, conductance = saturation * grown, saturation * slope
        current += GMIN_S * at
        conductance += GMIN_S
        current += conductance * (wanted - at)
        return [current, -current], [[conductance, -conductance], [-conductance, conductance]]

    def _bipolar(self, volts: Terminals) -> tuple[list[float], list[list[float]]]:
        """Collector, base, emitter."""
        sign = self.sign
        saturation = self._get("is", 1e-16) * self.area
        forward, reverse = self._get("bf", 100.0), self._get("br", 1.0)
        scale_f, scale_r = self._get("nf", 1.0) * _VT, self._get("nr", 1.0) * _VT
        early = self.params.get("vaf", self.params.get("va"))
        self.is_settled = True
        wanted_be, wanted_bc = sign * (volts[1] - volts[2]), sign * (volts[1] - volts[0])
        v_be = self._limited(0, wanted_be, scale_f, saturation)
        v_bc = self._limited(1, wanted_bc, scale_r, saturation)
        grown_f, slope_f = exponential(v_be, scale_f)
        grown_r, slope_r = exponential(v_bc, scale_r)
        i_f, g_f = saturation * grown_f, saturation * slope_f
        i_r, g_r = saturation * grown_r, saturation * slope_r
        factor, d_factor = 1.0, 0.0
        if early:
            factor = max(1.0 - v_bc / early, 1e-3)
            d_factor = -1.0 / early if factor > 1e-3 else 0.0
        transport = (i_f - i_r) * factor
        collector = transport - i_r / reverse - GMIN_S * v_bc
        base = i_f / forward + i_r / reverse + GMIN_S * (v_be + v_bc)
        dc_be = g_f * factor
        dc_bc = -g_r * factor + (i_f - i_r) * d_factor - g_r / reverse - GMIN_S
        db_be = g_f / forward + GMIN_S
        db_bc = g_r / reverse + GMIN_S
        collector += dc_be * (wanted_be - v_be) + dc_bc * (wanted_bc - v_bc)
        base += db_be * (wanted_be - v_be) + db_bc * (wanted_bc - v_bc)
        currents = [sign * collector, sign * base, -sign * (collector + base)]
        rows = []
        for be, bc in ((dc_be, dc_bc), (db_be, db_bc)):
            rows.append([-bc, be + bc, -be])
        rows.append([-(rows[0][i] + rows[1][i]) for i in range(3)])
        return currents, rows

    def _square_law(self, volts: Terminals) -> tuple[list[float], list[list[float]]]:
        """Drain, gate, source; level 1 for MOSFETs, square law for JFETs."""
        sign = self.sign
        is_mosfet = self.part.kind is PartKind.MOSFET
        if is_mosfet:
            threshold = sign * self._get("vto", 0.0 if "vto" in self.params else sign * 1.0)
            size = self.part.params
            gain = (
                self._get("kp", 2e-5) * size.get("w", 1.0) / size.get("l", 1.0) * self.area
                if "w" in size and "l" in size
                else self._get("kp", 2e-5) * self.area
            )
        else:
            threshold = self._get("vto", -2.0)
            gain = 2 * self._get("beta", 1e-4) * self.area
        channel = self._get("lambda", 0.0)
        self.is_settled = True
        v_d, v_g, v_s = (sign * each for each in volts)
        is_reversed = v_d < v_s
        if is_reversed:
            v_d, v_s = v_s, v_d
        v_gs, v_ds = v_g - v_s, v_d - v_s
        drive = v_gs - threshold
        if abs(v_gs - self.last[0]) > 1.0:  # steps beyond a volt overshoot the square law
            self.is_settled = self.is_settled and abs(v_gs - self.last[0]) < 10.0
        self.last[0] = v_gs
        if drive <= 0:
            current, gm, gds = 0.0, 0.0, 0.0
        elif v_ds < drive:
            shape = gain * (drive - v_ds / 2) * v_ds
            current = shape * (1 + channel * v_ds)
            gm = gain * v_ds * (1 + channel * v_ds)
            gds = gain * (drive - v_ds) * (1 + channel * v_ds) + shape * channel
        else:
            shape = gain / 2 * drive * drive
            current = shape * (1 + channel * v_ds)
            gm = gain * drive * (1 + channel * v_ds)
            gds = shape * channel
        gds += GMIN_S
        current += GMIN_S * v_ds
        # rows in the order drain, gate, source of the channel's own direction
        drain_row = [gds, gm, -(gds + gm)]
        if is_reversed:
            drain_row = [drain_row[2], drain_row[1], drain_row[0]]
            currents = [-sign * current, 0.0, sign * current]
            rows = [[-each for each in drain_row], [0.0, 0.0, 0.0], drain_row]
        else:
            currents = [sign * current, 0.0, -sign * current]
            rows = [drain_row, [0.0, 0.0, 0.0], [-each for each in drain_row]]
        if not is_mosfet:
            self._add_gate(volts, currents, rows)
        return currents, rows

    def _add_gate(self, volts: Terminals, currents: list[float], rows: list[list[float]]) -> None:
        """Add the gate junctions of a JFET, as diodes to source and drain."""
        saturation = self._get("is", 1e-14) * self.area
        for other in (0, 2):
            wanted = self.sign * (volts[1] - volts[other])
            grown, slope = exponential(min(wanted, 0.75), _VT)
            current = saturation * grown + GMIN_S * wanted
            conductance = saturation * slope + GMIN_S
            currents[1] += self.sign * current
            currents[other] -= self.sign * current
            rows[1][1] += conductance
            rows[1][other] -= conductance
            rows[other][other] += conductance
            rows[other][1] -= conductance
