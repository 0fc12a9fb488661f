"""What names mean in a rule: measures of its subject, its limits, and related subjects."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

from ..analysis.figures import Figure, Known, Unknown
from ..analysis.measures import find_measure, list_measures
from ..analysis.relations import RELATIONS, related_subjects
from ..analysis.subjects import Subject
from .conditions import NameType

if TYPE_CHECKING:
    from ..analysis.bench import Bench


class RuleScope:
    """Names while a rule file is loaded."""

    def __init__(self, subject: str, limits: Mapping[str, str] | None = None) -> None:
        self.subject = subject
        self.limits = dict(limits or {})

    def type_of(self, name: str) -> NameType | None:
        """Return unit and kind of a name; None when nothing is called so."""
        if name in self.limits:
            return NameType(self.limits[name], "number")
        if name == "subject":
            return NameType("", "word")
        found = find_measure(self.subject, name)
        return None if found is None else NameType(found.unit, found.kind)

    def related(self, name: str) -> RuleScope | None:
        """Return the scope of the members of a relation."""
        found = RELATIONS.get((self.subject, name))
        return None if found is None else RuleScope(found.members)

    def known(self) -> tuple[str, ...]:
        """Return all names, for suggestions."""
        relations = [name for kind, name in RELATIONS if kind == self.subject]
        return (*self.limits, *(each.name for each in list_measures(self.subject)), *relations, "subject")


class SubjectReading:
    """Names while a rule is applied to one subject."""

    def __init__(self, bench: Bench, subject: Subject, limits: Mapping[str, float | None] | None = None) -> None:
        self.bench = bench
        self.subject = subject
        self.limits = limits or {}

    def figure(self, name: str) -> Figure:
        """Return the figure of a name."""
        if name in self.limits:
            value = self.limits[name]
            return Unknown(f"the limit {name} is not set") if value is None else Known(value)
        if name == "subject":
            return Known(self.subject.name)
        return self.bench.figure(name, self.subject)

    def members(self, relation: str) -> tuple[SubjectReading, ...]:
        """Return the readings of related subjects."""
        found = related_subjects(self.bench, self.subject, relation)
        return tuple(SubjectReading(self.bench, each) for each in found)
