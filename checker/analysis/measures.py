"""The registry of measures: each figure is declared once, with its subject, unit, formula and source.

A measure is a function of a :class:`Bench` and a :class:`Subject`; it is called only when a report or a rule asks for
it, and its answer is kept on the bench. Rules, reports and the contributor guide list measures from here.
"""

from __future__ import annotations

import importlib
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from .figures import Figure, Unknown
from .subjects import SUBJECT_KINDS, Subject

if TYPE_CHECKING:
    from .bench import Bench

Compute = Callable[["Bench", Subject], Figure]

KINDS = ("number", "flag", "word", "words", "numbers", "map")

# Modules that declare measures, by the subjects they speak of; loaded on the first question about such a subject.
HOMES: dict[str, tuple[str, ...]] = {  # fmt: skip
    "stage": (
        "stage_names",
        "stage_gain",
        "stage_swing",
        "stage_limits",
        "stage_response",
        "stage_matching",
        "stage_switching",
        "follower",
    ),
    "supply net": ("power",),
    "input pin": ("bias",),
}


@dataclass(frozen=True, slots=True)
class Measure:
    """A declared figure: ``unit`` in SI (``""`` for a plain ratio), ``kind`` one of number, flag, word, words, numbers, map."""

    name: str
    subject: str
    unit: str
    kind: str
    compute: Compute

    @property
    def text(self) -> str:
        """The docstring of the computing function: meaning, formula, source."""
        return (self.compute.__doc__ or "").strip()


_REGISTRY: dict[tuple[str, str], Measure] = {}
_LOADED: set[str] = set()


def measure(
    subject: str, *, unit: str = "", kind: str = "number", name: str | None = None
) -> Callable[[Compute], Compute]:
    """Declare the decorated function as the measure of its name on subjects of the given kind."""
    if subject not in SUBJECT_KINDS:
        raise ValueError(f"unknown subject kind {subject!r}")
    if kind not in KINDS:
        raise ValueError(f"unknown kind of measure {kind!r}")

    def declare(compute: Compute) -> Compute:
        key = (subject, name or compute.__name__)
        if key in _REGISTRY and _REGISTRY[key].compute is not compute:
            raise ValueError(f"measure {key[1]!r} of {subject!r} is declared twice")
        _REGISTRY[key] = Measure(key[1], subject, unit, kind, compute)
        return compute

    return declare


def load_measures(subject: str | None = None) -> None:
    """Import the modules that declare measures of ``subject`` (all of them without one)."""
    for kind in (subject,) if subject is not None else SUBJECT_KINDS:
        for module in HOMES.get(kind, ()):
            if module not in _LOADED:
                _LOADED.add(module)
                importlib.import_module(f".{module}", __package__)


def find_measure(subject: str, name: str) -> Measure | None:
    """Return the measure, or None when nothing of that name is declared for the subject kind."""
    load_measures(subject)
    return _REGISTRY.get((subject, name))


def list_measures(subject: str | None = None) -> tuple[Measure, ...]:
    """Return all measures (of one subject kind), sorted by subject and name."""
    load_measures(subject)
    found = [each for key, each in _REGISTRY.items() if subject in (None, key[0])]
    return tuple(sorted(found, key=lambda each: (each.subject, each.name)))


def compute_measure(bench: Bench, subject: Subject, name: str) -> Figure:
    """Compute one figure; an undeclared name is answered with its absence, not with an exception."""
    found = find_measure(subject.kind, name)
    if found is None:
        return Unknown(f"no measure {name!r} is declared for a {subject.kind}")
    return found.compute(bench, subject)
