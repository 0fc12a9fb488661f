"""From a netlist to a circuit: flatten, name the pins of packages, find amplifiers, rails and signals."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from ..text.intent import Intent
from ..text.netlist import Netlist
from ..text.source import Limits
from .amplifiers import (
    _MAKERS_ORDER,
    SIGNAL_KINDS,
    choose_pinout,
    find_amplifiers,
    name_package_pins,
)
from .catalogue import Catalogue, load_catalogue
from .flatten import FlatCircuit, flatten
from .graph import Circuit
from .parts import Part, PartKind, Pin
from .rails import find_rails, supply_nets_of
from .signals import find_signals


def build_circuit(
    netlist: Netlist, intent: Intent | None = None, *, catalogue: Catalogue | None = None, limits: Limits | None = None
) -> Circuit:
    """Build the circuit of a netlist.

    Raises
    ------
    NetlistError
        When instances do not fit their definitions, a designator is used twice, or the netlist expands beyond bounds.
    """
    declared = intent if intent is not None else Intent()
    known = (
        catalogue if catalogue is not None else load_catalogue(declared.folders(declared.rule_folders), declared.parts)
    )
    flat = flatten(netlist, known, limits)
    packages = _name_packages(flat, known)
    by_instance = list(flat.amplifiers)

    def annotate(circuit: Circuit) -> None:
        alive = [each for each in by_instance if each.part.designator in circuit.parts]
        current = [replace_part(each, circuit.parts[each.part.designator]) for each in alive]
        amplifiers, undetermined = find_amplifiers(circuit, current, packages, known)
        circuit.amplifiers = amplifiers
        circuit.undetermined = undetermined
        rails = find_rails(circuit, declared, supply_nets_of(amplifiers))
        circuit.rails = rails
        circuit.signals = find_signals(circuit, declared, rails)
        circuit.problems = tuple(flat.problems)

    return Circuit(title=netlist.title, path=netlist.path, parts=flat.parts, ground=flat.ground, annotate=annotate)


def replace_part(flat: object, part: Part) -> object:
    """Return a flat amplifier with its part as the changed circuit has it."""
    return replace(flat, part=part)  # type: ignore[type-var]


def _name_packages(flat: FlatCircuit, catalogue: Catalogue) -> Mapping[str, str]:
    """Name the pins of package instances by their part's pinout; return the evidence by designator."""
    named: dict[str, str] = {}
    for designator, part in list(flat.parts.items()):
        if part.kind is not PartKind.OPAQUE or not part.part_name:
            continue
        data = catalogue.find(part.part_name)
        if data is None:
            continue
        pinout, evidence = choose_pinout(part, data, flat.ground)
        if pinout is not None:
            flat.parts[designator] = name_package_pins(part, data, pinout)
            named[designator] = f"pins by {evidence}"
        elif data.kind in SIGNAL_KINDS and len(part.pins) == len(_MAKERS_ORDER) and not _is_board(part):
            pins = tuple(Pin(role, pin.net) for role, pin in zip(_MAKERS_ORDER, part.pins, strict=True))
            flat.parts[designator] = replace(part, kind=PartKind.AMPLIFIER, pins=pins)
            named[designator] = "pins by the order that makers use for models of five nodes (assumed)"
    return named


def _is_board(part: Part) -> bool:
    return not part.designator.rsplit("/", 1)[-1].upper().startswith("X")
