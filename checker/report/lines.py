"""Lines of a text report: spans of styled text, wrapped to a width and written plain, in colour or in ASCII.

A line is data until the last step. Wrapping never breaks inside a word, so a name, a value and its unit (joined by
a no-break space) stay whole; what does not fit goes on below its own column.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence
from typing import TypeAlias

from .styles import paint

Span: TypeAlias = tuple[str, str]
Line: TypeAlias = tuple[Span, ...]

GLUE = "\u00a0"

# Control and text-direction characters of an untrusted netlist must not reach a terminal.
_STEERING = re.compile("[\x00-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069]")

_PLAIN = {
    "Ω": "ohm", "µ": "u", "μ": "u", "°C": "degC", "°": " deg", "√Hz": "rtHz", "±": "+/-", "−": "-", "–": "-", "—": "-",
    "×": "x", "·": "*", "≥": ">=", "≤": "<=", "≈": "~", "→": "->", "π": "pi", "τ": "tau", "β": "beta", "…": "...",
    "─": "-", "²": "^2", "³": "^3", "’": "'", "‘": "'", "“": '"', "”": '"', "‖": "||", "∥": "||", "√": "sqrt",
}  # fmt: skip


def to_ascii(text: str) -> str:
    """Return the text in ASCII: signs of the trade become words, anything else a question mark."""
    for sign, plain in _PLAIN.items():
        text = text.replace(sign, plain)
    text = text.replace(GLUE, " ")
    return text.encode("ascii", "replace").decode("ascii")


def is_encodable(encoding: str | None) -> bool:
    """Tell whether a stream of this encoding can carry the signs that reports use."""
    try:
        "Ωµ°√±→─".encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def keep_whole(text: str) -> str:
    """Join the words of a text so that wrapping does not break it."""
    return text.replace(" ", GLUE)


def wrap(spans: Iterable[Span], width: int, indent: int = 0, hang: int | None = None) -> Iterator[Line]:
    """Break spans into lines of at most ``width`` columns; later lines are indented by ``hang``."""
    hang = indent if hang is None else hang
    line: list[Span] = [(" " * indent, "")]
    column = indent
    is_empty = True
    for blanks, pieces in _words(spans):
        length = sum(len(text) for text, _ in pieces)
        gap = 0 if is_empty else blanks
        if not is_empty and column + gap + length > width:
            yield tuple(line)
            line, column, gap = [(" " * hang, "")], hang, 0
        line.append((" " * gap, ""))
        line.extend(pieces)
        column += gap + length
        is_empty = False
    yield tuple(line)


def _words(spans: Iterable[Span]) -> Iterator[tuple[int, list[Span]]]:
    """Split spans at blanks into (blanks before, pieces of one word); pieces that touch stay one word."""
    gap = 0
    pieces: list[Span] = []
    for text, style in spans:
        for index, word in enumerate(text.split(" ")):
            if index:
                if pieces:
                    yield gap, pieces
                    gap, pieces = 0, []
                gap += 1
            if word:
                pieces.append((word, style))
    if pieces:
        yield gap, pieces


def two_sided(left: Sequence[Span], right: Span, width: int) -> Iterator[Line]:
    """Set ``right`` flush right beside ``left``; on a line of its own when both do not fit."""
    used = sum(len(text) for text, _ in left)
    room = width - used - len(right[0])
    if room >= 2:
        yield (*left, (" " * room, ""), right)
    else:
        yield from wrap(left, width, 0, 4)
        yield ((" " * max(4, width - len(right[0])), ""), right)


def labelled(label: str, spans: Sequence[Span], width: int, indent: int = 4, column: int = 10) -> Iterator[Line]:
    """Set a label and wrap its text in the column beside it."""
    start = indent + column
    lines = list(wrap(spans, width, start))
    head = ((" " * indent, ""), (label.ljust(column), "label"))
    yield (*head, *lines[0][1:])
    yield from lines[1:]


def write(lines: Iterable[Line], *, is_coloured: bool, is_ascii: bool) -> Iterator[str]:
    """Turn lines into text, each with its line end; signs that steer a terminal never pass."""
    for line in lines:
        spans = [(_STEERING.sub("?", to_ascii(text) if is_ascii else text), style) for text, style in line]
        if is_coloured:
            text = "".join(paint(text.replace(GLUE, " "), style) for text, style in spans)
        else:
            text = "".join(text for text, _ in spans).replace(GLUE, " ")
        yield text.rstrip() + "\n"
