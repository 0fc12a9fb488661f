"""Amplifiers from clues: the roles of pins on evidence, one :class:`Amplifier` for each channel.

Roles that a definition gives are taken as they are. Where a line only lists nets, every customary order is held
against the rails: the supply pins must sit on supplies of the right polarity and no output may sit on a rail. If one
order is left it counts; where several are left, the part stays undetermined and the reviewer is told what to declare.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from .assemble import unique_names
from .clues import Clue
from .definitions import AMPLIFIER_KINDS, FIVE_PIN_ORDERS, RAIL_KINDS, STANDARD
from .partdata import PartData
from .parts import Amplifier, Part, PartKind, Pin, Undetermined
from .pinouts import split_channels
from .railnames import is_negative_rail_name, is_rail_name

DEFAULT_GAIN = 1e5
OPEN_STAGES = frozenset({"open-collector", "open-drain"})

Supplies = Mapping[str, float | None]
"""Nets that may be supplies, with their voltage where it is known; ground is 0 V."""


@dataclass(frozen=True, slots=True)
class Resolution:
    """What became of a clue: channels with their roles and the evidence, or the reason why there are none."""

    channels: tuple[Mapping[str, int], ...] = ()
    roles: tuple[str, ...] = ()
    evidence: str = ""
    reason: str = ""
    assumption: str | None = None


def resolve(clue: Clue, supplies: Supplies) -> Resolution:
    """Find the roles of an instance's pins."""
    if clue.channels:
        channels = tuple(_with_supplies(each, clue, supplies) for each in clue.channels)
        return Resolution(channels, (), f"pins by the {clue.evidence}")
    name = clue.part_name or "its part"
    if not clue.orders:
        return Resolution(reason=f"no pinout of {name} with {len(clue.nets)} pins is known")
    fitting: list[tuple[str, tuple[str, ...], int]] = []
    objection = ""
    for text, roles in clue.orders:
        score, why = _judge(roles, clue.nets, supplies)
        if score < 0:
            objection = objection or f"by the {text} {why}"
        else:
            fitting.append((text, roles, score))
    if not fitting:
        return Resolution(reason=f"its pins do not fit {name}: {objection}")
    best = max(score for _, _, score in fitting)
    kept = [each for each in fitting if each[2] == best]
    different = {_meaning(roles, clue.nets) for _, roles, _ in kept}
    text, roles, score = kept[0]
    assumption = None
    if len(different) > 1:
        standard = [each for each in kept if each[1] == STANDARD]
        if clue.data is not None and clue.data.kind in RAIL_KINDS and kept[0][0].endswith(clue.data.name):
            standard, different = kept[:1], set()
        if not standard or (different and not _differ_in_inputs(different)):
            words = " or ".join(" ".join(each) for _, each, _ in kept[:3])
            return Resolution(reason=f"its {len(clue.nets)} nets fit several pin orders of {name}: {words}")
        text, roles, score = standard[0]
        if different:
            assumption = f"{clue.designator}: inputs of {name} are taken in {text}, IN+ first"
    if score == 0 and _is_customary(roles, clue.orders) and {"V+", "V-"} <= set(roles):
        return Resolution(
            reason=f"nothing shows which of the {len(clue.nets)} nets of {name} are its supplies",
        )
    count = clue.data.channels_of(clue.part_name or "") if clue.data is not None else None
    outputs = sum(1 for role in roles if role.startswith("OUT") and role[3:].isdigit())
    channels = split_channels(roles, max(outputs, 1) if count is None or outputs else 1)
    evidence = f"pins by the {text}" + ("; its supply pins sit on supplies" if score > 0 else "")
    return Resolution(channels, roles, evidence, assumption=assumption)


def _is_customary(roles: tuple[str, ...], orders: Sequence[tuple[str, tuple[str, ...]]]) -> bool:
    return any(roles == each for _, each in FIVE_PIN_ORDERS) and len(orders) > 1


def _differ_in_inputs(meanings: set[tuple[tuple[str, str], ...]]) -> bool:
    rest = {tuple(pair for pair in each if not pair[0].startswith("IN")) for each in meanings}
    return len(rest) == 1


def _meaning(roles: Sequence[str], nets: Sequence[str]) -> tuple[tuple[str, str], ...]:
    """What an order says about nets, apart from pins that do not matter."""
    core = [
        (role, net) for role, net in zip(roles, nets, strict=True) if role[:2] in {"IN", "OU", "V+", "V-", "RE", "RG"}
    ]
    return tuple(sorted(core))


def _judge(roles: Sequence[str], nets: Sequence[str], supplies: Supplies) -> tuple[int, str]:
    """Score an order: below zero when it contradicts the rails, above when the supply pins sit on supplies."""
    by_role: dict[str, str] = {}
    for role, net in zip(roles, nets, strict=True):
        by_role.setdefault(role, net)
    plus, minus = by_role.get("V+"), by_role.get("V-")
    outputs = [net for role, net in by_role.items() if role == "OUT" or (role.startswith("OUT") and role[3:].isdigit())]
    for output in outputs:
        if "IN" in by_role or "VIN" in by_role:
            continue
        if output in supplies and supplies[output] != 0.0 and not _is_reference(output):
            return -1, f"an output would sit on the rail {output}"
        if supplies.get(output, 1.0) == 0.0:
            return -1, f"an output would sit on ground ({output})"
    if plus is None or minus is None:
        return _judge_source(by_role, supplies)
    if plus == minus:
        return -1, f"both supply pins would sit on {plus}"
    high, low = _polarity(plus, supplies), _polarity(minus, supplies)
    if high is not None and high <= 0:
        return -1, f"V+ would sit on {plus}"
    if low is not None and low > 0:
        return -1, f"V- would sit on {minus}"
    volts_high, volts_low = supplies.get(plus), supplies.get(minus)
    if volts_high is not None and volts_low is not None and volts_high <= volts_low:
        return -1, f"V+ would sit on {plus}, below V- on {minus}"
    return int(high is not None) + int(low is not None), ""


def _judge_source(by_role: Mapping[str, str], supplies: Supplies) -> tuple[int, str]:
    """Score the order of a three-pin rail source: common pin on ground, input on a supply beyond the output."""
    source, output = by_role.get("IN", by_role.get("VIN")), by_role.get("OUT")
    if source is None or output is None:
        return 0, ""
    common = by_role.get("GND", by_role.get("COMMON"))
    score = 0
    if supplies.get(source, 1.0) == 0.0:
        return -1, f"its input would sit on ground ({source})"
    if common is not None and common in supplies:
        if supplies[common] not in (0.0, None):
            return -1, f"its common pin would sit on {common}"
        score += 1
    volts_in, volts_out = supplies.get(source), supplies.get(output)
    if volts_in is not None and volts_out is not None and abs(volts_in) <= abs(volts_out):
        return -1, f"its input {source} would stand below its output {output}"
    if source in supplies:
        score += 1
    return score, ""


def _is_reference(net: str) -> bool:
    return not is_rail_name(net)


def _polarity(net: str, supplies: Supplies) -> int | None:
    """Sign of a net as a supply: 1, 0 (ground), -1; None when it is no supply as far as one can see."""
    if net not in supplies:
        return None
    volts = supplies[net]
    if volts is None:
        return -1 if is_negative_rail_name(net) else 1
    return (volts > 0) - (volts < 0)


def _with_supplies(roles: Mapping[str, int], clue: Clue, supplies: Supplies) -> Mapping[str, int]:
    """Tell V+ from V- among two left-over ports by the voltages of their nets."""
    if "V+" in roles or len(clue.ports) != 5 or len(roles) != 3:
        return roles
    first, second = (index for index in range(5) if index not in roles.values())
    one, two = _polarity(clue.nets[first], supplies), _polarity(clue.nets[second], supplies)
    if one is None or two is None or one == two:
        return roles
    high, low = (first, second) if one > two else (second, first)
    return {**roles, "V+": high, "V-": low}


def named_pins(part: Part, resolution: Resolution) -> Part:
    """Return the part with its pins named by their roles."""
    if resolution.roles:
        names = unique_names(resolution.roles)
    elif len(resolution.channels) == 1:
        held = {index: role for role, index in resolution.channels[0].items()}
        names = unique_names(held.get(index, pin.name) for index, pin in enumerate(part.pins))
    else:
        numbered: dict[int, str] = {}
        for number, channel in enumerate(resolution.channels, 1):
            for role, index in channel.items():
                core = {"IN+": f"IN{number}+", "IN-": f"IN{number}-", "OUT": f"OUT{number}"}
                numbered.setdefault(index, core.get(role, role))
        names = unique_names(numbered.get(index, pin.name) for index, pin in enumerate(part.pins))
    pins = tuple(Pin(name, pin.net) for name, pin in zip(names, part.pins, strict=True))
    return replace(part, pins=pins)


def channels_of(clue: Clue, resolution: Resolution, part: Part) -> list[Amplifier]:
    """Return the amplifiers of a resolved instance; ``U1A``, ``U1B`` … when it holds several."""
    data = clue.data
    found = []
    several = len(resolution.channels) > 1
    for number, roles in enumerate(resolution.channels):
        nets = {role: part.pins[index].net for role, index in roles.items()}
        amplifier = _amplifier(clue, data, nets, f"{clue.designator}{chr(65 + number)}" if several else clue.designator)
        if amplifier is not None:
            found.append(replace(amplifier, evidence=resolution.evidence))
    return found


_OWN = frozenset({"IN+", "IN-", "OUT", "V+", "V-"})


def _amplifier(clue: Clue, data: PartData | None, nets: Mapping[str, str], name: str) -> Amplifier | None:
    output = nets.get("OUT")
    plus = nets.get("IN+", nets.get("IN"))
    minus = nets.get("IN-")
    kind = data.kind if data is not None else _kind_by_roles(clue, nets)
    if minus is None and kind == "buffer":
        minus = output
    if output is None or plus is None or minus is None:
        return None
    gain, origin = DEFAULT_GAIN, "assumed"
    if clue.gain is not None and abs(clue.gain) > 0:
        gain, origin = abs(clue.gain), "netlist"
    elif data is not None and data.open_loop_gain_db is not None:
        gain, origin = 10 ** (data.open_loop_gain_db / 20), "part"
    return Amplifier(
        name,
        clue.designator,
        kind,
        plus,
        minus,
        output,
        clue.location,
        nets.get("V+"),
        nets.get("V-"),
        tuple((role, net) for role, net in nets.items() if role not in _OWN and role != "IN"),
        clue.part_name,
        data,
        gain,
        origin,
        clue.inner,
        is_open_output=data is not None and data.output_stage in OPEN_STAGES,
    )


def _kind_by_roles(clue: Clue, nets: Mapping[str, str]) -> str:
    if "RG" in nets or {"REF", "RG2"} <= nets.keys():
        return "instrumentation amplifier"
    if "REF" in nets and "SENSE" in nets:
        return "difference amplifier"
    name = (clue.part_name or "").lower()
    return "comparator" if "comp" in name and "compens" not in name else "op-amp"


def undetermined(clue: Clue, resolution: Resolution) -> Undetermined:
    """Say why an instance could not be read and what to declare."""
    name = clue.part_name or "NAME"
    if len(clue.nets) == 5:
        what = f'[parts.{name}] with kind = "op-amp" and pin_order = "IN+ IN- V+ V- OUT" in the order of its nets'
    else:
        what = f'[parts.{name}] with kind and pinouts, such as pinouts = {{ single8 = "IN- 2 IN+ 3 V- 4 OUT 6 V+ 7" }}'
    return Undetermined(clue.designator, resolution.reason, what, clue.location)


def is_amplifier_clue(clue: Clue) -> bool:
    """True for a clue about an amplifier, false for one about a rail source."""
    return clue.data is None or clue.data.kind in AMPLIFIER_KINDS


def kind_when_unknown(part: Part) -> Part:
    """Return the part as an opaque one: nothing is computed through it."""
    return replace(part, kind=PartKind.OPAQUE)
