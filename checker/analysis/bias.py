"""Where the bias current of an amplifier's input can flow."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..circuit.parts import Part, PartKind
from .figures import Figure, Known, Unknown
from .listing import InputPin
from .measures import measure
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench

# How a part passes the bias current: freely, only while a junction conducts, not at all, or nobody knows.
_FREE = frozenset((PartKind.RESISTOR, PartKind.INDUCTOR, PartKind.VOLTAGE_SOURCE, PartKind.VCVS, PartKind.CCVS))
_JUNCTION = frozenset((PartKind.DIODE,))
_DEVICE = frozenset((PartKind.BJT, PartKind.MOSFET, PartKind.JFET))
_UNKNOWN = frozenset((PartKind.OPAQUE, PartKind.SWITCH, PartKind.BEHAVIOURAL, PartKind.CONNECTOR))


def input_pin_of(subject: Subject) -> InputPin:
    """Return the input pin of a subject of that kind."""
    found = subject.item
    assert isinstance(found, InputPin)
    return found


@dataclass(frozen=True, slots=True)
class BiasPath:
    """``kind`` is path, junction, none, open or unknown; ``capacitors`` end the island, ``through`` says where it may go on."""

    kind: str
    capacitors: tuple[str, ...] = ()
    through: str | None = None


def bias_path(bench: Bench, start: str) -> BiasPath:
    """Follow every DC path from a net to a defined potential."""
    circuit = bench.circuit
    seen = {start}
    waiting = [(start, False)]  # nets reached freely before those reached over a junction
    over_junction: list[str] = []
    capacitors: dict[str, None] = {}
    unknown: str | None = None
    pins = 0
    while waiting or over_junction:
        net, is_conditional = waiting.pop() if waiting else (over_junction.pop(), True)
        if _is_defined(bench, net):
            return BiasPath("junction" if is_conditional else "path", tuple(capacitors))
        if circuit.is_hub(net):
            return BiasPath("unknown", tuple(capacitors), f"net {net}")
        for designator, pin in circuit.pins_on(net):
            part = circuit.parts[designator]
            pins += 1
            if part.kind is PartKind.CAPACITOR:
                capacitors[designator] = None
            elif part.kind in _UNKNOWN:
                unknown = unknown or _where(part, net)
            elif part.kind is PartKind.AMPLIFIER:
                if designator not in {each.designator for each in circuit.amplifiers}:
                    unknown = unknown or _where(part, net)
            elif part.kind in _FREE or part.kind in _DEVICE:
                for other in _others(part, net, pin):
                    if other not in seen:
                        seen.add(other)
                        waiting.append((other, is_conditional))
            elif part.kind in _JUNCTION:
                for other in part.nets:
                    if other not in seen:
                        seen.add(other)
                        over_junction.append(other)
    if unknown is not None:
        return BiasPath("unknown", tuple(capacitors), unknown)
    own = sum(1 for _ in circuit.pins_on(start))
    return BiasPath("open" if own <= 1 and pins <= 1 else "none", tuple(capacitors))


def _others(part: Part, net: str, pin: str) -> tuple[str, ...]:
    if part.kind in (PartKind.MOSFET, PartKind.JFET):
        if pin == "gate" and part.kind is PartKind.MOSFET:
            return ()
        return tuple(each.net for each in part.pins if each.net != net and each.name in ("drain", "source"))
    if part.kind in (PartKind.VCVS, PartKind.CCVS):
        return tuple(each.net for each in part.pins[:2] if each.net != net)
    return tuple(each for each in part.nets if each != net)


def _where(part: Part, net: str) -> str:
    return f"{'connector ' if part.kind is PartKind.CONNECTOR else ''}{part.designator} on net {net}"


def _is_defined(bench: Bench, net: str) -> bool:
    circuit = bench.circuit
    if circuit.is_stiff(net) or circuit.amplifiers_at(net):
        return True
    signal = circuit.signals.get(net)
    if signal is not None and not signal.is_current and signal.other is None:
        return True
    return any(
        circuit.parts[designator].kind is PartKind.REGULATOR and "OUT" in pin.upper()
        for designator, pin in circuit.pins_on(net)
    )


@measure("input pin", kind="word")
def bias_route(bench: Bench, subject: Subject) -> Figure:
    """How the pin's bias current finds its way: path, junction, none or open; unknown where the netlist ends."""
    pin = input_pin_of(subject)
    if pin.amplifier.kind not in {"op-amp", "comparator", "current-feedback", "instrumentation amplifier", "buffer"}:
        return Known("path")  # one-chip difference amplifiers have their resistors inside
    if pin.amplifier.kind == "buffer" and pin.role == "IN-":
        return Known("path")
    found = bias_path(bench, pin.net)
    if found.kind == "unknown":
        return Unknown(
            f"the bias path of net {pin.net} leaves by {found.through}",
            f"[signals.{pin.net}] if it is driven from there",
        )
    return Known(found.kind)


@measure("input pin", kind="words")
def blocking_capacitors(bench: Bench, subject: Subject) -> Figure:
    """Capacitors that stand between the pin's island of nets and the rest."""
    return Known(bias_path(bench, input_pin_of(subject).net).capacitors)


@measure("input pin", kind="word")
def pin_net(bench: Bench, subject: Subject) -> Figure:
    """Net of the pin."""
    return Known(input_pin_of(subject).net)


@measure("input pin", unit="V/s")
def drift_v_per_s(bench: Bench, subject: Subject) -> Figure:
    """How fast the bias current moves the pin: Ib over the capacitance on its island (V/s)."""
    pin = input_pin_of(subject)
    data = pin.amplifier.data
    bias = None if data is None else data.input_bias_max_a or data.input_bias_a
    if not bias:
        return Unknown(f"the bias current of {pin.amplifier.name} is not known", f"part data of {pin.amplifier.name}")
    total = 0.0
    for name in bias_path(bench, pin.net).capacitors:
        value = bench.circuit.parts[name].value
        if value is None:
            return Unknown(f"{name} has no value")
        total += value
    return Known(bias / total) if total else Unknown("no capacitor stands on the net")
