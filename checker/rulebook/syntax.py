"""The shape of a condition: ``condition.lark`` at work, its result as plain nodes, and what a misspelt text means.

Nothing here knows names, units or circuits. Texts are parsed once; :func:`prepare` keeps the nodes of a whole pack in
the cache of compiled knowledge, so that a warm start needs no grammar.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from ..errors import Location

if TYPE_CHECKING:
    from lark import Lark

MAX_DEPTH = 60
MAX_LENGTH = 4_000

# What a character or a run of them that the language does not have usually stands for.
MISTAKES: tuple[tuple[str, str, str], ...] = (
    ("=>", "`=>` is no comparison", "write >="),
    ("=<", "`=<` is no comparison", "write <="),
    ("=", "`=` is no comparison", "write == for equal, != for not equal"),
    ("<>", "`<>` is no comparison", "write !="),
    ("&&", "`&&` is not part of the language", "write and"),
    ("&", "`&` is not part of the language", "write and"),
    ("||", "`||` is not part of the language", "write or"),
    ("|", "`|` is not part of the language", "write or; for a magnitude abs(x)"),
    ("!", "`!` is not part of the language", "write not"),
    ("^", "`^` is not part of the language", "write ** with a whole number"),
    ("≤", "`≤` is not part of the language", "write <="),
    ("≥", "`≥` is not part of the language", "write >="),
    ("≠", "`≠` is not part of the language", "write !="),
    ("×", "`×` is not part of the language", "write *"),
    ("·", "`·` is not part of the language", "write *"),
    ("÷", "`÷` is not part of the language", "write /"),
    ("−", "`−` is not the sign of a number", "write - from the keyboard"),
    ("±", "`±` is not part of the language", "write x in -limit .. limit, or abs(x) <= limit"),
    ("?", "`?` is not part of the language", "write if(condition, value, other value)"),
    ("{", "`{` belongs to messages, not to conditions", "write the name alone"),
    (";", "`;` is not part of the language", "join the two conditions with and"),
    ("is", "`is` asks only whether a figure is known", "write is known, is unknown, or == to compare"),
    ("if", "`if` stands before its condition", "write if(condition, value, other value)"),
    ("else", "`else` is not part of the language", "write if(condition, value, other value)"),
    (".", "`.` is out of place", "write 0.5 with its zero, 5 without a point; a range is low .. high"),
)

_OPERAND = "a figure by name, a number with its unit, a word in quotes or a bracket"
_OPERATOR = "a comparison, + - * /, and, or, or the end"
_ATOMS = frozenset({"quantity", "word", "truth", "name"})
_BLANKED = re.compile(r"\"[^\"\n]*\"|'[^'\n]*'|#[^\n]*")
_SHUTS = {"(": ")", "[": "]"}


@dataclass(frozen=True, slots=True)
class Node:
    """A part of a condition: what it is, where it stands (offsets), its own words, and its parts in order."""

    what: str
    start: int
    end: int
    words: tuple[str, ...] = ()
    parts: tuple[Node, ...] = ()


class SyntaxTrouble(ValueError):
    """A text that is no condition: offsets of the place, what is wrong, what was expected, the cure."""

    def __init__(
        self, kind: str, what: str, start: int, end: int, expected: str | None = None, cure: str | None = None
    ) -> None:
        super().__init__(what)
        self.kind = kind
        self.what = what
        self.start = start
        self.end = end
        self.expected = expected
        self.cure = cure


_PREPARED: dict[str, Node] = {}


@lru_cache(maxsize=4096)
def parse_syntax(text: str) -> Node:
    """Parse a condition into nodes.

    Raises
    ------
    SyntaxTrouble
        Where the text leaves the language, or is longer or deeper than its bounds.
    """
    held = _PREPARED.get(text)
    if held is not None:
        return held
    _check_bounds(text)
    from lark.exceptions import UnexpectedCharacters, UnexpectedInput, UnexpectedToken

    try:
        tree = _grammar().parse(text)
    except UnexpectedToken as trouble:
        wants_operand = "NAME" in (trouble.accepts or trouble.expected)
        place = trouble.pos_in_stream
        at_end = trouble.token.type == "$END" or place is None
        raise _diagnosis(text, len(text.rstrip()) if at_end else int(place or 0), wants_operand) from trouble
    except UnexpectedCharacters as trouble:
        raise _diagnosis(text, trouble.pos_in_stream or 0, "NAME" in (trouble.allowed or ())) from trouble
    except UnexpectedInput as trouble:
        raise _diagnosis(text, len(text.rstrip()), True) from trouble
    return _plain(tree, 0)


def prepare(texts: Iterable[str]) -> None:
    """Parse many texts at once, from the cache of compiled knowledge when they were parsed before.

    Texts that are no conditions are left for :func:`parse_syntax` to complain about.
    """
    from ..resources import compiled

    wanted = sorted(set(texts) - _PREPARED.keys())
    if not wanted:
        return

    def build() -> dict[str, Any]:
        rows = {}
        for text in wanted:
            try:
                rows[text] = _row(parse_syntax(text))
            except SyntaxTrouble:
                continue
        return rows

    rows = compiled("conditions", [(text, b"") for text in wanted], build)
    try:
        _PREPARED.update({text: _from_row(row, 0) for text, row in rows.items()})
    except (AttributeError, IndexError, TypeError, ValueError):
        return


@lru_cache(maxsize=1)
def _grammar() -> Lark:
    from lark import Lark

    from ..resources import grammar_text

    return Lark(grammar_text("condition"), parser="lalr", propagate_positions=True, maybe_placeholders=False)


def _bare(text: str) -> str:
    """Return the text with quoted words and comments blanked, every other character in its place."""
    return _BLANKED.sub(lambda match: " " * len(match[0]), text)


def _check_bounds(text: str) -> None:
    if not text.strip():
        raise SyntaxTrouble("condition-empty", "the condition is empty", 0, 1, _OPERAND)
    if len(text) > MAX_LENGTH:
        what = f"condition of {len(text)} characters, more than the bound of {MAX_LENGTH}"
        raise SyntaxTrouble("condition-too-long", what, 0, 1, cure="split it into when and require, or into two rules")
    depth = 0
    for offset, char in enumerate(_bare(text)):
        if char in "([":
            depth += 1
            if depth > MAX_DEPTH:
                raise _too_deep(offset)
        elif char in ")]":
            depth -= 1


def _too_deep(offset: int) -> SyntaxTrouble:
    what = f"condition nested deeper than the bound of {MAX_DEPTH}"
    return SyntaxTrouble("condition-too-deep", what, offset, offset + 1, cure="write it flat, with and and or")


def _diagnosis(text: str, offset: int, wants_operand: bool) -> SyntaxTrouble:
    expected = _OPERAND if wants_operand else _OPERATOR
    rest = text[offset:]
    if not rest.strip():
        open_bracket = _last_open(text)
        if open_bracket is not None:
            char = text[open_bracket]
            what, cure = f"`{char}` is not closed", f"close it with {_SHUTS[char]}"
            return SyntaxTrouble("bracket-not-closed", what, open_bracket, open_bracket + 1, expected, cure)
        return SyntaxTrouble("condition-incomplete", "the condition ends too early", offset, offset + 1, expected)
    if rest[0] in "\"'":
        closed = rest.find(rest[0], 1) > 0
        if not closed:
            what, cure = "the word in quotes is not closed", f"close it with {rest[0]}"
            return SyntaxTrouble("quote-not-closed", what, offset, len(text), None, cure)
    word = _first_word(rest)
    for written, what, cure in MISTAKES:
        if word == written if written.isalpha() else rest.startswith(written):
            return SyntaxTrouble("condition-syntax", what, offset, offset + len(written), expected, cure)
    if rest[0] in ")]":
        if _last_open(text[:offset]) is not None:
            return SyntaxTrouble("condition-syntax", f"`{rest[0]}` comes too early", offset, offset + 1, expected)
        what, cure = f"`{rest[0]}` closes nothing that is open", "remove it, or open the bracket"
        return SyntaxTrouble("condition-syntax", what, offset, offset + 1, expected, cure)
    return SyntaxTrouble("condition-syntax", f"`{word}` is out of place", offset, offset + len(word), expected)


def _first_word(rest: str) -> str:
    end = 1
    if rest[0].isalnum() or rest[0] == "_":
        while end < len(rest) and (rest[end].isalnum() or rest[end] == "_"):
            end += 1
    return rest[:end]


def _last_open(text: str) -> int | None:
    opened: list[int] = []
    for offset, char in enumerate(_bare(text)):
        if char in "([":
            opened.append(offset)
        elif char in ")]" and opened:
            opened.pop()
    return opened[-1] if opened else None


def _plain(tree: Any, depth: int) -> Node:
    if depth > MAX_DEPTH:
        raise _too_deep(tree.meta.start_pos)
    start, end = tree.meta.start_pos, tree.meta.end_pos
    if tree.data in _ATOMS:
        return Node(tree.data, start, end, (str(tree.children[0]),))
    words: list[str] = []
    parts: list[Node] = []
    for child in tree.children:
        if hasattr(child, "data"):
            parts.append(_plain(child, depth + 1))
        else:
            words.append(" ".join(str(child).split()))
    return Node(tree.data, start, end, tuple(words), tuple(parts))


def place_in(text: str, where: Location, start: int, end: int) -> Location:
    """Return the place of a stretch of a condition, in the rule file where its line can be recognized.

    ``where`` is the place of the text in its file: the line of its key. Where the excerpt of that line holds the text,
    columns count in the file's own line; else the excerpt is the line of the condition and columns count in it.
    """
    row_start = text.rfind("\n", 0, start) + 1
    row_end = text.find("\n", row_start)
    row = text[row_start : row_end if row_end >= 0 else len(text)]
    column = start - row_start + 1
    length = max(1, min(end, row_start + len(row)) - start)
    line = where.line + text.count("\n", 0, start)
    written = where.excerpt
    if written is not None and row_start == 0:
        held = re.search(rf"(?<![\w.]){re.escape(row)}(?![\w.])", written) if row.strip() else None
        if held is not None:
            return Location(where.file, line, held.start() + column, written, length)
    if written is not None and written.rstrip().endswith(('"""', "'''")):
        line += 1  # the text begins on the line below the opening quotes
    return Location(where.file, line, column, row, length)


def _row(node: Node) -> list[Any]:
    return [node.what, node.start, node.end, list(node.words), [_row(each) for each in node.parts]]


def _from_row(row: Any, depth: int) -> Node:
    if depth > MAX_DEPTH:
        raise ValueError("too deep")
    what, start, end, words, parts = row
    return Node(str(what), int(start), int(end), tuple(words), tuple(_from_row(each, depth + 1) for each in parts))
