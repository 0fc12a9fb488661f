"""What stands in a circuit: grounds, rails, amplifiers, signals. The order in which they are found matters.

Sources, names and declarations tell the likely supplies; these decide the pin roles of packages; the supply pins then
tell rails from signals.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from ..errors import Problem
from .amplifiers import (
    Resolution,
    channels_of,
    is_amplifier_clue,
    kind_when_unknown,
    named_pins,
    resolve,
    undetermined,
)
from .clues import Clue
from .graph import Circuit, Findings
from .ideal import ideal_amplifier
from .parts import Amplifier, Part, PartKind, Rail, Undetermined
from .railnames import volts_in_name
from .rails import HeldNet, declared_rails, find_grounds, find_held, find_rails, likely_volts
from .regulators import rails_of_parts
from .signals import find_signals


def resolve_clues(circuit: Circuit) -> tuple[dict[str, Part], dict[str, Clue], dict[str, str]]:
    """Settle the pin roles of all opaque instances by the rails of a circuit that is still bare.

    Returns
    -------
    tuple
        Parts with their pins named, clues with their channels, and the reason for each that stays undetermined.
    """
    grounds, _ = find_grounds(circuit, circuit.ground)
    held = find_held(circuit, grounds)
    supplies = likely_volts(circuit, grounds, held, {})
    parts = dict(circuit.parts)
    clues: dict[str, Clue] = {}
    reasons: dict[str, str] = {}
    for designator, clue in circuit.clues.items():
        part = parts.get(designator)
        if part is None or not part.is_fitted:
            continue
        found = resolve(clue, supplies)
        if not found.channels:
            reasons[designator] = found.reason
            parts[designator] = kind_when_unknown(part)
            clues[designator] = clue
            continue
        parts[designator] = named_pins(part, found)
        clues[designator] = replace(
            clue,
            channels=found.channels,
            evidence=found.evidence,
            orders=(),
            ports=tuple(pin.name for pin in parts[designator].pins),
            extra={"assumption": found.assumption} if found.assumption else {},
        )
    return parts, clues, reasons


def recognize(circuit: Circuit) -> Findings:
    """Find everything that the circuit's parts and names tell."""
    ground = circuit.ground
    grounds, said = find_grounds(circuit, ground)
    held = find_held(circuit, grounds)
    amplifiers: list[Amplifier] = []
    unknown: list[Undetermined] = []
    sources: list[tuple[Clue, Mapping[str, str]]] = []
    assumptions = list(said)
    for designator, part in circuit.parts.items():
        if not part.is_fitted:
            continue
        clue = circuit.clues.get(designator)
        if clue is None:
            if part.kind is PartKind.VCVS or part.kind is PartKind.BEHAVIOURAL:
                found = ideal_amplifier(part, lambda net: net in grounds)
                if found is not None:
                    amplifiers.append(found)
        elif not clue.channels:
            reason = circuit.reasons.get(designator, "its pin roles are not known")
            unknown.append(undetermined(clue, Resolution(reason=reason)))
        elif is_amplifier_clue(clue):
            settled = Resolution(clue.channels, evidence=clue.evidence)
            amplifiers += channels_of(clue, settled, part)
            if clue.extra.get("assumption"):
                assumptions.append(clue.extra["assumption"])
        else:
            sources.append((clue, {pin.name: pin.net for pin in part.pins}))
    supply_nets = _supply_nets(amplifiers, sources)
    entries = _declared_entries(circuit)
    driven = _driven(circuit, amplifiers)
    volts = likely_volts(circuit, grounds, held, {})
    regulated = rails_of_parts(circuit, sources, volts)
    # A rail source may feed another, so a second look knows the first one's output.
    if regulated and any(rail.volts is None for rail in regulated.values()):
        known = {net: rail.volts for net, rail in regulated.items() if rail.volts is not None}
        regulated = rails_of_parts(circuit, sources, {**volts, **known}) | {
            net: rail for net, rail in regulated.items() if rail.volts is not None
        }
    rails = find_rails(circuit, grounds, held, regulated, supply_nets, driven, entries)
    signals = find_signals(circuit, grounds, held, rails, driven)
    return Findings(
        grounds,
        rails,
        {net: each.volts for net, each in held.items()},
        tuple(amplifiers),
        tuple(unknown),
        signals,
        _contradictions(circuit, rails, held),
        tuple(assumptions),
    )


def _supply_nets(amplifiers: list[Amplifier], sources: list[tuple[Clue, Mapping[str, str]]]) -> frozenset[str]:
    nets: dict[str, None] = {}
    for each in amplifiers:
        for net in (each.supply_plus, each.supply_minus):
            if net is not None:
                nets.setdefault(net)
    for _, roles in sources:
        for role in ("IN", "VIN", "V+"):
            if role in roles:
                nets.setdefault(roles[role])
    return frozenset(nets)


def _declared_entries(circuit: Circuit) -> frozenset[str]:
    if circuit.intent is None:
        return frozenset()
    nets = (circuit.net(name) for name in circuit.intent.signals)
    return frozenset(net for net in nets if net is not None)


_DRIVING = frozenset({PartKind.VCVS, PartKind.CCVS, PartKind.BEHAVIOURAL})


def _driven(circuit: Circuit, amplifiers: list[Amplifier]) -> frozenset[str]:
    nets = {each.output: None for each in amplifiers}
    for part in circuit.parts.values():
        if part.kind in _DRIVING and part.is_fitted:
            nets.update(dict.fromkeys(part.nets[:2]))
    return frozenset(nets)


def _contradictions(circuit: Circuit, rails: Mapping[str, Rail], held: Mapping[str, HeldNet]) -> tuple[Problem, ...]:
    """Rails whose name states another voltage than their source or their declaration."""
    found = []
    declared = declared_rails(circuit)
    for net, rail in rails.items():
        named = volts_in_name(net)
        if named is None or rail.volts is None or abs(named - rail.volts) <= 0.05 * abs(named) + 0.05:
            continue
        if rail.origin not in {"source", "declared", "part"}:
            continue
        source = circuit.part(held[net].sources[-1]) if net in held and held[net].sources else None
        how = "the intent file" if net in declared else rail.evidence
        found.append(
            Problem(
                "rail-name-contradicts",
                f"net {net} is named {named:g} V but stands at {rail.volts:g} V ({how})",
                source.location if source is not None else None,
                level="warning",
                because="the voltage of the source counts, not that of the name",
                cure="rename the net or correct the source",
            )
        )
    return tuple(found)
