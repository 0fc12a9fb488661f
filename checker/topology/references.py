"""Reference nets: nets that stand at a fixed voltage as far as signals are concerned.

Ground, rails and nets held by DC sources are references; so are the tap of a bypassed divider between stiff nets, the
output of a rail source, and the output of a follower whose input is such a tap (a virtual ground).
"""

from __future__ import annotations

from ..circuit.graph import Circuit
from ..circuit.parts import Amplifier, PartKind

BYPASS_F = 10e-9


def is_reference(circuit: Circuit, net: str, depth: int = 0) -> bool:
    """True for a reference net; see the module text."""
    if net in circuit.signals:
        return False
    if circuit.is_stiff(net):
        return True
    amplifiers = circuit.amplifiers_at(net)
    if amplifiers:
        return depth < 2 and len(amplifiers) == 1 and is_reference_buffer(circuit, amplifiers[0], depth)
    if any(
        circuit.parts[designator].kind is PartKind.REGULATOR and pin.startswith("OUT")
        for designator, pin in circuit.pins_on(net)
    ):
        return True
    return is_bypassed_divider(circuit, net)


def is_reference_buffer(circuit: Circuit, amplifier: Amplifier, depth: int = 0) -> bool:
    """True for a follower (output straight to the inverting input) whose other input is a reference."""
    if amplifier.minus != amplifier.output or amplifier.kind == "comparator":
        return False
    return is_reference(circuit, amplifier.plus, depth + 1) or is_divider(circuit, amplifier.plus)


def is_divider(circuit: Circuit, net: str) -> bool:
    """True when only resistors to stiff nets set the net, at least two of them, and one end is no ground."""
    resistors = 0
    ends = set()
    for designator, _ in circuit.pins_on(net):
        part = circuit.parts[designator]
        if part.kind is PartKind.RESISTOR:
            other = part.pins[1].net if part.pins[0].net == net else part.pins[0].net
            if not circuit.is_stiff(other) or other in circuit.signals:
                return False
            ends.add(other)
            resistors += 1
        elif part.kind not in {PartKind.CAPACITOR, PartKind.AMPLIFIER, PartKind.CONNECTOR, PartKind.VCVS}:
            return False
    return resistors >= 2 and len(ends) >= 2


def is_bypassed_divider(circuit: Circuit, net: str) -> bool:
    """True for a tap with resistors to two different stiff nets and a capacitor of 10 nF or more to one of them.

    Further resistors may leave the tap: the stages that use it as their reference.
    """
    ends = set()
    is_bypassed = False
    for designator, _ in circuit.pins_on(net):
        part = circuit.parts[designator]
        if len(part.pins) != 2:
            continue
        other = part.pins[1].net if part.pins[0].net == net else part.pins[0].net
        if not circuit.is_stiff(other) or other in circuit.signals:
            continue
        if part.kind is PartKind.RESISTOR:
            ends.add(other)
        elif part.kind is PartKind.CAPACITOR and (part.value is None or part.value >= BYPASS_F):
            is_bypassed = True
    return is_bypassed and len(ends) >= 2
