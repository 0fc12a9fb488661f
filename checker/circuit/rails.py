"""Ground and rails: which nets stand at a fixed potential, at which voltage, and how that is known.

A DC source that feeds a supply pin, or whose net is named like a supply, makes a rail; a DC source that feeds an
input is a signal or a reference (see :mod:`.signals`). A net reached from a rail through a ferrite, an inductor or up
to 100 Ω, with supply pins and capacitors as its only loads, is a filtered rail.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from ..text.intent import Intent
from .graph import Circuit
from .parts import Amplifier, Part, PartKind, Rail

FILTER_OHM = 100.0

_VOLTS = re.compile(
    r"^(?P<sign>[+-]?)(?:(?P<whole>\d+)V(?P<part>\d+)?|(?P<number>\d+(?:\.\d+)?)V)(?P<tail>[_-]?[A-Z]{0,8}\d?)$",
    re.IGNORECASE,
)
_NEGATIVE = re.compile(
    r"^(?:VEE|VSS|VNEG|V-|-V[SC]?C?|AVSS|VM|V_NEG)\w{0,3}$|^(?:NEG|MINUS|M|N)_?(\d+)V\d*", re.IGNORECASE
)
_POSITIVE = re.compile(
    r"^(?:VCC|VDD|VPOS|V\+|\+V[SC]?C?|AVDD|AVCC|DVDD|VBAT|VSUPPLY|VSUP|VS|VPP|VPWR)[\w+]{0,4}$|^(?:POS|PLUS|P)_?(\d+)V\d*",
    re.IGNORECASE,
)


def rail_name_volts(net: str) -> tuple[bool, float | None]:
    """Tell whether a net is named like a rail, and the voltage that its name gives.

    >>> rail_name_volts("+12V"), rail_name_volts("3V3"), rail_name_volts("VEE"), rail_name_volts("-5VA"), rail_name_volts("out")
    ((True, 12.0), (True, 3.3), (True, None), (True, -5.0), (False, None))
    """
    name = net.rsplit("/", 1)[-1]
    match = _VOLTS.match(name)
    if match:
        text = match["number"] or f"{match['whole']}.{match['part'] or 0}"
        return True, -float(text) if match["sign"] == "-" else float(text)
    for pattern, sign in ((_NEGATIVE, -1.0), (_POSITIVE, 1.0)):
        match = pattern.match(name)
        if match:
            return True, sign * float(match[1]) if match.lastindex and match[1] else None
    return False, None


def find_rails(circuit: Circuit, intent: Intent, supply_nets: Iterable[str]) -> dict[str, Rail]:
    """Return the rails of a circuit whose supply pins sit on ``supply_nets``."""
    supplies = {net for net in supply_nets if net != circuit.ground}
    rails: dict[str, Rail] = {}
    sources = source_volts(circuit)
    for net, (volts, source) in sources.items():
        named, _ = rail_name_volts(net)
        if net in supplies or named or _feeds_supply(circuit, net, supplies):
            rails[net] = Rail(net, volts, "source", f"source {source}")
    for name, volts in intent.rails.items():
        found = circuit.net(name)
        if found is not None and found != circuit.ground:
            rails[found] = Rail(found, volts, "declared", "intent file")
    for net in circuit.nets:
        if net in rails or net == circuit.ground or net in sources:
            continue
        named, named_volts = rail_name_volts(net)
        if named and (named_volts is not None or net in supplies):
            rails[net] = Rail(net, named_volts, "name", "named like a rail")
    _add_filtered(circuit, rails, supplies)
    return rails


def source_volts(circuit: Circuit) -> dict[str, tuple[float, str]]:
    """Return the nets that pure DC sources hold against ground, with volts and source; sources may be stacked."""
    if circuit.ground is None:
        return {}
    known: dict[str, tuple[float, str]] = {}
    level = {circuit.ground: 0.0}
    waiting = [circuit.ground]
    while waiting:
        net = waiting.pop()
        for designator, _ in circuit.pins_on(net):
            part = circuit.parts[designator]
            if not _is_dc_source(part):
                continue
            plus, minus = part.pins[0].net, part.pins[1].net
            other = minus if plus == net else plus
            if other in level or part.value is None:
                continue
            level[other] = level[net] + (part.value if other == plus else -part.value)
            known[other] = (level[other], designator)
            waiting.append(other)
    return known


def _is_dc_source(part: Part) -> bool:
    if part.kind is not PartKind.VOLTAGE_SOURCE or len(part.pins) != 2 or part.drive is None:
        return False
    drive = part.drive
    return drive.dc is not None and drive.ac is None and drive.frequency_hz is None and drive.low == drive.high


def _feeds_supply(circuit: Circuit, net: str, supplies: set[str]) -> bool:
    """True when a supply pin is reached from the net through parts that a supply filter is made of."""
    return any(other in supplies for _, other in _filter_steps(circuit, net)) if not circuit.is_hub(net) else False


def _filter_steps(circuit: Circuit, net: str) -> list[tuple[Part, str]]:
    steps = []
    for designator, _ in circuit.pins_on(net):
        part = circuit.parts[designator]
        if is_supply_filter(part):
            other = part.pins[1].net if part.pins[0].net == net else part.pins[0].net
            if other != net:
                steps.append((part, other))
    return steps


def is_supply_filter(part: Part) -> bool:
    """True for a ferrite, an inductor, or a resistor of up to 100 Ω: what may stand between a rail and its pins."""
    if len(part.pins) != 2 or not part.is_fitted:
        return False
    if part.kind is PartKind.INDUCTOR:
        return True
    return part.kind is PartKind.RESISTOR and part.value is not None and part.value <= FILTER_OHM


def _add_filtered(circuit: Circuit, rails: dict[str, Rail], supplies: set[str]) -> None:
    """Follow supply pins back through ferrites and small resistors to a rail; three steps at most."""
    for net in sorted(supplies - set(rails), key=circuit.nets.index):
        path = _path_to_rail(circuit, net, rails, supplies)
        if path is None:
            continue
        feed, parts = path
        rail = rails[feed]
        names = ", ".join(part.designator for part in parts)
        rails[net] = Rail(net, rail.volts, "filtered", f"{feed} through {names}", feed=feed)


def _path_to_rail(
    circuit: Circuit, start: str, rails: dict[str, Rail], supplies: set[str]
) -> tuple[str, list[Part]] | None:
    net, parts = start, []
    for _ in range(3):
        steps = [
            (part, other)
            for part, other in _filter_steps(circuit, net)
            if part not in parts and other != circuit.ground
        ]
        ends = [(part, other) for part, other in steps if other in rails]
        if ends:
            part, other = ends[0]
            return (other, [*parts, part]) if _loads_are_supply(circuit, net, supplies, [*parts, part]) else None
        if len(steps) != 1:
            return None
        parts.append(steps[0][0])
        net = steps[0][1]
    return None


def _loads_are_supply(circuit: Circuit, net: str, supplies: set[str], path: list[Part]) -> bool:
    on_path = {part.designator for part in path}
    for designator, _ in circuit.pins_on(net):
        part = circuit.parts[designator]
        if designator in on_path or part.kind in {
            PartKind.CAPACITOR,
            PartKind.AMPLIFIER,
            PartKind.OPAQUE,
            PartKind.CONNECTOR,
        }:
            continue
        if part.kind is PartKind.RESISTOR and (part.value or 0) > FILTER_OHM:
            continue
        if net not in supplies:
            return False
    return True


def supply_nets_of(amplifiers: Iterable[Amplifier]) -> set[str]:
    """Return the nets that supply pins sit on."""
    return {net for each in amplifiers for net in (each.supply_plus, each.supply_minus) if net is not None}
