"""Rail sources: what regulators, references, splitters and inverters make of their input.

The output voltage comes from the part number where it tells (``LM7812``, ``REF5025``, ``LM1117-3.3``), from the two
resistors of an adjustable type, and from the supplies for a splitter; otherwise the rail is known without its voltage.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from .clues import Clue
from .graph import Circuit
from .partdata import PartData
from .partnames import longest_prefix, plain_number
from .parts import PartKind, Rail

_TAIL_VOLTS = (
    re.compile(r"[-_](\d{1,2})[.V](\d{1,3})(?!\d)"),
    re.compile(r"[-_](\d)(\d)(?:\d{2})?[A-Z]?(?:[-/].*)?$"),
    re.compile(r"[-_](\d{1,2})(?:V|$|[-/])"),
    re.compile(r"[A-Z](\d)(\d)$"),
)


def fixed_volts(data: PartData, name: str) -> float | None:
    """Return the output voltage that a part number tells; None for adjustable and unclear ones.

    A voltage behind the number must be one that the family is made for.
    """
    member = longest_prefix(name, data.output_by_name)
    if member is not None:
        return data.output_by_name[member]
    plain = plain_number(name)
    family = longest_prefix(name, (data.name, *data.aliases)) or ""
    for pattern in _TAIL_VOLTS:
        match = pattern.search(plain, len(family) - 1 if family else 0)
        if match is None:
            continue
        volts = float(f"{match[1]}.{match[2]}") if pattern.groups == 2 else float(match[1])
        for each in data.fixed_output_v:
            if abs(volts - abs(each)) < 0.01:
                return each
    return data.fixed_output_v[0] if len(data.fixed_output_v) == 1 else None


def rails_of_parts(
    circuit: Circuit, clues: Sequence[tuple[Clue, Mapping[str, str]]], volts: Mapping[str, float | None]
) -> dict[str, Rail]:
    """Return the rails that rail sources make.

    Parameters
    ----------
    circuit
        The circuit.
    clues
        Each rail source with its nets by role.
    volts
        Voltages of nets known so far; ground is 0 V.
    """
    rails: dict[str, Rail] = {}
    for clue, nets in clues:
        data = clue.data
        if data is None:
            continue
        made = _output(circuit, clue, data, nets, volts)
        if made is None:
            continue
        net, value = made
        if volts.get(net, 1.0) == 0.0:
            continue
        rails.setdefault(net, Rail(net, value, "part", f"output of {clue.designator} ({clue.part_name})"))
    return rails


def _output(
    circuit: Circuit, clue: Clue, data: PartData, nets: Mapping[str, str], volts: Mapping[str, float | None]
) -> tuple[str, float | None] | None:
    name = clue.part_name or data.name
    if "CATHODE" in nets and "ANODE" in nets:
        return _shunt(circuit, data, name, nets, volts)
    output = nets.get("OUT")
    if output is None:
        return None
    source = nets.get("IN", nets.get("VIN"))
    common = nets.get("GND", nets.get("COMMON"))
    base = volts.get(common) if common is not None else 0.0
    if data.kind == "rail splitter":
        high = volts.get(source) if source is not None else None
        if data.fixed_output_v:
            return output, None if base is None else base + data.fixed_output_v[0]
        return output, None if high is None or base is None else (high + base) / 2
    if data.kind == "charge pump inverter":
        high = volts.get(nets["V+"]) if "V+" in nets else None
        return output, None if high is None else -high
    if "ADJ" in nets:
        return output, _adjusted(circuit, data, output, nets["ADJ"], volts)
    fixed = fixed_volts(data, name)
    return output, None if fixed is None or base is None else base + fixed


def _shunt(
    circuit: Circuit, data: PartData, name: str, nets: Mapping[str, str], volts: Mapping[str, float | None]
) -> tuple[str, float | None] | None:
    cathode, anode = nets["CATHODE"], nets["ANODE"]
    base = volts.get(anode)
    if base is None or cathode in volts:
        return None
    reference = data.extra.get("reference_v")
    if "REF" in nets and reference is not None:
        if nets["REF"] == cathode:
            return cathode, base + reference
        ratio = _divider(circuit, cathode, nets["REF"], anode)
        return cathode, None if ratio is None else base + reference * ratio
    fixed = fixed_volts(data, name)
    return cathode, None if fixed is None else base + fixed


def _adjusted(
    circuit: Circuit, data: PartData, output: str, adjust: str, volts: Mapping[str, float | None]
) -> float | None:
    """Output of an adjustable three-pin regulator: reference between output and adjust pin, R2 from there to ground."""
    reference = data.extra.get("reference_v")
    if reference is None:
        return None
    grounds = [net for net, value in volts.items() if value == 0.0]
    if adjust in grounds:
        return reference
    for ground in grounds:
        ratio = _divider(circuit, output, adjust, ground)
        if ratio is not None and ratio > 1:
            # The reference stands across the upper resistor: V = Vref (1 + R2/R1); the adjust current is left out.
            return reference * ratio / (ratio - 1)
    return None


def _divider(circuit: Circuit, top: str, tap: str, bottom: str) -> float | None:
    """Return (R1 + R2)/R2 of a divider of plain resistors; None when there is no such divider."""
    upper = lower = 0.0
    for part in circuit.parts_on(tap):
        if part.kind is not PartKind.RESISTOR or not part.value:
            continue
        other = part.nets[1] if part.nets[0] == tap else part.nets[0]
        if other == top:
            upper += 1 / part.value
        elif other == bottom:
            lower += 1 / part.value
    if not upper or not lower:
        return None
    return (1 / upper + 1 / lower) * lower
