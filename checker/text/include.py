"""Files that a netlist may ask for: only below its own folder and the declared library folders."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from ..errors import IncludeRefused, Location, NetlistError, Problem
from .source import Limits, SourceText, read_source


@dataclass(slots=True)
class IncludeFolders:
    """The folders that may be read, and what was read so far.

    ``folder`` is that of the netlist (None refuses every include). Paths are resolved before they are judged, so
    that neither ``..`` nor a link leads outside.
    """

    folder: Path | None
    libraries: Sequence[Path]
    limits: Limits
    spent: int = 0
    files: list[tuple[str, str]] = field(default_factory=list)

    def open(self, wanted: str, asking: Path | None, place: Location) -> tuple[Path, SourceText]:
        """Read an included file.

        Raises
        ------
        IncludeRefused
            When the path is absolute or leads outside the folders.
        NetlistError
            When no such file exists or it cannot be read.
        """
        if self.folder is None:
            raise IncludeRefused(
                Problem("include-refused", f"`{wanted}` is not read: this text has no folder of its own", place)
            )
        name = wanted.replace("\\", "/")
        if name.startswith(("/", "~")) or (len(name) > 1 and name[1] == ":"):
            raise IncludeRefused(
                Problem(
                    "include-refused",
                    f"`{wanted}` is an absolute path",
                    place,
                    expected="a path below the netlist's folder or a declared library folder",
                    cure="copy the file beside the netlist, or list its folder under [netlists] libraries in review.toml",
                )
            )
        starts = [asking.parent if asking is not None else self.folder, self.folder, *self.libraries]
        outside = False
        for start in dict.fromkeys(starts):
            candidate = start / name
            try:
                path = candidate.resolve()
            except (OSError, RuntimeError, ValueError):
                continue
            if not self._is_allowed(path):
                outside = True
                continue
            if path.is_file():
                source = read_source(path, self._shown(path), self.limits, self.spent)
                self.spent += source.size
                self.files.append((source.name, source.sha256))
                return path, source
        if outside:
            raise IncludeRefused(
                Problem(
                    "include-refused",
                    f"`{wanted}` lies outside the folders that may be read",
                    place,
                    expected="a path below the netlist's folder or a declared library folder",
                    cure="list its folder under [netlists] libraries in review.toml",
                )
            )
        raise NetlistError(
            Problem(
                "include-missing",
                f"no file `{wanted}` below the netlist's folder or the library folders",
                place,
                cure="correct the path, or list the file's folder under [netlists] libraries in review.toml",
            )
        )

    def _is_allowed(self, path: Path) -> bool:
        roots = [self.folder, *self.libraries]
        return any(root is not None and path.is_relative_to(root.resolve()) for root in roots)

    def _shown(self, path: Path) -> str:
        for root in (self.folder, *self.libraries):
            if root is not None and path.is_relative_to(root.resolve()):
                return (root / path.relative_to(root.resolve())).as_posix()
        return path.as_posix()
