"""Physical lines to logical lines: comments dropped, continuations joined, every character's place kept.

A logical line remembers where each of its pieces began, so that a problem found at some offset of the joined text
can be shown in the file.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from ..errors import Location, Problem
from .source import Limits, SourceText


@dataclass(frozen=True, slots=True)
class LogicalLine:
    """One statement: joined text, and (offset, line number, column) of each physical piece, offsets rising."""

    text: str
    source: SourceText
    pieces: tuple[tuple[int, int, int], ...]
    remarks: tuple[str, ...] = ()

    @property
    def number(self) -> int:
        """Number of the first physical line."""
        return self.pieces[0][1]

    def place(self, offset: int | None = None, length: int = 1) -> Location:
        """Return the place of a character of the joined text (of the whole line without an offset)."""
        if offset is None:
            line = self.pieces[0][1]
            return Location(self.source.name, line, None, self.source.lines[line - 1])
        piece = self.pieces[0]
        for each in self.pieces:
            if each[0] > offset:
                break
            piece = each
        start, line, column = piece
        excerpt = self.source.lines[line - 1]
        where = column + offset - start
        return Location(self.source.name, line, where, excerpt, max(1, min(length, len(excerpt) - where + 1)))


def strip_comment(text: str) -> str:
    """Cut an end-of-line comment: ``;`` outside quotes, ``$`` and ``//`` that stand alone."""
    if ";" not in text and "$" not in text and "//" not in text:
        return text
    quote = ""
    for index, char in enumerate(text):
        if quote:
            if char == quote:
                quote = ""
        elif char == '"' or (char == "'" and text.find("'", index + 1) > 0):
            quote = char
        elif (
            char == ";"
            or (char == "$" and _stands_alone(text, index, 1))
            or (char == "/" and text.startswith("//", index) and _stands_alone(text, index, 2))
        ):
            return text[:index]
    return text


def _stands_alone(text: str, index: int, width: int) -> bool:
    before = index == 0 or text[index - 1] in " \t"
    after = index + width >= len(text) or text[index + width] in " \t" or width == 2
    return before and after


def logical_lines(
    source: SourceText, problems: list[Problem], *, has_title: bool, limits: Limits, first: int = 0
) -> Iterator[LogicalLine]:
    """Yield the statements of a source in order.

    ``has_title`` skips the first line. Comment lines directly before a statement travel with it as ``remarks``, and
    those between a statement and its continuation belong to it as well.
    """
    pending: list[tuple[str, int, int]] = []
    remarks: list[str] = []
    held: list[str] = []
    for number, raw in enumerate(source.lines[first:], first + 1):
        if has_title and number == 1:
            continue
        if len(raw) > limits.line_length:
            problems.append(
                Problem(
                    "line-too-long",
                    f"line of {len(raw)} characters, more than the bound of {limits.line_length}",
                    Location(source.name, number),
                    cure="break it with + continuation lines, or raise line_length in the call of read_netlist",
                )
            )
            continue
        text = raw.lstrip(" \t\f\v\u00a0\ufeff")
        if not text:
            continue
        if text[0] == "*" or text.startswith("//"):
            held.append(text.lstrip("*/").rstrip())
            continue
        indent = len(raw) - len(text)
        body = strip_comment(text).replace("\t", " ").replace("\f", " ").replace("\u00a0", " ").rstrip()
        if not body:
            continue
        if body[0] == "+":
            if not pending:
                problems.append(
                    Problem(
                        "continuation-without-line",
                        "a continuation line with no line before it",
                        Location(source.name, number, indent + 1, raw),
                        expected="an element or a dot line before the +",
                        cure="remove the + or restore the line that it continues",
                    )
                )
                continue
            pending.append((" " + body[1:], number, indent + 1))
            continue
        if pending:
            yield _join(pending, source, remarks)
        pending, remarks, held = [(body, number, indent + 1)], held, []
    if pending:
        yield _join(pending, source, remarks)


def _join(pieces: list[tuple[str, int, int]], source: SourceText, remarks: list[str]) -> LogicalLine:
    if len(pieces) == 1:
        text, number, column = pieces[0]
        return LogicalLine(text, source, ((0, number, column),), tuple(remarks))
    offset = 0
    places = []
    for text, number, column in pieces:
        places.append((offset, number, column))
        offset += len(text)
    return LogicalLine("".join(text for text, _, _ in pieces), source, tuple(places), tuple(remarks))
