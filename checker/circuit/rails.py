"""Ground and rails, each with its voltage and where that came from.

A net is a rail when, in this order,

1. the intent file declares it (``declared``);
2. ideal DC sources hold it against ground and it feeds an amplifier's supply pin or a rail source, or bears a rail's
   or reference's name, or has many pins (``source``); a DC source on any other net is a signal;
3. a regulator, reference or splitter drives it (``part``);
4. its name says so and nothing else drives it (``name``); ``VCC`` and its kin are rails of unknown voltage;
5. it is fed from a rail through an inductor, a ferrite or at most 100 Ω and loads only supply pins and capacitors
   (``filtered``).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from .graph import Circuit
from .parts import Part, PartKind, Rail
from .railnames import (
    agrees_with_name,
    is_entry_name,
    is_ground_name,
    is_negative_rail_name,
    is_rail_name,
    is_reference_name,
    volts_in_name,
)

FILTER_OHM = 100.0
MANY_PINS = 5


@dataclass(frozen=True, slots=True)
class HeldNet:
    """A net that a chain of ideal voltage sources ties to ground: its DC voltage, extremes, and the sources."""

    volts: float | None
    low: float | None
    high: float | None
    sources: tuple[str, ...]
    frequencies_hz: tuple[float, ...] = ()
    is_still: bool = True


def find_grounds(circuit: Circuit, ground: str | None) -> tuple[frozenset[str], tuple[str, ...]]:
    """Return all nets taken as ground, with a sentence for each that is not the ground net itself."""
    grounds = {ground} if ground is not None else set()
    said: list[str] = []
    named = [net for net in circuit.nets if net != ground and is_ground_name(net)]
    for net in named:
        if _is_made(circuit, net):
            continue
        grounds.add(net)
        if ground is None:
            said.append(f"{net} is taken as ground by its name")
        elif _tie(circuit, net, ground) is None:
            said.append(f"{net} is a ground by its name, not joined to {ground} in the netlist; both are taken as 0 V")
    if not grounds:
        said.append("the netlist has no ground net (0 or GND)")
    return frozenset(grounds), tuple(said)


def _is_made(circuit: Circuit, net: str) -> bool:
    """True for a net of a ground's name that parts make into something else: a source, an output, a divider."""
    for part in circuit.parts_on(net):
        if part.kind is PartKind.VOLTAGE_SOURCE and part.value not in (0.0, None):
            first = part.pins[0].net
            other = part.pins[1].net if first == net else first
            # A source that stands on this net leaves it a ground; one that stands on another ground lifts it.
            if first == net and other.lower() in {"0", "gnd"}:
                return True
        if part.kind in (PartKind.VCVS, PartKind.CCVS) and net in part.nets[:2]:
            return True
        clue = circuit.clues.get(part.designator)
        if clue is not None:
            for channel in clue.channels:
                if "OUT" in channel and clue.nets[channel["OUT"]] == net:
                    return True
    dividers = [
        part
        for part in circuit.parts_on(net)
        if part.kind is PartKind.RESISTOR and (part.value is None or part.value > FILTER_OHM)
    ]
    return any(is_rail_name(other) for part in dividers for other in part.nets if other != net)


def _tie(circuit: Circuit, net: str, ground: str) -> Part | None:
    for part in circuit.parts_on(net):
        if part.kind in (PartKind.RESISTOR, PartKind.INDUCTOR, PartKind.VOLTAGE_SOURCE) and ground in part.nets:
            return part
    return None


def find_held(circuit: Circuit, grounds: Iterable[str]) -> dict[str, HeldNet]:
    """Return the nets that ideal voltage sources hold against ground, with summed voltages."""
    held: dict[str, HeldNet] = {each: HeldNet(0.0, 0.0, 0.0, ()) for each in sorted(grounds)}
    sources: dict[str, list[Part]] = {}
    for part in circuit.parts.values():
        if part.kind is PartKind.VOLTAGE_SOURCE and len(part.pins) == 2 and part.is_fitted:
            for pin in part.pins:
                sources.setdefault(pin.net, []).append(part)
    queue = list(held)
    while queue:
        net = queue.pop(0)
        base = held[net]
        for part in sources.get(net, ()):
            plus, minus = part.pins[0].net, part.pins[1].net
            other = minus if plus == net else plus
            if other in held:
                continue
            held[other] = _stacked(base, part, 1.0 if other == plus else -1.0)
            queue.append(other)
    for each in grounds:
        held.pop(each, None)
    return held


def _stacked(base: HeldNet, part: Part, sign: float) -> HeldNet:
    drive = part.drive
    dc = part.value
    low = high = dc
    frequencies: tuple[float, ...] = ()
    is_still = True
    if drive is not None:
        low, high = drive.low, drive.high
        is_still = drive.ac is None and drive.low == drive.high and drive.frequency_hz is None
        frequencies = (drive.frequency_hz,) if drive.frequency_hz is not None else ()
    if sign < 0:
        low, high = (None if high is None else 0.0 - high), (None if low is None else 0.0 - low)
        dc = None if dc is None else -dc
    return HeldNet(
        _sum(base.volts, dc),
        _sum(base.low, low),
        _sum(base.high, high),
        (*base.sources, part.designator),
        (*base.frequencies_hz, *frequencies),
        base.is_still and is_still,
    )


def _sum(first: float | None, second: float | None) -> float | None:
    return None if first is None or second is None else first + second


def likely_volts(
    circuit: Circuit, grounds: frozenset[str], held: Mapping[str, HeldNet], regulated: Mapping[str, float | None]
) -> dict[str, float | None]:
    """Nets that may be supplies, before amplifiers are known: net to voltage, None where only the net is known."""
    found: dict[str, float | None] = dict.fromkeys(sorted(grounds), 0.0)
    found.update(regulated)
    for net in circuit.nets:
        if net not in found and is_rail_name(net):
            found[net] = volts_in_name(net)
    for net, each in held.items():
        if each.is_still:
            found[net] = each.volts
    for name, volts in declared_rails(circuit).items():
        found[name] = volts
    for part in circuit.parts.values():
        if is_supply_filter(part):
            first, second = part.nets[:2]
            for inner, outer in ((first, second), (second, first)):
                if outer in found and inner not in found and outer not in grounds:
                    found[inner] = found[outer]
    return found


def declared_rails(circuit: Circuit) -> dict[str, float]:
    """Rails that the intent file declares, by the circuit's spelling of their nets."""
    intent = circuit.intent
    declared: dict[str, float] = {}
    if intent is not None:
        for name, volts in intent.rails.items():
            net = circuit.net(name)
            if net is not None:
                declared[net] = volts
    return declared


def is_supply_filter(part: Part) -> bool:
    """True for a ferrite, an inductor, or a resistor of up to 100 Ω: what may stand between a rail and its pins."""
    if len(part.pins) != 2 or not part.is_fitted:
        return False
    if part.kind is PartKind.INDUCTOR:
        return True
    return part.kind is PartKind.RESISTOR and part.value is not None and 0 <= part.value <= FILTER_OHM


def find_rails(
    circuit: Circuit,
    grounds: frozenset[str],
    held: Mapping[str, HeldNet],
    regulated: Mapping[str, Rail],
    supply_nets: frozenset[str],
    driven: frozenset[str],
    entries: frozenset[str],
) -> dict[str, Rail]:
    """Return all rails by net.

    Parameters
    ----------
    circuit
        The circuit.
    grounds, held
        Ground nets, and nets held by sources.
    regulated
        Rails that regulators, references and splitters make.
    supply_nets
        Nets on supply pins of amplifiers and on inputs of rail sources.
    driven
        Outputs of amplifiers and controlled sources.
    entries
        Nets that the intent file declares as signals; no rail unless declared as one.
    """
    declared = declared_rails(circuit)
    tolerance = circuit.intent.tolerance.get("rail") if circuit.intent is not None else None
    rails: dict[str, Rail] = {
        net: Rail(net, volts, "declared", "declared in the intent file", tolerance=tolerance)
        for net, volts in declared.items()
        if net not in grounds
    }
    has_live = any(not each.is_still for each in held.values()) or bool(entries)
    for net, each in held.items():
        if net not in rails and net not in entries and is_rail_by_source(circuit, net, each, supply_nets, has_live):
            evidence = "held by " + " and ".join(each.sources)
            rails[net] = Rail(net, each.volts, "source", evidence, tolerance=tolerance)
    for net, rail in regulated.items():
        if net not in rails and net not in grounds:
            rails[net] = rail
    for net in circuit.nets:
        if net in rails or net in grounds or net in held or net in driven or net in entries:
            continue
        if is_rail_name(net) and not _is_fed_through(circuit, net, rails):
            rails[net] = Rail(net, volts_in_name(net), "name", "by its name", tolerance=tolerance)
    _add_filtered(circuit, grounds, rails, supply_nets, driven)
    return rails


def is_rail_by_source(
    circuit: Circuit, net: str, held: HeldNet, supply_nets: frozenset[str], has_live_signal: bool
) -> bool:
    """Decide whether a net that sources hold is a rail rather than a signal (see the module's list)."""
    if not held.is_still or held.volts is None or held.volts == 0.0:
        return net in supply_nets and held.is_still
    if net in supply_nets or is_rail_name(net) or is_reference_name(net):
        return True
    if circuit.style == "board":
        return True  # the only source on a board is a battery
    source = held.sources[-1] if held.sources else ""
    bare = source.rsplit("/", 1)[-1]
    if is_rail_name(bare) or is_reference_name(bare) or agrees_with_name(net, held.volts):
        return True
    if _feeds_supply(circuit, net, supply_nets):
        return True
    if is_entry_name(net):
        return False
    if circuit.degree(net) >= MANY_PINS:
        return True
    # Beside a live signal, a still source of several volts is there to bias; alone, it is the signal.
    return has_live_signal and abs(held.volts) >= 2.0


def _feeds_supply(circuit: Circuit, net: str, supply_nets: frozenset[str]) -> bool:
    if circuit.degree(net) > 64:
        return True
    for part in circuit.parts_on(net):
        if is_supply_filter(part) and any(other in supply_nets for other in part.nets if other != net):
            return True
    return False


def _is_fed_through(circuit: Circuit, net: str, rails: Mapping[str, Rail]) -> bool:
    """True for a rail-named net that hangs on a known rail by a filter: its voltage is that of the feed."""
    if volts_in_name(net) is not None:
        return False
    return any(
        is_supply_filter(part)
        and any(other in rails and rails[other].volts is not None for other in part.nets if other != net)
        for part in circuit.parts_on(net)
    )


def _add_filtered(
    circuit: Circuit,
    grounds: frozenset[str],
    rails: dict[str, Rail],
    supply_nets: frozenset[str],
    driven: frozenset[str],
) -> None:
    queue = list(rails)
    while queue:
        feed = queue.pop(0)
        for part in circuit.parts_on(feed):
            if not is_supply_filter(part):
                continue
            net = part.nets[0] if part.nets[1] == feed else part.nets[1]
            if net in rails or net in grounds or net in driven:
                continue
            if not _is_filtered_rail(circuit, net, feed, rails, supply_nets):
                continue
            volts = rails[feed].volts
            rails[net] = Rail(
                net, volts, "filtered", f"fed from {feed} through {part.designator}", feed, rails[feed].tolerance
            )
            queue.append(net)


def _is_filtered_rail(
    circuit: Circuit, net: str, feed: str, rails: Mapping[str, Rail], supply_nets: frozenset[str]
) -> bool:
    if is_rail_name(net):
        return True
    has_supply_pin = net in supply_nets
    others = [part for part in circuit.parts_on(net) if not (is_supply_filter(part) and feed in part.nets)]
    has_filter_behind = False
    # The inner resistance of a source: whatever hangs on its far side hangs on the supply.
    is_source_resistance = circuit.degree(feed) == 2 and rails[feed].origin == "source"
    for part in others:
        if part.kind is PartKind.CAPACITOR or part.kind is PartKind.CONNECTOR or len(part.pins) == 1:
            continue
        if part.kind in (PartKind.AMPLIFIER, PartKind.REGULATOR):
            if net not in supply_nets:
                return False
            continue
        if is_supply_filter(part) and any(other in supply_nets for other in part.nets if other != net):
            has_filter_behind = True
            continue
        if not is_source_resistance:
            return False
    return has_supply_pin or has_filter_behind


def is_positive(net: str, volts: float | None) -> bool | None:
    """Tell the polarity of a supply: by its voltage, else by its name; None when neither says."""
    if volts is not None:
        return volts > 0 if volts != 0 else None
    if is_negative_rail_name(net):
        return False
    return True if is_rail_name(net) else None
