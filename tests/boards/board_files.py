"""The good boards and the ways to break them, read from ``good/``."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

GOOD = Path(__file__).parent / "good"


@dataclass(frozen=True)
class Break:
    """One defect put into a good board, and the rules of which one must name it."""

    board: Path
    what: str
    rules: tuple[str, ...]
    replace: dict[str, str]
    remove: tuple[str, ...]
    add: tuple[str, ...]

    @property
    def id(self) -> str:
        return f"{self.board.stem}: {self.what}"

    def text(self) -> str:
        """The netlist with the defect."""
        lines = []
        touched = set()
        for line in self.board.read_text(encoding="utf-8").splitlines():
            name = line.split(maxsplit=1)[0] if line.strip() else ""
            if name in self.replace:
                touched.add(name)
                lines.append(self.replace[name])
            elif name in self.remove:
                touched.add(name)
            elif line.strip().lower() == ".end":
                lines += [*self.add, line]
            else:
                lines.append(line)
        missing = {*self.replace, *self.remove} - touched
        if missing:
            raise AssertionError(f"{self.id}: no line {sorted(missing)} on the board")
        return "\n".join(lines) + "\n"


def good_boards() -> list[Path]:
    """Paths of all good boards."""
    return sorted(GOOD.glob("*.cir"))


def intent_text(board: Path) -> str:
    """The intent file of a board, or nothing."""
    path = board.with_suffix(".toml")
    return path.read_text(encoding="utf-8") if path.exists() else ""


def breaks() -> list[Break]:
    """All defects of all boards."""
    found = []
    for board in good_boards():
        document: dict[str, Any] = tomllib.loads(board.with_suffix(".breaks.toml").read_text(encoding="utf-8"))
        for each in document["breaks"]:
            rule = each["rule"]
            found.append(
                Break(
                    board,
                    each["what"],
                    (rule,) if isinstance(rule, str) else tuple(rule),
                    each.get("replace", {}),
                    tuple(each.get("remove", ())),
                    tuple(each.get("add", ())),
                )
            )
    return found
