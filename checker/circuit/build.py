"""From a netlist to a circuit: flatten, settle the pins of packages, look what stands there."""

from __future__ import annotations

from ..errors import NetlistError
from ..text.intent import Intent
from ..text.netlist import Netlist
from ..text.source import Limits
from .catalogue import Catalogue, load_catalogue
from .flatten import Flattener
from .graph import Circuit
from .recognize import resolve_clues


def build_circuit(
    netlist: Netlist, intent: Intent | None = None, *, catalogue: Catalogue | None = None, limits: Limits | None = None
) -> Circuit:
    """Build the circuit of a netlist.

    Parameters
    ----------
    netlist
        The netlist as read.
    intent
        What the designer declared: rails, signals, parts.
    catalogue
        Part data; the shipped ones with those of the intent file when not given.
    limits
        Bounds; elements are counted before anything is expanded.

    Raises
    ------
    NetlistError
        When instances do not fit their definitions, a designator is used twice, a definition contains itself, or the
        netlist expands beyond a bound; every such problem of the run is carried.
    """
    declared = intent if intent is not None else Intent()
    known = (
        catalogue if catalogue is not None else load_catalogue(declared.folders(declared.rule_folders), declared.parts)
    )
    flat = Flattener(netlist, known, limits).run()
    errors = [each for each in flat.problems if each.level == "error"]
    if errors:
        raise NetlistError([*errors, *(each for each in netlist.problems if each.level == "error")])

    circuit = Circuit(
        title=netlist.title,
        path=netlist.path,
        parts=flat.parts,
        clues=flat.clues,
        ground=flat.names.ground,
        catalogue=known,
        intent=declared,
        style=netlist.style,
        problems=tuple(flat.problems),
        assumptions=tuple(flat.assumptions),
    )
    if not flat.clues:
        return circuit
    parts, clues, reasons = resolve_clues(circuit)
    return Circuit(
        title=netlist.title,
        path=netlist.path,
        parts=parts,
        clues=clues,
        ground=flat.names.ground,
        catalogue=known,
        intent=declared,
        style=netlist.style,
        problems=tuple(flat.problems),
        assumptions=tuple(flat.assumptions),
        reasons=reasons,
    )
