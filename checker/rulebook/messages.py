"""Texts of a rule with figures in them: ``{output_high_v}`` is written with unit, three digits, engineering notation.

A placeholder holds an expression of the condition language. Behind a bar stands how to write it: ``{ratio_mismatch|%}``
as a percentage, ``{noise_gain|x}`` as a plain number, ``{value|V}`` in a unit of choice. A piece in double brackets
is left out when a figure in it is unknown. ``<fix>`` and ``<output_high_v>`` are words of a computed remedy.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from ..analysis.figures import Unknown
from ..errors import Location
from ..quantities import engineering
from .conditions import Reading, Scope, Value, compile_value

_PLACEHOLDER = re.compile(r"\{([^{}|]+?)(?:\|([^{}]+))?\}")
_OPTIONAL = re.compile(r"\[\[(.*?)\]\]")
_MISSING = re.compile(r"<[a-z_]+>|\(unknown\)")


@dataclass(frozen=True, slots=True)
class Text:
    """A text with placeholders; ``pieces`` are strings and (expression, unit) pairs in order."""

    written: str
    pieces: tuple[str | tuple[Value, str | None], ...]

    def fill(self, reading: Reading, words: Mapping[str, str] | None = None) -> str:
        """Return the text with its figures; one that is unknown is said to be so."""
        found = []
        for piece in self.pieces:
            if isinstance(piece, str):
                found.append(piece)
                continue
            value, unit = piece
            figure = value.evaluate(reading)
            if isinstance(figure, Unknown):
                found.append("(unknown)")
            else:
                found.append(write(figure.value, unit if unit is not None else value.unit))
        text = "".join(found)
        for name, word in (words or {}).items():
            text = text.replace(f"<{name}>", word)
        return _OPTIONAL.sub(lambda match: "" if _MISSING.search(match[1]) else match[1], text)


def compile_text(written: str, scope: Scope, where: Location) -> Text:
    """Compile a text of a rule file.

    Raises
    ------
    RulePackError
        When an expression in it is wrong.
    """
    pieces: list[str | tuple[Value, str | None]] = []
    position = 0
    for match in _PLACEHOLDER.finditer(written):
        pieces.append(written[position : match.start()])
        pieces.append((compile_value(match[1], scope, where), match[2]))
        position = match.end()
    pieces.append(written[position:])
    return Text(written, tuple(piece for piece in pieces if piece != ""))


def placeholders(written: str) -> tuple[str, ...]:
    """Return the expressions in a text."""
    return tuple(match[1] for match in _PLACEHOLDER.finditer(written))


def write(value: Any, unit: str) -> str:
    """Write a figure for a reader."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, str):
        return value
    if isinstance(value, Mapping):
        return ", ".join(f"{name} {write(each, unit)}" for name, each in value.items())
    if isinstance(value, tuple | list):
        return ", ".join(write(each, unit) for each in value)
    number = float(value)
    if unit == "x":
        return f"{number:.3g}"
    if unit == "%":
        return f"{100 * number:.3g} %"
    if unit in {"dB", "deg"}:
        return f"{number:.1f} {unit}"
    return engineering(number, unit)
