"""Is a subcircuit an amplifier, and which of its pins is which?

Evidence is taken in this order: the names of its ports, the comment lines at its head, a linear body whose gain is
computed, the part number with the order that makers use for models of five nodes. Where names and body disagree the
body decides. Without evidence a subcircuit is no amplifier.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from ..text.netlist import ElementLine, Subcircuit
from .catalogue import Catalogue
from .linearbody import body_gains
from .partdata import PartData
from .levels import Level

HIGH_GAIN = 1000.0

_PLUS = frozenset(
    "in+ +in inp vinp inplus plus p pos noninv non ip in_p vip np vp+ inpos npos nip".split()  # noqa: SIM905
)
_MINUS = frozenset(
    "in- -in inn inm vinn vinm inminus minus m n neg inv im in_n in_m vin- vim inneg nneg nin".split()  # noqa: SIM905
)
_OUT = frozenset({"out", "o", "vout", "output", "vo", "outp", "out1", "nout"})
_VPLUS = frozenset(
    "vcc v+ vdd vs+ +vs vpos vccp 99 vplus +v vcc+ +vcc avdd avcc vpp vp 100".split()  # noqa: SIM905
)
_VMINUS = frozenset(
    "vee v- vss vs- -vs vneg vccn 50 vminus -v vcc- -vcc avss gnd vn -vee vdd- 101".split()  # noqa: SIM905
)

ROLES = ("IN+", "IN-", "OUT", "V+", "V-")
_CUSTOM = ("IN+", "IN-", "V+", "V-", "OUT")


@dataclass(frozen=True, slots=True)
class AmplifierShape:
    """Pin roles of an amplifier definition: ``roles`` in the order of its ports."""

    roles: tuple[str, ...]
    kind: str
    data: PartData | None
    gain: float | None
    is_linear: bool
    is_open_output: bool
    evidence: str


def recognize_definition(definition: Subcircuit, level: Level, catalogue: Catalogue) -> AmplifierShape | None:
    """Return the pin roles of a subcircuit that is an amplifier, or None."""
    data = catalogue.find(definition.name)
    if data is not None and data.kind in {
        "voltage regulator",
        "voltage reference",
        "rail splitter",
        "charge pump inverter",
    }:
        return None
    is_linear = _is_linear(definition)
    by_body, gain = _roles_by_body(definition, level) if is_linear else (None, None)
    by_names = _roles_by_names(definition.ports)
    if by_body is None and is_linear and by_names is not None and _speaks_of_amplifier(definition):
        by_body, gain = _low_gain_body(definition, level, by_names)
    by_remarks = _roles_by_remarks(definition.remarks, len(definition.ports))
    roles: tuple[str, ...] | None
    if by_body is not None:
        roles, evidence = _with_supplies(by_body, by_names, definition.ports), "the gain of its body"
    elif by_names is not None and (data is not None or _speaks_of_amplifier(definition)):
        roles, evidence = by_names, "the names of its pins"
    elif by_remarks is not None:
        roles, evidence = by_remarks, "the comment at its head"
    elif data is not None and len(definition.ports) == len(_CUSTOM):
        roles, evidence = _CUSTOM, "the order that makers use for models of five nodes (assumed)"
    else:
        return None
    kind = data.kind if data is not None else _kind_by_name(definition.name)
    is_open = data is not None and data.output_stage in {"open-collector", "open-drain"}
    return AmplifierShape(roles, kind, data, gain, by_body is not None, is_open, evidence)


def _kind_by_name(name: str) -> str:
    return "comparator" if re.search(r"comp(?!ens)", name, re.IGNORECASE) else "op-amp"


def _is_linear(definition: Subcircuit) -> bool:
    elements = definition.scope.elements
    return 0 < len(elements) <= 24 and all(
        each.letter in "RCLEGFHV" and (each.control is None or each.control.form in {"linear", "poly"})
        for each in elements
    )


def _speaks_of_amplifier(definition: Subcircuit) -> bool:
    """A name or a body with active parts: port names alone also fit filters that wear in+ and out."""
    if re.search(r"op.?amp|amp$|^oa|^opa|comp|^lm|^tl|^ad|^lt|^max|^mcp|^ne|^ina|^ua", definition.name, re.IGNORECASE):
        return True
    return any(each.letter in "QMJEGB" for each in definition.scope.elements) or not definition.scope.elements


def _roles_by_names(ports: Sequence[str]) -> tuple[str, ...] | None:
    found: dict[int, str] = {}
    taken: set[str] = set()
    tables = (("OUT", _OUT), ("IN+", _PLUS), ("IN-", _MINUS), ("V+", _VPLUS), ("V-", _VMINUS))
    names = [port.lower() for port in ports]
    for role, table in tables:
        hits = [index for index, name in enumerate(names) if name in table and index not in found]
        if len(hits) == 1:
            found[hits[0]] = role
            taken.add(role)
        elif len(hits) > 1:
            return None
    if not {"IN+", "IN-", "OUT"} <= taken:
        return None
    if len(ports) > len(found) + 3 or ("V+" in taken) != ("V-" in taken):
        return None
    return tuple(found.get(index, f"PIN{index + 1}") for index in range(len(ports)))


_ROLE_WORDS = (
    ("IN+", re.compile(r"non[\s-]*invert|\+\s*in\b|\bin\s*\+|\binp\b", re.IGNORECASE)),
    ("IN-", re.compile(r"\binvert|-\s*in\b|\bin\s*-|\binn\b|\binm\b", re.IGNORECASE)),
    ("V+", re.compile(r"positive|\+\s*v(?:cc|s|dd)?\b|\bv(?:cc|dd)?\s*\+|\bvcc\b|\bvdd\b", re.IGNORECASE)),
    ("V-", re.compile(r"negative|-\s*v(?:cc|s|ee)?\b|\bv(?:cc|ee)?\s*-|\bvee\b|\bvss\b", re.IGNORECASE)),
    ("OUT", re.compile(r"\bout(?:put)?\b", re.IGNORECASE)),
)


def _role_in(words: str) -> str | None:
    for role, pattern in _ROLE_WORDS:
        if pattern.search(words):
            return role
    return None


def _roles_by_remarks(remarks: Sequence[str], count: int) -> tuple[str, ...] | None:
    """Read a staircase of bars under role words: the first words belong to the first node."""
    found = []
    for remark in remarks:
        words = remark.replace("|", " ").strip()
        bars = remark.count("|")
        role = _role_in(words) if words else None
        if role is not None and (bars > 0 or found):
            found.append(role)
    if len(found) == count and set(ROLES) <= set(found) and len(set(found)) == len(found):
        return tuple(found)
    return None


def _roles_by_body(definition: Subcircuit, level: Level) -> tuple[dict[int, str] | None, float | None]:
    """Find output and inputs of a linear body by its computed DC gains (port to port, the others at zero)."""
    gains = body_gains(definition, level)
    if gains is None:
        return None, None
    best: tuple[int, int, int, float] | None = None
    for output, row in enumerate(gains):
        rising = [index for index, gain in enumerate(row) if gain >= HIGH_GAIN and index != output]
        falling = [index for index, gain in enumerate(row) if gain <= -HIGH_GAIN and index != output]
        if len(rising) == 1 and len(falling) == 1:
            one, other = row[rising[0]], -row[falling[0]]
            if abs(one - other) <= 0.05 * max(one, other):
                if best is not None:
                    return None, None
                best = (output, rising[0], falling[0], (one + other) / 2)
    if best is None:
        return None, None
    output, plus, minus, gain = best
    return {output: "OUT", plus: "IN+", minus: "IN-"}, gain


def _low_gain_body(
    definition: Subcircuit, level: Level, roles: tuple[str, ...]
) -> tuple[dict[int, str] | None, float | None]:
    """Accept a linear body of modest gain when the names of its ports say which is which and its gain agrees."""
    gains = body_gains(definition, level)
    places = {role: roles.index(role) for role in ("OUT", "IN+", "IN-")}
    if gains is None:
        return None, None
    row = gains[places["OUT"]]
    gain, other = row[places["IN+"]], -row[places["IN-"]]
    if gain > 0.5 and abs(gain - other) <= 0.05 * gain:
        return {place: role for role, place in places.items()}, (gain + other) / 2
    return None, None


def _with_supplies(roles: dict[int, str], by_names: tuple[str, ...] | None, ports: Sequence[str]) -> tuple[str, ...]:
    rest = [index for index in range(len(ports)) if index not in roles]
    named = dict(roles)
    for index in rest:
        name = ports[index].lower()
        if by_names is not None and by_names[index] in {"V+", "V-"}:
            named[index] = by_names[index]
        elif name in _VPLUS:
            named[index] = "V+"
        elif name in _VMINUS:
            named[index] = "V-"
    if len(rest) == 2 and {"V+", "V-"} != {named.get(index) for index in rest}:
        known = {named.get(index) for index in rest} - {None}
        if known in ({"V+"}, {"V-"}):
            missing = ({"V+", "V-"} - known).pop()
            for index in rest:
                named.setdefault(index, missing)
    return tuple(named.get(index, f"PIN{index + 1}") for index in range(len(ports)))


def bare_gain(element: ElementLine, value: float | None) -> bool:
    """True for a bare controlled source that can only be an ideal amplifier."""
    return element.letter == "E" and value is not None and abs(value) >= HIGH_GAIN
