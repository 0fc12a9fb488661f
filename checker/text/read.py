"""The doors of the text room: a file or a text in, a :class:`Netlist` out."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from ..errors import NetlistError
from .deck import DeckReader
from .include import IncludeFolders
from .netlist import Netlist
from .source import Limits, SourceText, read_source, text_source


def read_netlist(
    path: str | Path, *, libraries: Sequence[Path] = (), limits: Limits | None = None, style: str | None = None
) -> Netlist:
    """Read a netlist file with what it includes.

    Parameters
    ----------
    path
        The netlist; its folder is the root of what ``.include`` and ``.lib`` may read.
    libraries
        Further folders that they may read.
    limits
        Bounds of reading.
    style
        ``simulation`` or ``board``; inferred from the whole text when not given.

    Raises
    ------
    NetlistError
        With every problem met, when any of them is an error.
    """
    bounds = limits or Limits()
    place = Path(path)
    folders = IncludeFolders(place.parent, tuple(libraries), bounds)
    source = read_source(place, place.as_posix(), bounds)
    folders.spent += source.size
    return _read(source, place, folders, bounds, style)


def parse_netlist(
    text: str,
    *,
    name: str = "<text>",
    libraries: Sequence[Path] = (),
    folder: Path | None = None,
    limits: Limits | None = None,
    style: str | None = None,
) -> Netlist:
    """Read a netlist from text; without a ``folder`` every include is refused. See :func:`read_netlist`."""
    bounds = limits or Limits()
    folders = IncludeFolders(folder, tuple(libraries), bounds)
    return _read(text_source(text, name), None if folder is None else folder / name, folders, bounds, style)


def _read(source: SourceText, path: Path | None, folders: IncludeFolders, limits: Limits, style: str | None) -> Netlist:
    reader = DeckReader(folders, limits, style)
    try:
        reader.read_deck(source, path)
    except RecursionError:
        raise NetlistError(tuple(reader.problems)) from None
    return reader.finish(source.name, source.sha256, [(source.name, source.sha256), *folders.files])
