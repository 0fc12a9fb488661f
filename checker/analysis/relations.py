"""Which subjects belong to which: the inputs of a stage, the packages on a supply net."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from .listing import InputPin, SupplyPin
from .subjects import Subject

if TYPE_CHECKING:
    from .bench import Bench


@dataclass(frozen=True, slots=True)
class Relation:
    """``members`` is the kind of the related subjects; a member belongs where its key is that of the subject."""

    members: str
    key_of_subject: Callable[[Subject], str]
    keys_of_member: Callable[[Bench, Subject], Iterable[str]]


def _name(subject: Subject) -> str:
    return subject.name


def _first_net(subject: Subject) -> str:
    return subject.nets[0] if subject.nets else ""


def _stage(bench: Bench, member: Subject) -> Iterable[str]:
    return (member.stage,) if member.stage is not None else ()


def _nets(bench: Bench, member: Subject) -> Iterable[str]:
    return member.nets


def _amplifier(bench: Bench, member: Subject) -> Iterable[str]:
    assert isinstance(member.item, InputPin)
    return (member.item.amplifier.name,)


def _package(bench: Bench, member: Subject) -> Iterable[str]:
    amplifier = bench.circuit.amplifier(member.name)
    return (amplifier.designator,) if amplifier is not None else ()


def _package_of_pin(bench: Bench, member: Subject) -> Iterable[str]:
    assert isinstance(member.item, SupplyPin)
    return (member.item.designator,)


RELATIONS: dict[tuple[str, str], Relation] = {
    ("stage", "amplifiers"): Relation("amplifier", _name, _stage),
    ("stage", "input_pins"): Relation("input pin", _name, _stage),
    ("stage", "components"): Relation("part", _name, _stage),
    ("amplifier", "input_pins"): Relation("input pin", _name, _amplifier),
    ("package", "amplifiers"): Relation("amplifier", _name, _package),
    ("package", "supply_pins"): Relation("supply pin", _name, _package_of_pin),
    ("supply net", "supply_pins"): Relation("supply pin", _first_net, _nets),
    ("rail", "supply_pins"): Relation("supply pin", _first_net, _nets),
}


def related_subjects(bench: Bench, subject: Subject, relation: str) -> tuple[Subject, ...]:
    """Return the subjects that a relation names, in netlist order."""
    key = (subject.kind, relation)
    found = RELATIONS.get(key)
    if found is None:
        return ()
    if key not in bench.related:
        groups: dict[str, list[Subject]] = {}
        for member in bench.subjects(found.members):
            for each in found.keys_of_member(bench, member):
                groups.setdefault(each, []).append(member)
        bench.related[key] = groups
    return tuple(bench.related[key].get(found.key_of_subject(subject), ()))
