"""What stands on a net that feeds supply pins."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..circuit.graph import LINK_OHM
from ..circuit.parts import Part, PartKind
from .figures import Figure, Known
from .listing import SupplyNet
from .measures import measure
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench

DAMPING_OHM = 10.0  # a resistor up to here in series with a capacitor damps it


def supply_net_of(subject: Subject) -> SupplyNet:
    """Return the supply net of a subject of that kind."""
    found = subject.item
    assert isinstance(found, SupplyNet)
    return found


def _linked(bench: Bench, net: str) -> tuple[str, ...]:
    """Return a net with those that links (0 ohm) join to it."""
    circuit = bench.circuit
    found = {net: None}
    waiting = [net]
    while waiting:
        at = waiting.pop()
        for part in circuit.parts_on(at):
            if (
                part.kind is PartKind.RESISTOR
                and part.value is not None
                and abs(part.value) <= LINK_OHM
                and len(part.nets) == 2
            ):
                for other in part.nets:
                    if other not in found and not circuit.is_ground(other):
                        found[other] = None
                        waiting.append(other)
    return tuple(found)


def bypass_capacitors(bench: Bench, net: str) -> dict[str, tuple[str, float | None]]:
    """Return the capacitors from a net (or what links join to it) to a stiff net: target and capacitance (F) by designator."""
    circuit = bench.circuit
    own = _linked(bench, net)
    found: dict[str, tuple[str, float | None]] = {}
    for place in own:
        for part in circuit.parts_on(place):
            if len(part.nets) != 2 or not part.is_fitted:
                continue
            other = part.nets[1] if part.nets[0] == place else part.nets[0]
            if part.kind is PartKind.CAPACITOR:
                end = other if circuit.is_stiff(other) else _behind(bench, other, part.designator, PartKind.RESISTOR)
                if end is not None and end not in own:
                    found[part.designator] = (end, part.value)
            elif _is_small(part) and not circuit.is_stiff(other):
                for inner in circuit.parts_on(other):
                    end = _behind(bench, other, part.designator, PartKind.CAPACITOR)
                    if inner.kind is PartKind.CAPACITOR and end is not None and end not in own:
                        found[inner.designator] = (end, inner.value)
    return found


def _is_small(part: Part) -> bool:
    return part.kind is PartKind.RESISTOR and part.value is not None and part.value <= DAMPING_OHM


def _behind(bench: Bench, net: str, before: str, kind: PartKind) -> str | None:
    """Return the stiff net behind the one other part on a net: a capacitor, or a resistor that damps one."""
    circuit = bench.circuit
    rest = [part for part in circuit.parts_on(net) if part.designator != before]
    if len(rest) != 1 or len(rest[0].nets) != 2 or rest[0].kind is not kind:
        return None
    if kind is PartKind.RESISTOR and not _is_small(rest[0]):
        return None
    end = rest[0].nets[1] if rest[0].nets[0] == net else rest[0].nets[0]
    return end if circuit.is_stiff(end) else None


@measure("supply net", unit="F")
def bypass_f(bench: Bench, subject: Subject) -> Figure:
    """Largest capacitance from the net to one stiff net, parallel capacitors together (F); 0 without any."""
    groups: dict[str, float] = {}
    for target, value in bypass_capacitors(bench, supply_net_of(subject).net).values():
        # a capacitor without a value is drawn to decouple: it counts as one of the usual size
        groups[target] = groups.get(target, 0.0) + (100e-9 if value is None else value)
    return Known(max(groups.values(), default=0.0))


@measure("supply net")
def bypass_count(bench: Bench, subject: Subject) -> Figure:
    """Number of capacitors of at least 10 nF from the net to a stiff net."""
    found = bypass_capacitors(bench, supply_net_of(subject).net)
    return Known(float(sum(1 for _, value in found.values() if value is None or value >= 9.9e-9)))


@measure("supply net")
def package_count(bench: Bench, subject: Subject) -> Figure:
    """Number of packages with a supply pin on the net."""
    return Known(float(len({pin.designator for pin in supply_net_of(subject).pins})))


@measure("supply net", kind="words")
def packages(bench: Bench, subject: Subject) -> Figure:
    """Designators of the packages with a supply pin on the net."""
    return Known(tuple(dict.fromkeys(pin.designator for pin in supply_net_of(subject).pins)))


@measure("supply net", kind="words")
def pin_roles(bench: Bench, subject: Subject) -> Figure:
    """Roles of the supply pins on the net: V+, V- or both."""
    return Known(tuple(dict.fromkeys(pin.role for pin in supply_net_of(subject).pins)))


@measure("supply net", kind="word")
def ground_net(bench: Bench, subject: Subject) -> Figure:
    """Name of the ground net."""
    return Known(bench.circuit.ground or "ground")


@measure("supply net", kind="flag")
def is_decoupled_elsewhere(bench: Bench, subject: Subject) -> Figure:
    """True when the intent file says that the decoupling is drawn on another sheet."""
    if bench.intent.decoupling == "elsewhere":
        return Known(True)
    found = supply_net_of(subject)
    names = {amplifier.name for pin in found.pins for amplifier in pin.amplifiers} | {
        pin.designator for pin in found.pins
    }
    return Known(bool(names) and all(bench.intent.stage(name).get("decoupling") == "elsewhere" for name in names))
