"""The part catalogue: families from ``rules/parts``, house parts, and the rules by which a part number finds them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields
from functools import lru_cache
from pathlib import Path
from typing import Any

from ..errors import IntentError, Problem, RulePackError
from ..quantities import nearest_names
from ..resources import compiled, core_folder, gather, parse_toml
from .partdata import PartData, Pinout

# What may stand behind a base number: package, grade and temperature letters, tape codes, model tails.
_TAIL = re.compile(r"^(?:[A-Z]{0,4}\d?[A-Z]{0,3})?(?:[-/_.#].*)?$")

# Letters behind these numbers mean other silicon with other limits, not a grade.
_OTHER_SILICON = {"LM358": "B", "LM2904": "B", "LM393": "B", "LM339": "B", "LM324": "B", "LM2902": "B"}


class Catalogue:
    """Part families that can be found by part number."""

    def __init__(self, parts: Iterable[PartData]) -> None:
        self.parts: tuple[PartData, ...] = tuple(parts)
        self._by_name: dict[str, PartData] = {}
        for part in self.parts:
            for name in (part.name, *part.aliases):
                self._by_name[name.upper()] = part

    def find(self, name: str | None) -> PartData | None:
        """Return the family of a part number: the longest known number that it begins with, or None."""
        if not name:
            return None
        wanted = re.sub(r"[\s]", "", name.upper())
        if wanted in self._by_name:
            return self._by_name[wanted]
        for length in range(len(wanted) - 1, 3, -1):
            base = wanted[:length]
            part = self._by_name.get(base)
            if part is None:
                continue
            tail = wanted[length:]
            if tail[0].isdigit() or not _TAIL.match(tail):
                return None
            if base in _OTHER_SILICON and tail.startswith(_OTHER_SILICON[base]):
                return None
            return part
        return None

    def nearest(self, name: str) -> tuple[str, ...]:
        """Return known numbers near a name."""
        return nearest_names(name, self._by_name)


def load_catalogue(folders: Sequence[Path] = (), declared: Mapping[str, Mapping[str, Any]] | None = None) -> Catalogue:
    """Load the shipped parts, those of house folders (``parts/`` below each), and declared ones; later ones win.

    Raises
    ------
    RulePackError
        When a part file is wrong.
    IntentError
        When a declared part is wrong.
    """
    parts = list(_shipped())
    for folder in folders:
        parts.extend(_load(tuple(gather((folder / "parts",)))))
    for name, data in (declared or {}).items():
        parts.append(_declared(name, data))
    return _shipped_catalogue() if len(parts) == len(_shipped()) else Catalogue(parts)


@lru_cache(maxsize=1)
def _shipped() -> tuple[PartData, ...]:
    return _load(gather((core_folder("parts"),)))


@lru_cache(maxsize=1)
def _shipped_catalogue() -> Catalogue:
    return Catalogue(_shipped())


def _load(sources: tuple[tuple[str, bytes], ...]) -> tuple[PartData, ...]:
    def build() -> list[dict[str, Any]]:
        from .partfiles import read_part

        return [read_part(parse_toml(content.decode("utf-8"), name)) for name, content in sources]

    if not sources:
        return ()
    return tuple(_from_plain(each) for each in compiled("parts", sources, build))


def _from_plain(data: Mapping[str, Any]) -> PartData:
    values = dict(data)
    values["pinouts"] = tuple(
        Pinout(each["package"], each["channels"], tuple((role, number) for role, number in each["roles"]))
        for each in data.get("pinouts", ())
    )
    for name in ("aliases", "channels", "fixed_output_v", "from_memory"):
        if name in values:
            values[name] = tuple(values[name])
    known = {each.name for each in fields(PartData)}
    return PartData(**{name: value for name, value in values.items() if name in known})


def _declared(name: str, data: Mapping[str, Any]) -> PartData:
    from .partfiles import check_part

    try:
        return _from_plain(
            check_part({"name": name, "kind": "op-amp", "source": "declared in the intent file", **data}, name)
        )
    except RulePackError as trouble:
        raise IntentError(
            Problem(each.kind, f"[parts.{name}]: {each.what}", each.location, nearest=each.nearest)
            for each in trouble.problems
        ) from trouble
