"""The only place that knows where shipped and house data lie.

Reads TOML with the line of each key, finds the folders of the package's knowledge, and keeps compiled knowledge as
JSON in the user's cache folder, keyed by the content it was made from. JSON only: no input may run code.
"""

from __future__ import annotations

import hashlib
import json
import os
import re
import tempfile
import tomllib
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import Any

from .errors import AmpwardenError, Location, Problem, RulePackError
from .version import __version__

KNOWLEDGE = ("checks", "topologies", "parts", "series")


def core_folder(kind: str) -> Traversable:
    """Return the shipped folder of one kind of knowledge: checks, topologies, parts or series."""
    if kind not in KNOWLEDGE:
        raise ValueError(f"no such knowledge: {kind}")
    return files("ampwarden.rules").joinpath(kind)


def grammar_text(name: str) -> str:
    """Return the text of a shipped grammar, such as ``netlist`` for ``netlist.lark``."""
    return files("ampwarden.grammar").joinpath(f"{name}.lark").read_text(encoding="utf-8")


def toml_files(folder: Traversable | Path) -> tuple[Traversable | Path, ...]:
    """Return all TOML files below a folder, sorted by their path."""
    found: list[tuple[str, Traversable | Path]] = []

    def walk(place: Traversable | Path, prefix: str) -> None:
        for each in place.iterdir():
            if each.is_dir():
                if not each.name.startswith((".", "_")):
                    walk(each, f"{prefix}{each.name}/")
            elif each.name.endswith(".toml"):
                found.append((f"{prefix}{each.name}", each))

    if folder.is_dir():
        walk(folder, "")
    return tuple(each for _, each in sorted(found, key=lambda pair: pair[0]))


@dataclass(frozen=True, slots=True)
class TomlDocument:
    """A TOML file as plain data, with the line on which each key stands."""

    data: dict[str, Any]
    path: str
    text: str
    lines: dict[tuple[str | int, ...], int] = field(default_factory=dict)

    def line_of(self, *keys: str | int) -> int:
        """Return the line of the nearest enclosing key that is written in the file (1 when none is)."""
        for end in range(len(keys), 0, -1):
            if keys[:end] in self.lines:
                return self.lines[keys[:end]]
        return 1

    def location(self, *keys: str | int) -> Location:
        """Return the place of a key, with its line as excerpt."""
        line = self.line_of(*keys)
        rows = self.text.splitlines()
        return Location(self.path, line, excerpt=rows[line - 1] if line <= len(rows) else None)


def read_toml(path: Traversable | Path, error: type[AmpwardenError] = RulePackError) -> TomlDocument:
    """Read a TOML file; trouble is raised as ``error`` with file and line."""
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except OSError as trouble:
        raise error(Problem("file-unreadable", f"cannot read {path}: {trouble.strerror or trouble}")) from trouble
    except UnicodeDecodeError as trouble:
        raise error(Problem("not-utf8", f"{path} is not UTF-8 text", cure="save the file as UTF-8")) from trouble
    return parse_toml(text, str(path), error)


def parse_toml(text: str, name: str, error: type[AmpwardenError] = RulePackError) -> TomlDocument:
    """Parse TOML text; trouble is raised as ``error`` with file and line."""
    try:
        data = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as trouble:
        message = str(trouble)
        match = re.search(r"\(at line (\d+), column (\d+)\)", message)
        rows = text.splitlines() or [""]
        line, column = (int(match[1]), int(match[2])) if match else (len(rows), 1)
        what = re.sub(r"\s*\(at .*\)$", "", message)
        place = Location(name, line, column, rows[min(line, len(rows)) - 1])
        raise error(Problem("toml-syntax", f"not valid TOML: {what[:1].lower()}{what[1:]}", place)) from trouble
    return TomlDocument(data, name, text, _key_lines(text))


_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\]]+?)\s*\]\]?\s*(?:#.*)?$")
_KEY = re.compile(r"""^\s*((?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*=""")
_KEY_PART = re.compile(r"""[A-Za-z0-9_-]+|"[^"]*"|'[^']*'""")
_INLINE = re.compile(r"""[{,]\s*([A-Za-z0-9_-]+|"[^"]*"|'[^']*')\s*=""")


def _split_key(text: str) -> tuple[str, ...]:
    return tuple(part.strip("\"'") for part in _KEY_PART.findall(text))


def _key_lines(text: str) -> dict[tuple[str | int, ...], int]:
    """Map each written key to its line; text inside multi-line strings and arrays is passed over."""
    lines: dict[tuple[str | int, ...], int] = {}
    counts: dict[tuple[str | int, ...], int] = {}
    table: tuple[str | int, ...] = ()
    closing: str | None = None
    depth = 0
    for number, row in enumerate(text.splitlines(), 1):
        if closing is not None:
            if closing in row:
                closing = None
            continue
        if depth > 0:
            depth += _bracket_balance(row)
            continue
        header = _HEADER.match(row)
        if header:
            table = _enter_table(header[1] == "[[", _split_key(header[2]), counts)
            lines.setdefault(table, number)
            continue
        key = _KEY.match(row)
        if not key:
            continue
        path = (*table, *_split_key(key[1]))
        lines.setdefault(path, number)
        value = row[key.end() :]
        for inner in _INLINE.finditer(value):
            lines.setdefault((*path, inner[1].strip("\"'")), number)
        for quotes in ("'''", '"""'):
            if value.lstrip().startswith(quotes) and value.count(quotes) == 1:
                closing = quotes
        if closing is None:
            depth = max(0, _bracket_balance(value))
    return lines


def _enter_table(
    is_array: bool, keys: tuple[str, ...], counts: dict[tuple[str | int, ...], int]
) -> tuple[str | int, ...]:
    path: tuple[str | int, ...] = ()
    for index, key in enumerate(keys):
        path = (*path, key)
        if index == len(keys) - 1 and is_array:
            counts[path] = counts.get(path, -1) + 1
        if path in counts:
            path = (*path, counts[path])
    return path


def _bracket_balance(row: str) -> int:
    bare = re.sub(r'"(?:\\.|[^"\\])*"|\'[^\']*\'|#.*$', "", row)
    return bare.count("[") - bare.count("]") + bare.count("{") - bare.count("}")


def cache_folder() -> Path:
    """Return the folder for compiled knowledge: ``AMPWARDEN_CACHE``, else the user's cache folder."""
    own = os.environ.get("AMPWARDEN_CACHE")
    if own:
        return Path(own)
    base = os.environ.get("XDG_CACHE_HOME") or os.environ.get("LOCALAPPDATA")
    return (Path(base) if base else Path.home() / ".cache") / "ampwarden"


def compiled(kind: str, sources: Sequence[tuple[str, bytes]], build: Callable[[], Any]) -> Any:
    """Return JSON-able data built from ``sources``, from the cache when these bytes were compiled before.

    ``sources`` are (name, content) pairs; the key covers them and the tool's version. A cache that cannot be read or
    written only costs time.
    """
    digest = hashlib.sha256(f"{kind} {__version__}".encode())
    for name, content in sources:
        digest.update(f"\0{name}\0{len(content)}\0".encode())
        digest.update(content)
    key = digest.hexdigest()
    try:
        place = cache_folder() / f"{kind}-{key[:32]}.json"
        held = json.loads(place.read_bytes())
        if isinstance(held, dict) and held.get("key") == key:
            return held["data"]
    except (OSError, ValueError, KeyError, RuntimeError):
        pass
    data = build()
    _keep(kind, key, data)
    return data


def _keep(kind: str, key: str, data: Any) -> None:
    try:
        folder = cache_folder()
        folder.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(dir=folder, suffix=".tmp")
        with os.fdopen(handle, "w", encoding="utf-8") as stream:
            json.dump({"key": key, "data": data}, stream, separators=(",", ":"))
        Path(name).replace(folder / f"{kind}-{key[:32]}.json")
        _forget_older(folder, kind, keep=12)
    except (OSError, RuntimeError):
        return


def _forget_older(folder: Path, kind: str, keep: int) -> None:
    held = sorted(folder.glob(f"{kind}-*.json"), key=lambda each: each.stat().st_mtime, reverse=True)
    for each in held[keep:]:
        each.unlink(missing_ok=True)


def gather(folders: Iterable[Traversable | Path]) -> tuple[tuple[str, bytes], ...]:
    """Return (path, content) of every TOML file below the folders, in a fixed order."""
    return tuple((str(each), each.read_bytes()) for folder in folders for each in toml_files(folder))
