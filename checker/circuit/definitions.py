"""What a ``.subckt`` definition is: an amplifier, a package of amplifiers, a rail source, or a block to expand.

A definition is read once. In order of strength: comments that name every port, port names, the computed gain of its
body, the catalogue's pinout for its name. A body that holds amplifiers, or that ties its output back to its inputs
with resistors, is a block of a design and no amplifier.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from ..text.netlist import Subcircuit
from .bodies import BodyGain, differential_gain, is_linear
from .catalogue import Catalogue
from .clues import Clue
from .partdata import PartData
from .parts import Part, PartKind
from .roles import Roles, roles_by_names, roles_by_remarks, words_of

AMPLIFIER_KINDS = frozenset(
    {"op-amp", "comparator", "current-feedback", "instrumentation amplifier", "difference amplifier", "buffer"}
)
RAIL_KINDS = frozenset({"voltage regulator", "voltage reference", "rail splitter", "charge pump inverter"})

# Customary orders of five-node models; the shares were counted over 2,477 commented models of public collections.
STANDARD = ("IN+", "IN-", "V+", "V-", "OUT")
FIVE_PIN_ORDERS: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("customary order of models", STANDARD),
    ("order with the output third", ("IN+", "IN-", "OUT", "V+", "V-")),
    ("order with the inverting input first and the output third", ("IN-", "IN+", "OUT", "V+", "V-")),
    ("order with the output between the supplies", ("IN-", "IN+", "V-", "OUT", "V+")),
    ("customary order with exchanged inputs", ("IN-", "IN+", "V+", "V-", "OUT")),
)

# With its ports named as an amplifier's, a body of this gain is one; below, it is a finished gain stage.
LEAST_NAMED_GAIN = 50.0

_TRANSISTORS = frozenset({PartKind.BJT, PartKind.JFET, PartKind.MOSFET})
_SOURCES = frozenset({PartKind.VCVS, PartKind.VCCS, PartKind.CCCS, PartKind.CCVS, PartKind.BEHAVIOURAL})


@dataclass(frozen=True, slots=True)
class Reading:
    """``form`` is amplifier, rail source, undecided (an amplifier whose roles are not known) or block."""

    form: str
    channels: tuple[Mapping[str, int], ...] = ()
    orders: tuple[tuple[str, tuple[str, ...]], ...] = ()
    data: PartData | None = None
    evidence: str = ""
    body: BodyGain | None = None
    has_linear_body: bool = False
    is_certain: bool = False
    disagreement: str | None = None


BLOCK = Reading("block")


def read_definition(
    definition: Subcircuit, parts: Sequence[Part], clues: Mapping[str, Clue], catalogue: Catalogue, ground: str | None
) -> Reading:
    """Judge a definition by its head and its body.

    Parameters
    ----------
    definition
        The definition as written.
    parts, clues
        Its body expanded with its ports under their own names, and the opaque instances within it.
    catalogue
        Part data by name.
    ground
        Spelling of ground within the body.
    """
    ports = definition.ports
    data = catalogue.find(definition.name)
    if data is not None and data.kind in RAIL_KINDS:
        return _rail_source(definition, data)
    if data is not None and data.kind not in AMPLIFIER_KINDS:
        data = None
    if clues and not _are_own(clues, data):
        return _wrapper(definition, parts, clues)
    linear = bool(parts) and not clues and is_linear(parts)
    core = [each for each in parts if each.kind is not PartKind.DIODE]
    body = differential_gain(core, ports, ground) if not clues else None
    named = roles_by_remarks(definition.remarks, ports)
    how = "comments at its .subckt line"
    if named is None:
        named, how = roles_by_names(ports), "port names"
    if body is None and named is not None and linear:
        body = differential_gain(core, ports, ground, least=LEAST_NAMED_GAIN)
    if named is not None and data is None and _is_closed_block(parts, ports, named, body):
        return BLOCK
    if body is not None and named is None and (data is not None or not _is_tied_back(parts, ports, body)):
        return _by_body(definition, body, data, linear)
    if named is not None:
        return _by_words(named, how, definition, body, data, linear)
    if data is not None:
        return _by_part(definition, data, linear)
    kinds = {each.kind for each in parts}
    if 3 <= len(ports) <= 8 and kinds & _SOURCES and kinds & (_TRANSISTORS | {PartKind.DIODE}) and len(parts) >= 8:
        orders = FIVE_PIN_ORDERS if len(ports) == 5 else ()
        return Reading("undecided", orders=orders)
    return BLOCK


def _are_own(clues: Mapping[str, Clue], data: PartData | None) -> bool:
    """True when the inner amplifiers are pieces of a maker's model, which carry the number of the whole."""
    if data is None:
        return False
    return all(data.name.lower() in (clue.part_name or "").lower() and clue.data is None for clue in clues.values())


def _by_words(
    named: Roles, how: str, definition: Subcircuit, body: BodyGain | None, data: PartData | None, linear: bool
) -> Reading:
    ports = definition.ports
    roles = dict(named)
    disagreement = None
    if body is not None and ports.index(body.output) == roles["OUT"]:
        plus, minus = ports.index(body.plus), ports.index(body.minus)
        if (plus, minus) == (roles["IN-"], roles["IN+"]):
            roles["IN+"], roles["IN-"] = plus, minus
            disagreement = f"the {how} of `{definition.name}` exchange the inputs; the sign of its computed gain counts"
            how = "sign of the computed gain"
    return Reading(
        "amplifier", (roles,), (), data, how, body, has_linear_body=linear, is_certain=True, disagreement=disagreement
    )


def _by_body(definition: Subcircuit, body: BodyGain, data: PartData | None, linear: bool) -> Reading:
    ports = definition.ports
    roles = {"IN+": ports.index(body.plus), "IN-": ports.index(body.minus), "OUT": ports.index(body.output)}
    rest = [index for index in range(len(ports)) if index not in roles.values()]
    if len(rest) == 2:
        words = [{role for role, _ in words_of(ports[index])} for index in rest]
        if "V+" in words[0] or "V-" in words[1]:
            roles["V+"], roles["V-"] = rest
        elif "V-" in words[0] or "V+" in words[1]:
            roles["V-"], roles["V+"] = rest
    how = "computed gain of its body"
    return Reading("amplifier", (roles,), (), data, how, body, has_linear_body=linear, is_certain=True)


def _by_part(definition: Subcircuit, data: PartData, linear: bool) -> Reading:
    from .pinouts import orders_for

    ports = definition.ports
    orders = list(orders_for(data, definition.name, len(ports), is_package_line=False))
    if len(ports) == 5 and data.kind in {"op-amp", "comparator", "current-feedback"}:
        orders = [*FIVE_PIN_ORDERS, *orders]
    elif len(ports) == 3 and data.kind != "buffer":
        orders = [("customary order of models", ("IN+", "IN-", "OUT"))]
    return Reading("undecided", orders=tuple(orders), data=data, has_linear_body=linear)


def _is_closed_block(parts: Sequence[Part], ports: Sequence[str], roles: Roles, body: BodyGain | None) -> bool:
    """True for a body that is wired as a circuit: output tied back to an input, or no amplifying part at all."""
    kinds = {each.kind for each in parts}
    if parts and not kinds & (_TRANSISTORS | _SOURCES | {PartKind.OPAQUE, PartKind.AMPLIFIER}):
        return True
    output = ports[roles["OUT"]]
    gains = BodyGain(ports[roles["IN+"]], ports[roles["IN-"]], output, 0.0)
    if _is_tied_back(parts, ports, gains):
        return True
    # A linear body whose sources do not amplify the difference of the ports themselves is a finished stage.
    return bool(parts) and is_linear(parts) and body is None


def _is_tied_back(parts: Sequence[Part], ports: Sequence[str], gains: BodyGain) -> bool:
    """True when resistors lead from the output to an input by way of inner nets."""
    links: dict[str, list[str]] = {}
    for part in parts:
        if part.kind is PartKind.RESISTOR and (part.value is None or part.value < 1e8):
            first, second = part.nets
            links.setdefault(first, []).append(second)
            links.setdefault(second, []).append(first)
    goals = {gains.plus, gains.minus}
    seen, queue = {*ports, gains.output}, [gains.output]
    while queue:
        net = queue.pop()
        for other in links.get(net, ()):
            if other in goals:
                return True
            if other not in seen and other.lower() not in {"0", "gnd"}:
                seen.add(other)
                queue.append(other)
    return False


def _wrapper(definition: Subcircuit, parts: Sequence[Part], clues: Mapping[str, Clue]) -> Reading:
    """A definition that only brings the pins of its amplifiers out is a package; any other is a block."""
    positions = {port: index for index, port in enumerate(definition.ports)}
    channels: list[Mapping[str, int]] = []
    if len(parts) != len(clues):
        return BLOCK
    for clue in clues.values():
        if len(clue.channels) != 1:
            return BLOCK
        roles = {role: positions.get(clue.nets[index], -1) for role, index in clue.channels[0].items()}
        if any(roles[each] < 0 for each in ("IN+", "IN-", "OUT")) or len(set(roles.values())) < len(roles):
            return BLOCK
        channels.append(roles)
    outputs = [each["OUT"] for each in channels]
    if len(channels) < 2 or len(set(outputs)) < len(outputs):
        return BLOCK
    data = next(iter(clues.values())).data
    return Reading("amplifier", tuple(channels), (), data, "wiring of its inner amplifiers", is_certain=True)


def _rail_source(definition: Subcircuit, data: PartData) -> Reading:
    from .pinouts import rail_roles_by_names

    roles = rail_roles_by_names(definition.ports)
    if roles is None:
        return BLOCK
    return Reading("rail source", (roles,), (), data, "port names", is_certain=True)
