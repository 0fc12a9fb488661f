"""The catalogue of part data: shipped families, a house's own, and what an intent file declares.

Files are validated once (:mod:`.partfiles`, pydantic) and kept compiled as JSON, so that a warm start validates
nothing again. Later sources win: declared parts over house folders over the shipped families.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields
from functools import lru_cache
from pathlib import Path
from typing import Any

from ..errors import IntentError, Problem, RulePackError
from ..quantities import nearest_names
from ..resources import compiled, core_folder, gather, parse_toml
from .partdata import PartData, Pinout
from .partnames import is_suffix, plain_number


class Catalogue:
    """Part data by name."""

    def __init__(self, parts: Iterable[PartData]) -> None:
        self.parts: tuple[PartData, ...] = tuple(parts)
        self._numbers: dict[str, PartData] = {}
        for part in self.parts:
            for name in (part.name, *part.aliases):
                self._numbers[name.upper()] = part
        self._lengths = sorted({len(each) for each in self._numbers}, reverse=True)
        self._found: dict[str, PartData | None] = {}

    def find(self, name: str | None) -> PartData | None:
        """Return the data of the family that a part number belongs to, by its longest known beginning.

        >>> Catalogue([PartData("AD711", "op-amp", ("AD712",))]).find("ad712jrz").name
        'AD711'
        """
        if not name:
            return None
        if name not in self._found:
            self._found[name] = self._search(plain_number(name))
        return self._found[name]

    def nearest(self, name: str) -> tuple[str, ...]:
        """Return known numbers near a name."""
        return nearest_names(name, self._numbers)

    def number_in(self, name: str) -> str | None:
        """Return the family number that ``name`` begins with."""
        plain = plain_number(name)
        for length in self._lengths:
            if plain[:length] in self._numbers and len(plain) >= length and is_suffix(plain[length:]):
                return plain[:length]
        return None

    def _search(self, plain: str) -> PartData | None:
        for length in self._lengths:
            if len(plain) < length:
                continue
            found = self._numbers.get(plain[:length])
            if found is not None and is_suffix(plain[length:]):
                return found
        return None


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
    for name in ("aliases", "channels", "fixed_output_v", "from_memory", "pin_order"):
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
