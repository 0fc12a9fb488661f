"""Logical lines to a :class:`Netlist`: dot lines, scopes, includes; every error of a run is collected.

A reader holds a stack of scopes (the deck, then the open subcircuits). A line that is wrong becomes a problem and
reading goes on with the next one.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path

from ..errors import AmpwardenError, Location, NetlistError, Problem
from ..quantities import nearest_names
from .elements import LineError, read_element
from .expressions import ExpressionError, evaluate
from .include import IncludeFolders
from .lines import LogicalLine, logical_lines
from .netlist import ElementLine, Expression, FunctionLine, ModelLine, Netlist, Scope, Subcircuit, Value
from .source import Limits, SourceText
from .tokens import Field, split_fields

_DESIGNATOR = re.compile(r"^[A-Za-z]{1,3}\d+[A-Za-z0-9_]*$")
_PARAMETER = re.compile(r"([A-Za-z_][\w.]*)\s*=\s*")
_FUNCTION = re.compile(r"^\.func\s+([A-Za-z_]\w*)\s*\(([^)]*)\)\s*=?\s*(.+)$", re.IGNORECASE)

# Analysis and output requests, and what capture programs write: nothing that changes the circuit.
_SKIPPED = frozenset(
    word
    for row in (
        ".op .dc .ac .tran .tf .noise .four .fourier .pz .sens .disto .print .plot .save .probe .meas .measure .step",
        ".width .options .option .opt .temp .nodeset .ic .backanno .wave .net .mc .wcase .dist .savebias .loadbias",
        ".stimulus .vector .watch .alter .data .enddata .malias .csparam .machine .state .tnom .end .title .protect",
        ".unprotect .hier .text .textmode .marker .aliases .endaliases .distribution .external .connect .ends .endl",
        ".lin .pss .sp .stepcontrol .global .param .model .subckt .include .inc .lib .func .if .elseif .else .endif",
        ".control .endc",
    )
    for word in row.split()
)


class DeckReader:
    """Reads the sources of one netlist into one :class:`Netlist`."""

    def __init__(self, folders: IncludeFolders, limits: Limits, style: str | None = None) -> None:
        self.style = style
        self.folders = folders
        self.limits = limits
        self.problems: list[Problem] = []
        self.top = Scope()
        self.globals: set[str] = set()
        self.title = ""
        self._open: list[Subcircuit] = []
        self._reading: list[Path] = []
        self._branches: list[bool] = []
        self._in_control = False
        self._ended: LogicalLine | None = None
        self._seen: dict[tuple[int, str], ElementLine] = {}

    @property
    def scope(self) -> Scope:
        """The innermost open scope."""
        return self._open[-1].scope if self._open else self.top

    def read_deck(self, source: SourceText, path: Path | None) -> None:
        """Read the netlist itself, with its title rule."""
        if self.style is None:
            self.style = "simulation" if looks_simulated(source) else "board"
        has_title = self._has_title(source)
        if has_title:
            self.title = source.lines[0].strip().lstrip("*").strip() if source.lines else ""
        self._read(source, path, has_title=has_title)
        self._close_all(source)

    def _has_title(self, source: SourceText) -> bool:
        """Tell whether line 1 is a title: all but a dot line, or an element whose nets the deck uses elsewhere."""
        if not source.lines:
            return False
        first = source.lines[0].strip()
        if first.startswith("."):
            return first.split()[0].lower() not in _SKIPPED or first.lower().startswith(".title")
        words = split_fields(first.split(";")[0])
        if not words or len(words) < 3 or not _DESIGNATOR.match(words[0].text):
            return True
        line = LogicalLine(first, source, ((0, 1, 1),))
        try:
            element = read_element(line, words)
        except LineError:
            return True
        if not element.nets:
            return True
        others = {word for row in source.lines[1:] for word in row.split()}
        if not all(net in others for net in element.nets):
            return True
        self.problems.append(
            Problem(
                "title-is-an-element",
                f"line 1 is read as the element {element.designator}, not as a title",
                Location(source.name, 1, 1, source.lines[0], len(words[0].text)),
                level="warning",
                because="simulators take line 1 as the title and lose an element written there",
                cure="put a title line before it",
            )
        )
        return False

    def _read(self, source: SourceText, path: Path | None, *, has_title: bool) -> None:
        for line in logical_lines(source, self.problems, has_title=has_title, limits=self.limits):
            if self._count_errors() >= self.limits.errors:
                return
            try:
                self._statement(line, path)
            except LineError as wrong:
                self._wrong(line, wrong)
            except AmpwardenError as trouble:
                self.problems.extend(trouble.problems)

    def _count_errors(self) -> int:
        return sum(1 for each in self.problems if each.level == "error")

    def _wrong(self, line: LogicalLine, wrong: LineError) -> None:
        self.problems.append(
            Problem(
                wrong.kind, wrong.what, line.place(wrong.offset, wrong.length), expected=wrong.expected, cure=wrong.cure
            )
        )

    def _statement(self, line: LogicalLine, path: Path | None) -> None:
        text = line.text
        if text[0] == ".":
            self._dot_line(line, path)
            return
        if self._in_control or not all(self._branches):
            return
        if self._ended is not None:
            self._after_end(line)
            return
        fields = split_fields(text)
        if fields is None:
            fields = self._fields_by_grammar(line)
        if not fields:
            return
        letter = fields[0].text[0].upper()
        if not letter.isalpha():
            raise LineError(
                "not-a-line",
                f"`{fields[0].text[:24]}` begins neither an element nor a dot line",
                fields[0].offset,
                len(fields[0].text),
                "an element line such as R1 net net 10k, a dot line, or a comment that begins with *",
            )
        element = read_element(line, fields, is_board=self.style == "board")
        self.scope.elements.append(element)

    def _after_end(self, line: LogicalLine) -> None:
        if not any(each.kind == "text-after-end" for each in self.problems):
            self.problems.append(
                Problem(
                    "text-after-end",
                    "text after .end is not read",
                    line.place(),
                    level="warning",
                    because="simulators differ: some read on, some stop",
                    cure="remove the text, or move it before .end",
                )
            )

    def _fields_by_grammar(self, line: LogicalLine) -> list[Field]:
        from .grammar import fields_by_grammar

        return fields_by_grammar(line)

    def _dot_line(self, line: LogicalLine, path: Path | None) -> None:
        word = line.text.split(None, 1)[0].split("(")[0].lower()
        if word == ".control":
            self._in_control = True
        elif word == ".endc":
            self._in_control = False
        if self._in_control or word == ".endc":
            return
        if word in {".if", ".elseif", ".else", ".endif"}:
            self._conditional(word, line)
            return
        if not all(self._branches) or self._ended is not None:
            return
        actions = {
            ".subckt": self._subckt,
            ".ends": self._ends,
            ".eom": self._ends,
            ".macro": self._subckt,
            ".model": self._model,
            ".param": self._param,
            ".parameter": self._param,
            ".params": self._param,
            ".func": self._func,
            ".global": self._global,
        }
        if word in actions:
            actions[word](line)
        elif word in {".include", ".inc"}:
            self._include(line, path)
        elif word == ".lib":
            self._lib(line, path)
        elif word == ".end":
            self._ended = line
        elif word == ".title":
            self.title = line.text[len(word) :].strip()
        elif word not in _SKIPPED:
            self.problems.append(
                Problem(
                    "unknown-dot-line",
                    f"`{word}` is not known and is passed over",
                    line.place(0, len(word)),
                    level="warning",
                    nearest=nearest_names(word, _SKIPPED),
                )
            )

    def _fields(self, line: LogicalLine) -> list[Field]:
        fields = split_fields(line.text)
        return fields if fields is not None else self._fields_by_grammar(line)

    def _subckt(self, line: LogicalLine) -> None:
        fields = self._fields(line)[1:]
        words = [each for each in fields if each.name is None and each.text.lower() != "params:"]
        if not words:
            raise LineError(
                "subckt-without-name", ".subckt names no subcircuit", len(line.text), 1, ".subckt name net …"
            )
        if len(self._open) >= self.limits.subcircuit_depth:
            raise LineError(
                "nested-too-deep",
                f"definitions nested deeper than the bound of {self.limits.subcircuit_depth}",
                0,
                len(line.text),
                "fewer levels, or a higher subcircuit_depth in the call of read_netlist",
            )
        name = words[0].bare
        params = {each.name.lower(): self._value(each) for each in fields if each.name is not None}
        own = Subcircuit(name, tuple(each.bare for each in words[1:]), params, Scope(), line.place(0, 7), line.remarks)
        earlier = self.scope.subcircuits.get(name.lower())
        if earlier is not None:
            self.problems.append(
                Problem(
                    "subcircuit-defined-twice",
                    f"subcircuit `{name}` is defined twice; the first definition is at {earlier.location}",
                    line.place(words[0].offset, len(name)),
                    level="warning",
                    because="readers differ in which definition they take; the first is used here",
                    cure="rename or remove one of them",
                )
            )
        else:
            self.scope.subcircuits[name.lower()] = own
        self._open.append(own)

    def _ends(self, line: LogicalLine) -> None:
        words = line.text.split()
        if not self._open:
            raise LineError(
                "ends-without-subckt", ".ends closes no subcircuit", 0, len(words[0]), "a .subckt line before it"
            )
        if len(words) > 1 and words[1].lower() != self._open[-1].name.lower():
            names = [each.name.lower() for each in self._open]
            if words[1].lower() in names:
                while self._open and self._open[-1].name.lower() != words[1].lower():
                    self._open.pop()
            else:
                self.problems.append(
                    Problem(
                        "ends-of-other-name",
                        f".ends {words[1]} closes the subcircuit `{self._open[-1].name}`",
                        line.place(line.text.index(words[1]), len(words[1])),
                        level="warning",
                        cure=f"write .ends {self._open[-1].name}",
                    )
                )
        self._open.pop()

    def _close_all(self, source: SourceText) -> None:
        for each in self._open:
            self.problems.append(
                Problem(
                    "subckt-not-closed",
                    f"subcircuit `{each.name}` is not closed by .ends",
                    each.location,
                    cure="add .ends behind its last line",
                )
            )
        self._open.clear()

    def _model(self, line: LogicalLine) -> None:
        fields = self._fields(line)[1:]
        words = [each for each in fields if each.name is None]
        if len(words) < 2:
            raise LineError(
                "model-incomplete",
                ".model needs a name and a kind",
                len(line.text),
                1,
                ".model name kind(parameter=value …)",
            )
        kind = words[1].bare
        base: str | None = None
        if kind.lower().startswith("ako:"):
            base = kind[4:]
            kind = words[2].bare if len(words) > 2 else ""
        params = {each.name.lower(): self._value(each) for each in fields if each.name is not None}
        name = words[0].bare
        self.scope.models.setdefault(
            name.lower(), ModelLine(name, kind.upper(), params, line.place(words[0].offset, len(name)), base)
        )

    def _value(self, field: Field) -> Value:
        value = field.value()
        return value if value is not None else Expression(field.bare)

    def _param(self, line: LogicalLine) -> None:
        text = line.text
        marks = list(_PARAMETER.finditer(text))
        starts = [mark for mark in marks if not _inside_brackets(text, mark.start())]
        if not starts:
            raise LineError("param-without-value", ".param gives no name=value", len(text), 1, ".param name=value …")
        for index, mark in enumerate(starts):
            end = starts[index + 1].start() if index + 1 < len(starts) else len(text)
            written = text[mark.end() : end].strip().rstrip(",").strip()
            if not written:
                raise LineError(
                    "param-without-value",
                    f"parameter `{mark[1]}` has no value",
                    mark.start(),
                    len(mark[1]),
                    ".param name=value …",
                )
            bare = written[1:-1].strip() if written[0] in "{'" and written[-1] in "}'" else written
            from .values import read_value

            number = read_value(bare)
            self.scope.params[mark[1].lower()] = number if number is not None else Expression(bare)

    def _func(self, line: LogicalLine) -> None:
        match = _FUNCTION.match(line.text)
        if not match:
            raise LineError(
                "func-unreadable", ".func is not complete", 0, len(line.text), ".func name(argument, …) {expression}"
            )
        arguments = tuple(each.strip().lower() for each in match[2].split(",") if each.strip())
        body = match[3].strip().strip("{}'").strip()
        self.scope.functions[match[1].lower()] = FunctionLine(match[1], arguments, Expression(body), line.place())

    def _global(self, line: LogicalLine) -> None:
        self.globals.update(each.bare for each in self._fields(line)[1:] if each.name is None)

    def _conditional(self, word: str, line: LogicalLine) -> None:
        if word == ".if":
            self._branches.append(self._holds(line, 3) if all(self._branches) else False)
            return
        if not self._branches:
            raise LineError("endif-without-if", f"{word} without .if", 0, len(word), "a .if line before it")
        if word == ".endif":
            self._branches.pop()
        elif word == ".else":
            self._branches[-1] = not self._branches[-1]
        else:
            self._branches[-1] = not self._branches[-1] and self._holds(line, 7)

    def _holds(self, line: LogicalLine, width: int) -> bool:
        text = line.text[width:].strip()
        names = {name: value for name, value in self.scope.params.items() if isinstance(value, float)}
        try:
            return bool(evaluate(text, names, self.scope.functions))
        except ExpressionError as trouble:
            raise LineError(
                "condition-unreadable", f"condition of .if: {trouble}", width, len(text), ".if (expression)"
            ) from trouble

    def _include(self, line: LogicalLine, path: Path | None) -> None:
        words = line.text.split(None, 1)
        if len(words) < 2:
            raise LineError("include-without-file", f"{words[0]} names no file", len(line.text), 1, ".include file")
        self._read_file(words[1].strip().strip("\"'"), line, path, None)

    def _lib(self, line: LogicalLine, path: Path | None) -> None:
        words = [each.strip("\"'") for each in re.findall(r"\"[^\"]*\"|'[^']*'|\S+", line.text)][1:]
        if not words:
            raise LineError("include-without-file", ".lib names no file", len(line.text), 1, ".lib file [section]")
        if len(words) == 1 and "." not in words[0]:
            return
        self._read_file(words[0], line, path, words[1].lower() if len(words) > 1 else None)

    def _read_file(self, wanted: str, line: LogicalLine, path: Path | None, section: str | None) -> None:
        place = line.place(line.text.find(wanted), len(wanted))
        file, source = self.folders.open(wanted, path, place)
        if file in self._reading:
            raise NetlistError(
                Problem("include-circle", f"`{wanted}` includes itself", place, cure="remove one of the includes")
            )
        if len(self._reading) >= self.limits.include_depth:
            raise NetlistError(
                Problem(
                    "include-too-deep",
                    f"includes nested deeper than the bound of {self.limits.include_depth}",
                    place,
                    cure="raise include_depth in the call of read_netlist",
                )
            )
        if section is not None:
            source = _section_of(source, section, place)
        self._reading.append(file)
        try:
            self._read(source, file, has_title=False)
        finally:
            self._reading.pop()

    def finish(self, name: str, sha256: str, files: Sequence[tuple[str, str]]) -> Netlist:
        """Return the netlist, or raise every error that was met."""
        errors = [each for each in self.problems if each.level == "error"]
        if errors:
            raise NetlistError(self.problems)
        return Netlist(
            path=name,
            title=self.title,
            sha256=sha256,
            scope=self.top,
            globals=frozenset(self.globals),
            files=tuple(files),
            problems=tuple(self.problems),
            style=self.style or "simulation",
        )


_SOURCE_LINE = re.compile(r"^[VIEFGHB]\w*\s+\S+\s+\S+\s+\S", re.IGNORECASE)
_PACKAGE_LINE = re.compile(r"^(?:U|IC|J|P|CN|X[A-Z]?U)\w*\s+\S+\s+\S+", re.IGNORECASE)


def looks_simulated(source: SourceText) -> bool:
    """Tell a simulation deck from a board export: sources, models and dot lines are a simulator's."""
    has_package = False
    for row in source.lines[1:]:
        text = row.strip()
        if text[:1] == ".":
            if text.split()[0].lower() not in {".end", ".title", ".global"}:
                return True
        elif _SOURCE_LINE.match(text):
            return True
        elif _PACKAGE_LINE.match(text):
            has_package = True
    return not has_package


def _section_of(source: SourceText, section: str, place: Location) -> SourceText:
    """Keep the lines of one .lib section; the others become blank so that line numbers stay."""
    inside = False
    found = False
    kept = []
    for row in source.lines:
        words = row.split()
        head = words[0].lower() if words else ""
        if head == ".lib" and len(words) == 2:
            inside = words[1].strip("\"'").lower() == section
            found = found or inside
            kept.append("")
        elif head == ".endl":
            inside = False
            kept.append("")
        else:
            kept.append(row if inside else "")
    if not found:
        raise NetlistError(Problem("section-missing", f"{source.name} has no section `{section}`", place))
    return SourceText(source.name, tuple(kept), source.sha256, source.size)


def _inside_brackets(text: str, position: int) -> bool:
    depth = 0
    for char in text[:position]:
        if char in "({":
            depth += 1
        elif char in ")}":
            depth -= 1
    return depth > 0
