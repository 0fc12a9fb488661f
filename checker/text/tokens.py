"""A logical line as fields: words, braced or quoted expressions, and name=value pairs, each with its offset.

Two ways give the same fields: :func:`split_fields`, a regular expression for lines whose fields it can see, and the
grammar ``netlist.lark``, which defines the language and says where and why a line is wrong.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from .netlist import Expression, Value
from .values import read_value

_FIELD = re.compile(
    r"""(?P<braced>\{[^{}]*\})|(?P<quoted>'[^']*')|(?P<string>"[^"]*")|(?P<equals>=)|(?P<word>[^\s,()={}'"]+)"""
)
_GAP = re.compile(r"[\s,()]*")


@dataclass(frozen=True, slots=True)
class Field:
    """One field: ``form`` is word, braced, quoted or string; ``name`` is set when it stands behind ``name=``."""

    text: str
    form: str
    offset: int
    name: str | None = None

    @property
    def bare(self) -> str:
        """The text without braces or quotes."""
        return self.text if self.form == "word" else self.text[1:-1]

    def value(self, kind: str | None = None) -> Value | None:
        """Return the number or expression that the field holds; None for a word that is no number."""
        if self.form in {"braced", "quoted"}:
            inner = self.bare.strip()
            number = read_value(inner)
            return Expression(inner) if number is None else number
        return read_value(self.bare, kind)


def split_fields(text: str) -> list[Field] | None:
    """Split a line into fields; None when it holds something that only the grammar can judge (a stray quote or =)."""
    fields: list[Field] = []
    position = 0
    pending: Field | None = None
    after_equals = False
    end = len(text)
    while True:
        gap = _GAP.match(text, position)
        position = gap.end() if gap else position
        if position >= end:
            break
        match = _FIELD.match(text, position)
        if match is None:
            return None
        form = match.lastgroup or "word"
        if form == "equals":
            if pending is None or pending.form != "word" or pending.name is not None or after_equals:
                return None
            fields.pop()
            after_equals = True
        else:
            name = pending.text if after_equals and pending is not None else None
            pending = Field(match.group(), form, match.start(), name)
            fields.append(pending)
            after_equals = False
        position = match.end()
    return None if after_equals else fields
