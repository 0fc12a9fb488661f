"""Every amplifier into exactly one stage: templates tried most specific first, what is left is ``unrecognized``."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from ..circuit.graph import Circuit
from ..circuit.parts import Amplifier, PartKind
from ..text.expressions import ExpressionError, evaluate
from .loops import amplifiers_in_loops
from .match import Match, Matcher
from .neighbourhood import Edge
from .reduce import capacitance_of
from .stages import Branch, Stage
from .templates import Template, load_templates

BLOCKED_OHM = 1e30  # what a formula sees for a branch that blocks DC

_TRANSISTORS = (PartKind.BJT, PartKind.MOSFET, PartKind.JFET)
_PACKAGED = {"instrumentation amplifier": "instrumentation-amplifier", "difference amplifier": "difference-amplifier"}


def find_stages(circuit: Circuit, templates: Sequence[Template] | None = None) -> tuple[Stage, ...]:
    """Return the stages of a circuit, in the order of their first amplifiers.

    Parameters
    ----------
    circuit
        The circuit; it is only read.
    templates
        Topologies to try, most specific first; those of the package when not given.
    """
    known = tuple(templates) if templates is not None else load_templates()
    matcher = Matcher(circuit)
    order = {each.name: index for index, each in enumerate(circuit.amplifiers)}
    in_loops = amplifiers_in_loops(circuit, matcher)
    taken: dict[str, Stage] = {}
    several = [each for each in known if len(each.amplifiers) > 1]
    single = [each for each in known if len(each.amplifiers) == 1]
    for templates_of_size in (several, single):
        for amplifier in circuit.amplifiers:
            if amplifier.name in taken or amplifier.kind in _PACKAGED:
                continue
            for template in templates_of_size:
                match = matcher.match(template, amplifier)
                if match is None or any(each.name in taken for each in match.amplifiers.values()):
                    continue
                values = role_values(circuit, match)
                if not _holds(template, values, match, in_loops):
                    continue
                stage = _stage_of(circuit, match, order)
                for each in match.amplifiers.values():
                    taken[each.name] = stage
                break
    for amplifier in circuit.amplifiers:
        if amplifier.name not in taken:
            taken[amplifier.name] = _leftover(circuit, matcher, amplifier, in_loops)
    stages = {id(stage): stage for stage in taken.values()}
    return tuple(sorted(stages.values(), key=lambda stage: min(order[name] for name in stage.amplifiers)))


def role_values(circuit: Circuit, match: Match) -> dict[str, float]:
    """Return what formulas and preconditions can read about a match.

    For each role ``x``: ``x`` (DC resistance, ohm; 1e30 where it blocks DC), ``x_c`` (capacitance, F; 0 without),
    ``x_has_r``, ``x_has_c``, ``x_diodes``, ``x_plain_r`` (1 when a purely resistive path lies in it), ``x_count``.
    Beside them ``inputs`` and ``loads`` (counts), ``signal_low_hz`` and ``signal_high_hz`` (0 when not known).
    """
    values: dict[str, float] = {}
    for line in match.template.branches:
        _describe(values, line.role, match.roles.get(line.role, []))
    for role, edges in match.roles.items():
        if role not in values:
            _describe(values, role, edges)
    values["through"] = _through(values, match)
    values["inputs_driven"] = float(_driven_inputs(circuit, match))
    values["beside_transistor"] = float(_beside_transistor(circuit, match))
    values["inputs"] = float(len(dict.fromkeys(match.entries)))
    values["loads"] = float(_loads(circuit, match))
    frequencies = [
        each for net in match.entries if net in circuit.signals for each in circuit.signals[net].frequencies_hz
    ] or [each for signal in circuit.signals.values() for each in signal.frequencies_hz]
    values["signal_low_hz"] = min(frequencies, default=0.0)
    values["signal_high_hz"] = max(frequencies, default=0.0)
    values["current_input"] = float(
        any(circuit.signals[net].is_current for net in match.entries if net in circuit.signals)
    )
    return values


def _describe(values: dict[str, float], role: str, edges: Sequence[Edge]) -> None:
    total = 0.0
    known = bool(edges)
    for edge in edges:
        if edge.ohm is None:
            known = False
        elif edge.ohm > 0 and math.isfinite(edge.ohm):
            total += 1 / edge.ohm
        elif edge.ohm == 0:
            total = math.inf
    if known:
        values[role] = 0.0 if math.isinf(total) else 1 / total if total else BLOCKED_OHM
    values[f"{role}_r"] = sum(_series_ohm(edge) for edge in edges) if len(edges) == 1 else values.get(role, 0.0)
    capacitances = [capacitance_of(edge) for edge in edges]
    values[f"{role}_c"] = sum(each for each in capacitances if each is not None)
    letters = [leaf.letter for edge in edges for leaf in edge.leaves]
    values[f"{role}_has_r"] = float("R" in letters)
    values[f"{role}_has_c"] = float("C" in letters)
    values[f"{role}_diodes"] = float(letters.count("D"))
    values[f"{role}_count"] = float(len(edges))
    pieces = [piece for edge in edges for piece in (edge.pieces if edge.form == "parallel" else (edge,))]
    values[f"{role}_plain_r"] = float(any(piece.letters == {"R"} for piece in pieces))


def _series_ohm(edge: Edge) -> float:
    """Return the resistance of a branch with its capacitors taken as short."""
    if edge.form == "parallel":
        if any(piece.letters == {"C"} for piece in edge.pieces):
            rest = [
                piece.ohm
                for piece in edge.pieces
                if piece.ohm is not None and math.isfinite(piece.ohm) and piece.ohm > 0
            ]
            return 1 / sum(1 / ohm for ohm in rest) if rest else 0.0
        return edge.ohm if edge.ohm is not None and math.isfinite(edge.ohm) else 0.0
    if edge.form == "series":
        return sum(_series_ohm(piece) for piece in edge.pieces)
    return edge.ohm if edge.ohm is not None and math.isfinite(edge.ohm) else 0.0


def _through(values: Mapping[str, float], match: Match) -> float:
    """Return the DC share of the signal that reaches a non-inverting input through its own resistors."""
    if "noninverting_input" not in match.roles:
        return 1.0
    series, leg = values.get("noninverting_input"), values.get("bias")
    if series is None:
        return 0.0
    if series >= BLOCKED_OHM:
        return 0.0
    return 1.0 if leg is None else leg / (leg + series)


def _driven_inputs(circuit: Circuit, match: Match) -> int:
    """Count the anchor's input pins that a signal or another amplifier drives, straight or through a branch."""
    anchor = match.amplifiers[match.template.amplifiers[0].name]
    count = 0
    for net in (anchor.plus, anchor.minus):
        place = match.reductions[0].place
        near = [net, *(edge.other(net) for edge in place.at(net))]
        if any(
            each in circuit.signals or any(one.name != anchor.name for one in circuit.amplifiers_at(each))
            for each in near
        ):
            count += 1
    return count


def _beside_transistor(circuit: Circuit, match: Match) -> bool:
    """True when a transistor meets the anchor's inputs, straight or over one branch: feedback may close over it."""
    anchor = match.amplifiers[match.template.amplifiers[0].name]
    place = match.reductions[0].place
    near = [net for pin in (anchor.plus, anchor.minus) for net in (pin, *(edge.other(pin) for edge in place.at(pin)))]
    return any(
        part.kind in _TRANSISTORS
        for net in near
        if not circuit.is_stiff(net) and not circuit.is_hub(net)
        for part in circuit.parts_on(net)
    )


def _loads(circuit: Circuit, match: Match) -> int:
    output = match.amplifiers[match.template.amplifiers[0].name].output
    own = {name for edges in match.roles.values() for edge in edges for name in edge.designators}
    own |= {each.designator for each in match.amplifiers.values()}
    loads = {designator for designator, _ in circuit.pins_on(output)} - own
    members = {one.name for one in match.amplifiers.values()}
    parts = {designator for designator, _ in circuit.pins_on(output)}
    same_part = [
        each
        for designator in parts & own
        for each in _channels(circuit, designator)
        if each.name not in members and output in {each.plus, each.minus}
    ]
    return len(loads) + len(same_part)


def _channels(circuit: Circuit, designator: str) -> tuple[Amplifier, ...]:
    names = (designator, *(f"{designator}{letter}" for letter in "ABCDEFGH"))
    return tuple(found for name in names if (found := circuit.amplifier(name)) is not None)


def _holds(template: Template, values: Mapping[str, float], match: Match, in_loops: frozenset[str]) -> bool:
    names = {**values, "in_loop": float(any(each.name in in_loops for each in match.amplifiers.values()))}
    names["is_comparator"] = float(all(each.kind == "comparator" for each in match.amplifiers.values()))
    for text in template.requires:
        try:
            if not evaluate(text, names):
                return False
        except ExpressionError:
            return False
    return True


def branch_of(edge: Edge) -> Branch:
    """Return a reduced edge as the shared branch type."""
    return Branch((edge.one, edge.two), edge.designators, _elements(edge), edge.ohm, edge.letters)


def _elements(edge: Edge) -> tuple[object, ...]:
    if edge.form == "leaf":
        leaf = edge.leaves[0]
        return (leaf.letter, leaf.part.designator)
    if edge.form == "mesh":
        return ("mesh", *edge.mesh_parts)
    return (edge.form, *(_elements(piece) for piece in edge.pieces))


def _stage_of(circuit: Circuit, match: Match, order: Mapping[str, int]) -> Stage:
    template = match.template
    names = sorted((each.name for each in match.amplifiers.values()), key=lambda name: order[name])
    first = circuit.amplifiers[order[names[0]]]
    properties: dict[str, tuple[str, ...]] = {}
    for reduction in match.reductions:
        for name, designators in reduction.properties.items():
            properties[name] = tuple(dict.fromkeys((*properties.get(name, ()), *designators)))
    _add_properties(circuit, match, properties)
    output = match.nets.get(template.output) or match.amplifiers[template.amplifiers[-1].name].output
    inputs = _inputs(match)
    references = tuple(net for net in dict.fromkeys(match.references) if net not in inputs)
    values = role_values(circuit, match)
    return Stage(
        name=names[0],
        topology=template.name,
        amplifiers=tuple(names),
        inputs=inputs,
        output=output,
        location=first.location,
        references=references,
        roles={
            role: tuple(dict.fromkeys(name for edge in edges for name in edge.designators))
            for role, edges in match.roles.items()
        },
        branches={role: tuple(branch_of(edge) for edge in edges) for role, edges in match.roles.items()},
        properties=properties,
        inner_nets=dict(match.nets),
        evidence=(
            f"fits the template {template.name}",
            *(each.evidence for each in match.amplifiers.values() if each.evidence),
        ),
        formulas=dict(template.formulas),
        values=values,
    )


def _inputs(match: Match) -> tuple[str, ...]:
    if match.template.inputs:
        named = [match.nets[name] for name in match.template.inputs if name in match.nets]
        return tuple(dict.fromkeys(named))
    return tuple(dict.fromkeys(match.entries))


def _add_properties(circuit: Circuit, match: Match, properties: dict[str, tuple[str, ...]]) -> None:
    for role, edges in match.roles.items():
        for edge in edges:
            if (
                edge.ohm == math.inf
                and "C" in edge.letters
                and role in {"input", "noninverting_input", "inverting_input"}
            ):
                properties["ac_coupled"] = tuple(leaf.part.designator for leaf in edge.leaves if leaf.letter == "C")
            if edge.ohm == math.inf and role == "gain_leg":
                properties["gain_leg_coupled"] = tuple(
                    leaf.part.designator for leaf in edge.leaves if leaf.letter == "C"
                )
            if role == "feedback" and edge.ohm != math.inf and "C" in edge.letters:
                properties["feedback_capacitor"] = tuple(
                    leaf.part.designator for leaf in edge.leaves if leaf.letter == "C"
                )
            if edge.form == "mesh" and role == "feedback":
                properties["t_network"] = edge.designators
    legs = match.roles.get("bias", [])
    entries = match.roles.get("noninverting_input", [])
    if legs and entries and all(edge.ohm not in (None, math.inf) for edge in entries):
        properties["input_attenuator"] = tuple(name for edge in (*entries, *legs) for name in edge.designators)
    shifted = [net for net in match.references if net != circuit.ground]
    if shifted and match.entries:
        properties["level_shift"] = tuple(dict.fromkeys(shifted))
    output = match.amplifiers[match.template.amplifiers[0].name].output
    loads = [
        each.designator
        for each in circuit.parts_on(output)
        if len(each.pins) == 2 and any(circuit.is_stiff(net) for net in each.nets)
    ]
    if loads:
        properties["load"] = tuple(loads[:8])


def _leftover(circuit: Circuit, matcher: Matcher, amplifier: Amplifier, in_loops: frozenset[str]) -> Stage:
    """Name a one-chip amplifier by its kind; anything else is unrecognized, with what was seen."""
    topology = _PACKAGED.get(amplifier.kind)
    if topology is not None:
        return Stage(
            amplifier.name,
            topology,
            (amplifier.name,),
            (amplifier.plus, amplifier.minus),
            amplifier.output,
            amplifier.location,
            references=tuple(net for role, net in amplifier.others if role == "REF"),
            evidence=(f"a one-chip {amplifier.kind}",),
        )
    reduction = matcher.reduction(amplifier, "plain")
    seen = []
    for pin, net in (("IN-", amplifier.minus), ("IN+", amplifier.plus)):
        branches = [f"{'+'.join(edge.designators)} to {edge.other(net)}" for edge in reduction.place.at(net)]
        seen.append(f"{pin} ({net}): {', '.join(branches) if branches else 'no branch'}")
    loop = "; its feedback closes over other stages" if amplifier.name in in_loops else ""
    reason = f"no template fits; {'; '.join(seen)}{loop}"
    return Stage(
        amplifier.name, "unrecognized", (amplifier.name,), (), amplifier.output, amplifier.location, reason=reason
    )
