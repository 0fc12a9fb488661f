"""Lists the subjects of a circuit: what rules can be asked of, each with what a finding about it points at."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..circuit.parts import Amplifier
from ..errors import Location
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench


@dataclass(frozen=True, slots=True)
class InputPin:
    """An input of an amplifier: ``role`` is IN+ or IN-."""

    amplifier: Amplifier
    role: str
    net: str


@dataclass(frozen=True, slots=True)
class SupplyPin:
    """A supply pin of a package: ``role`` is V+ or V-."""

    designator: str
    role: str
    net: str
    amplifiers: tuple[Amplifier, ...]


@dataclass(frozen=True, slots=True)
class SupplyNet:
    """A net that feeds supply pins, with the pins on it."""

    net: str
    pins: tuple[SupplyPin, ...]


@dataclass(frozen=True, slots=True)
class Package:
    """A part with its amplifier channels."""

    designator: str
    amplifiers: tuple[Amplifier, ...]


def list_subjects(bench: Bench, kind: str) -> tuple[Subject, ...]:
    """Return all subjects of a kind, in netlist order."""
    return tuple(_LISTS[kind](bench))


def _stage_name(bench: Bench, amplifier: Amplifier) -> str | None:
    stage = bench.stage_of(amplifier.name)
    return stage.name if stage is not None else None


def _netlist(bench: Bench) -> Iterator[Subject]:
    circuit = bench.circuit
    yield Subject("netlist", circuit.title or circuit.path, circuit, (), (), None, Location(circuit.path, 1))


def _rails(bench: Bench) -> Iterator[Subject]:
    for net, rail in bench.circuit.rails.items():
        yield Subject("rail", net, rail, (), (net,), None, _location_of_net(bench, net))


def _nets(bench: Bench) -> Iterator[Subject]:
    for net in bench.circuit.nets:
        yield Subject("net", net, net, (), (net,), None, _location_of_net(bench, net))


def _location_of_net(bench: Bench, net: str) -> Location:
    for designator, _ in bench.circuit.pins_on(net):
        return bench.circuit.parts[designator].location
    return Location(bench.circuit.path, 1)


def _parts(bench: Bench) -> Iterator[Subject]:
    owner = bench.stages_of_parts
    for part in bench.circuit.parts.values():
        if part.is_fitted:
            nets = tuple(dict.fromkeys(part.nets))
            yield Subject(
                "part", part.designator, part, (part.designator,), nets, owner.get(part.designator), part.location
            )


def stages_of_parts(bench: Bench) -> dict[str, str]:
    """Return the stage of each part that has a role in one."""
    found: dict[str, str] = {}
    for stage in bench.stages:
        for names in stage.roles.values():
            for name in names:
                found.setdefault(name, stage.name)
        for name in stage.amplifiers:
            amplifier = bench.circuit.amplifier(name)
            if amplifier is not None:
                found.setdefault(amplifier.designator, stage.name)
    return found


def packages(bench: Bench) -> dict[str, tuple[Amplifier, ...]]:
    """Return the amplifier channels of each part that holds amplifiers."""
    found: dict[str, list[Amplifier]] = {}
    for amplifier in bench.circuit.amplifiers:
        found.setdefault(amplifier.designator, []).append(amplifier)
    return {designator: tuple(each) for designator, each in found.items()}


def _packages(bench: Bench) -> Iterator[Subject]:
    for designator, amplifiers in packages(bench).items():
        first = amplifiers[0]
        nets = tuple(net for net in (first.supply_plus, first.supply_minus) if net is not None)
        stage = _stage_name(bench, first) if len(amplifiers) == 1 else None
        yield Subject(
            "package", designator, Package(designator, amplifiers), (designator,), nets, stage, first.location
        )


def _amplifiers(bench: Bench) -> Iterator[Subject]:
    for each in bench.circuit.amplifiers:
        yield Subject(
            "amplifier", each.name, each, (each.name,), (each.output,), _stage_name(bench, each), each.location
        )


def supply_pins(bench: Bench) -> tuple[SupplyPin, ...]:
    """Return the supply pins of all packages; packages that show none have none."""
    found: list[SupplyPin] = []
    for designator, amplifiers in packages(bench).items():
        for role, nets in (
            ("V+", dict.fromkeys(each.supply_plus for each in amplifiers)),
            ("V-", dict.fromkeys(each.supply_minus for each in amplifiers)),
        ):
            found.extend(SupplyPin(designator, role, net, amplifiers) for net in nets if net is not None)
    return tuple(found)


def _supply_pins(bench: Bench) -> Iterator[Subject]:
    for pin in supply_pins(bench):
        first = pin.amplifiers[0]
        yield Subject(
            "supply pin", f"{pin.role} of {pin.designator}", pin, (pin.designator,), (pin.net,), None, first.location
        )


def _supply_nets(bench: Bench) -> Iterator[Subject]:
    by_net: dict[str, list[SupplyPin]] = {}
    for pin in supply_pins(bench):
        by_net.setdefault(pin.net, []).append(pin)
    for net, pins in by_net.items():
        if bench.circuit.is_ground(net):
            continue
        names = tuple(dict.fromkeys(pin.designator for pin in pins))
        location = pins[0].amplifiers[0].location
        yield Subject("supply net", net, SupplyNet(net, tuple(pins)), names, (net,), None, location)


def _input_pins(bench: Bench) -> Iterator[Subject]:
    for each in bench.circuit.amplifiers:
        for role, net in (("IN+", each.plus), ("IN-", each.minus)):
            pin = InputPin(each, role, net)
            yield Subject(
                "input pin",
                f"{role} of {each.name}",
                pin,
                (each.name,),
                (net,),
                _stage_name(bench, each),
                each.location,
            )


def _stages(bench: Bench) -> Iterator[Subject]:
    for stage in bench.stages:
        nets = (stage.output,) if stage.output is not None else ()
        yield Subject("stage", stage.name, stage, stage.amplifiers or (stage.name,), nets, stage.name, stage.location)


_LISTS: dict[str, Callable[[Bench], Iterator[Subject]]] = {
    "netlist": _netlist,
    "rail": _rails,
    "net": _nets,
    "part": _parts,
    "package": _packages,
    "amplifier": _amplifiers,
    "supply net": _supply_nets,
    "supply pin": _supply_pins,
    "input pin": _input_pins,
    "stage": _stages,
}
