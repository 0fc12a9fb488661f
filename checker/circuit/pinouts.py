"""Pin orders of instance lines: from package pinouts of part data, with and without the pins that may stay open.

An instance line lists nets only; which pin each net is on follows from an order. :func:`orders_for` lists every order
that a part of this name and this number of nets may have; the rails decide between them.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import permutations, product

from .partdata import PartData, Pinout

Order = tuple[str, tuple[str, ...]]

# Pins that a schematic may leave unconnected, so that an exporter leaves them out.
OPTIONAL_ROLES = frozenset(
    word
    for row in (
        "NC DNC NULL BAL COMP COMP1 COMP2 COMP3 DECOMP OVERCOMP BALCOMP BALSTROBE STROBE BOOSTNC TRIM TEMP TP NOISE",
        "FLAG BW TFLAG OSC STATUS",
    )
    for word in row.split()
)

_RAIL_WORDS = {
    "IN": "in vin input vi i 1in",
    "OUT": "out vout output vo o",
    "GND": "gnd ground com common vcom vgnd g v00 gnd1",
    "ADJ": "adj adjust adjustment",
    "CATHODE": "k cathode cat c",
    "ANODE": "a anode an",
    "REF": "ref reference r fdbk",
    "TRIM": "trim",
    "TEMP": "temp",
    "NOISE": "noise filter nr",
}


def orders_for(data: PartData, name: str, count: int, *, is_package_line: bool) -> tuple[Order, ...]:
    """List the pin orders that ``count`` nets may have for a part.

    ``is_package_line`` tells a line that lists package pins (schematic export) from one in the order of a model.
    Roles of channels carry their number in packages with several (``OUT1``).
    """
    channels = data.channels_of(name)
    found: dict[tuple[str, ...], str] = {}
    if data.pin_order and len(data.pin_order) == count:
        found.setdefault(data.pin_order, "declared order of pins")
    for pinout in data.pinouts:
        if channels is not None and pinout.channels != channels:
            continue
        for roles in _readings(pinout, count):
            found.setdefault(roles, f"{pinout.package} pinout of {data.name}")
    if count == 3 and data.kind in {"voltage regulator", "voltage reference"} and data.output_stage != "shunt":
        # Pin order differs from package to package; the rails tell which it is.
        common = "ADJ" if any(role == "ADJ" for pinout in data.pinouts for role, _ in pinout.roles) else "GND"
        for roles in permutations(("IN", "OUT", common)):
            found.setdefault(roles, "wiring to the rails")
    if not is_package_line and not found:
        for roles in model_orders(data.kind, count):
            found.setdefault(roles, "customary order of models")
    return tuple((text, roles) for roles, text in found.items())


def model_orders(kind: str, count: int) -> tuple[tuple[str, ...], ...]:
    """Orders that vendor models customarily have, by kind of amplifier and number of nets."""
    five = ("IN+", "IN-", "V+", "V-", "OUT")
    if kind == "instrumentation amplifier" and count == 8:
        return ((*five, "REF", "RG", "RG"),)
    if kind == "difference amplifier" and count == 7:
        return ((*five, "REF", "SENSE"),)
    if kind == "comparator" and count == 6:
        return ((*five, "GND"),)
    if kind == "buffer" and count == 4:
        return (("IN", "V+", "V-", "OUT"),)
    return (five,) if count == 5 and kind != "buffer" else ()


def _readings(pinout: Pinout, count: int) -> Iterable[tuple[str, ...]]:
    """Pin lists of a package with all pins, without its open ones, and with some optional pins left out."""
    roles = tuple(role for role, _ in sorted(pinout.roles, key=lambda pair: pair[1]))
    if len(roles) == count:
        yield roles
        return
    optional = [index for index, role in enumerate(roles) if role in OPTIONAL_ROLES]
    spare = len(roles) - count
    if not 0 < spare <= len(optional) or len(optional) > 6:
        return
    seen = set()
    for choice in product((False, True), repeat=len(optional)):
        if sum(choice) != spare:
            continue
        dropped = {index for index, is_dropped in zip(optional, choice, strict=True) if is_dropped}
        kept = tuple(role for index, role in enumerate(roles) if index not in dropped)
        if kept not in seen:
            seen.add(kept)
            yield kept


def rail_roles_by_names(ports: Sequence[str]) -> dict[str, int] | None:
    """Roles of a regulator's, reference's or splitter's ports by their names; None when a name is not known."""
    known = {word: role for role, words in _RAIL_WORDS.items() for word in words.split()}
    roles: dict[str, int] = {}
    for index, port in enumerate(ports):
        role = known.get(port.lower().replace("_", ""))
        if role is None or role in roles:
            return None
        roles[role] = index
    is_series = {"IN", "OUT"} <= roles.keys()
    is_shunt = {"CATHODE", "ANODE"} <= roles.keys()
    return roles if is_series or is_shunt else None


def split_channels(roles: Sequence[str], channels: int) -> tuple[dict[str, int], ...]:
    """Split a package's pin list into one map of role to position for each channel; supplies are shared.

    ``OUT2`` belongs to channel 2 and becomes its ``OUT``; roles without a number are shared by all channels.
    """
    if channels == 1:
        single: dict[str, int] = {}
        for position, role in enumerate(roles):
            name, count = role, 1
            while name in single:
                count += 1
                name = f"{role}{count}"
            single[name] = position
        return (single,)
    found: list[dict[str, int]] = [{} for _ in range(channels)]
    for position, role in enumerate(roles):
        own = _channel_role(role)
        if own is None:
            for each in found:
                each[role] = position
        elif own[1] <= channels:
            found[own[1] - 1][own[0]] = position
    return tuple(found)


def _channel_role(role: str) -> tuple[str, int] | None:
    if role.startswith("IN") and len(role) == 4 and role[2].isdigit() and role[3] in "+-":
        return f"IN{role[3]}", int(role[2])
    if role.startswith("OUT") and role[3:].isdigit():
        return "OUT", int(role[3:])
    return None
