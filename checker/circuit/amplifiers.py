"""Amplifiers: instances of amplifier definitions, packages by their pinout, bare high-gain sources."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from .catalogue import Catalogue
from .flatten import FlatAmplifier
from .graph import Circuit
from .macromodels import HIGH_GAIN
from .partdata import PartData, Pinout
from .parts import Amplifier, Part, PartKind, Pin, Undetermined

SIGNAL_KINDS = frozenset(
    {"op-amp", "comparator", "current-feedback", "instrumentation amplifier", "difference amplifier", "buffer"}
)

_AMPLIFIER_LIKE = re.compile(r"op.?amp|^(?:OPA|AD8|LM[23]|TL|MCP6|NE55|LT1|INA|MAX4|TLV|LMV|TS)\d", re.IGNORECASE)

_MAKERS_ORDER = ("IN+", "IN-", "V+", "V-", "OUT")


def name_package_pins(part: Part, data: PartData, pinout: Pinout) -> Part:
    """Return the part with its pins named by their roles."""
    roles = {number: role for role, number in pinout.roles}
    pins = tuple(
        Pin(_unique(roles.get(index, f"PIN{index}"), index, pinout), pin.net) for index, pin in enumerate(part.pins, 1)
    )
    kind = PartKind.AMPLIFIER if data.kind in SIGNAL_KINDS else PartKind.REGULATOR
    return Part(
        designator=part.designator,
        kind=kind,
        pins=pins,
        location=part.location,
        part_name=part.part_name,
        params=part.params,
        marks=part.marks,
        is_fitted=part.is_fitted,
    )


def _unique(role: str, number: int, pinout: Pinout) -> str:
    twins = [each for each, _ in pinout.roles if each == role]
    return role if len(twins) == 1 else f"{role}@{number}"


def choose_pinout(part: Part, data: PartData, ground: str | None) -> tuple[Pinout | None, str]:
    """Return the pinout that a package instance fits, with the evidence: number of pins, supplies on different nets."""
    count = len(part.pins)
    fitting = [each for each in data.pinouts if max((number for _, number in each.roles), default=0) == count]
    if len(fitting) == 1:
        return fitting[0], f"pinout {fitting[0].package}"
    if len(fitting) > 1:
        plausible = [each for each in fitting if _supplies_differ(part, each)]
        if len(plausible) == 1:
            return plausible[0], f"pinout {plausible[0].package}"
        return None, f"{len(fitting)} pinouts of {data.name} have {count} pins"
    return None, f"no pinout of {data.name} with {count} pins is known"


def _supplies_differ(part: Part, pinout: Pinout) -> bool:
    nets = {role: part.pins[number - 1].net for role, number in pinout.roles if number <= len(part.pins)}
    outputs = {net for role, net in nets.items() if role.startswith("OUT")}
    return nets.get("V+") != nets.get("V-") and not {nets.get("V+"), nets.get("V-")} & outputs


def package_channels(part: Part, data: PartData, evidence: str) -> list[Amplifier]:
    """Return the channels of a part whose pins carry roles: ``U1A``, ``U1B`` … for several, ``U1`` for one."""
    nets = {pin.name: pin.net for pin in part.pins}
    numbers = sorted({int(match[1]) for role in nets if (match := re.match(r"^OUT(\d+)$", role))})
    channels: list[tuple[str, str, str, str]] = []
    if numbers:
        for index, number in enumerate(numbers):
            letter = chr(ord("A") + index)
            channels.append((f"{part.designator}{letter}", f"IN{number}+", f"IN{number}-", f"OUT{number}"))
    else:
        channels.append((part.designator, "IN+", "IN-", "OUT"))
    found = []
    own = {role for _, *roles in channels for role in roles}
    for name, plus, minus, output in channels:
        if plus not in nets or minus not in nets or output not in nets:
            continue
        others = tuple((role, net) for role, net in nets.items() if role not in own and role not in {"V+", "V-"})
        found.append(
            Amplifier(
                name=name,
                designator=part.designator,
                kind=data.kind,
                plus=nets[plus],
                minus=nets[minus],
                output=nets[output],
                location=part.location,
                supply_plus=nets.get("V+"),
                supply_minus=nets.get("V-"),
                others=others,
                part_name=part.part_name,
                data=data,
                gain=data_gain(data),
                gain_origin="part" if data.open_loop_gain_db is not None else "assumed",
                evidence=evidence,
                is_open_output=data.output_stage in {"open-collector", "open-drain"},
            )
        )
    return found


def data_gain(data: PartData | None) -> float:
    """Return the open-loop gain of a part, 1e5 where its data do not tell."""
    if data is None or data.open_loop_gain_db is None:
        return 1e5
    return float(10 ** (data.open_loop_gain_db / 20))


def instance_amplifier(flat: FlatAmplifier) -> Amplifier:
    """Return the amplifier of an instance whose definition is one."""
    part, shape = flat.part, flat.shape
    nets = {pin.name: pin.net for pin in part.pins}
    own = {"IN+", "IN-", "OUT", "V+", "V-"}
    gain = shape.gain if shape.gain is not None else data_gain(shape.data)
    if shape.gain is not None:
        origin = "netlist"
    else:
        origin = "part" if shape.data is not None and shape.data.open_loop_gain_db is not None else "assumed"
    return Amplifier(
        name=part.designator,
        designator=part.designator,
        kind=shape.kind,
        plus=nets["IN+"],
        minus=nets["IN-"],
        output=nets["OUT"],
        location=part.location,
        supply_plus=nets.get("V+"),
        supply_minus=nets.get("V-"),
        others=tuple((role, net) for role, net in nets.items() if role not in own),
        part_name=part.part_name,
        data=shape.data,
        gain=gain,
        gain_origin=origin,
        inner=flat.inner,
        evidence=f"pins by {shape.evidence}",
        is_open_output=shape.is_open_output,
    )


def source_amplifier(part: Part, ground: str | None) -> Amplifier | None:
    """Return the ideal amplifier that a bare high-gain voltage-controlled source stands for, or None."""
    if part.kind is not PartKind.VCVS or part.value is None or abs(part.value) < HIGH_GAIN or len(part.control) != 2:
        return None
    plus, minus = part.control
    output, reference = part.pins[0].net, part.pins[1].net
    gain = part.value
    if output == ground and reference != ground:
        output, gain = reference, -gain
    elif reference != ground:
        return None
    if gain < 0:
        plus, minus, gain = minus, plus, -gain
    return Amplifier(
        name=part.designator,
        designator=part.designator,
        kind="op-amp",
        plus=plus,
        minus=minus,
        output=output,
        location=part.location,
        gain=gain,
        gain_origin="netlist",
        evidence="a controlled source of high gain",
    )


def find_amplifiers(
    circuit: Circuit, instances: Sequence[FlatAmplifier], packages: Mapping[str, str], catalogue: Catalogue
) -> tuple[tuple[Amplifier, ...], tuple[Undetermined, ...]]:
    """Return all amplifiers in the order of the netlist, and the parts whose pins could not be told.

    ``packages`` maps the designator of each part whose pins were named by a pinout to the evidence.
    """
    by_instance = {each.part.designator: each for each in instances}
    amplifiers: list[Amplifier] = []
    undetermined: list[Undetermined] = []
    for designator, part in circuit.parts.items():
        if not part.is_fitted:
            continue
        if designator in by_instance:
            amplifiers.append(instance_amplifier(by_instance[designator]))
        elif designator in packages:
            data = catalogue.find(part.part_name)
            if data is not None and data.kind in SIGNAL_KINDS:
                amplifiers.extend(package_channels(part, data, packages[designator]))
        elif part.kind is PartKind.VCVS:
            ideal = source_amplifier(part, circuit.ground)
            if ideal is not None:
                amplifiers.append(ideal)
        elif part.kind is PartKind.OPAQUE and part.part_name:
            missing = _undetermined(part, catalogue, circuit.ground)
            if missing is not None:
                undetermined.append(missing)
    return tuple(amplifiers), tuple(undetermined)


def _undetermined(part: Part, catalogue: Catalogue, ground: str | None) -> Undetermined | None:
    name = part.part_name or ""
    data = catalogue.find(name)
    if data is None:
        if not _AMPLIFIER_LIKE.search(name):
            return None
        return Undetermined(
            part.designator,
            f"no part data for `{name}`: its pins are not known",
            f'[parts.{name}] with kind and pinouts, such as pinouts = {{ single8 = "IN- 2 IN+ 3 V- 4 OUT 6 V+ 7" }}',
            part.location,
        )
    _, reason = choose_pinout(part, data, ground)
    return Undetermined(
        part.designator, reason, f"[parts.{name}] pinouts for a package of {len(part.pins)} pins", part.location
    )
