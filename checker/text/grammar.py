"""The netlist grammar at work: the fields of a line that the plain splitter cannot read, or the error in it."""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any

from .elements import ELEMENTS, LineError
from .lines import LogicalLine
from .tokens import Field

if TYPE_CHECKING:
    from lark import Lark

_FORMS = {"WORD": "word", "BRACED": "braced", "QUOTED": "quoted", "STRING": "string"}


@lru_cache(maxsize=1)
def netlist_grammar() -> Lark:
    """Build the grammar once."""
    from lark import Lark

    from ..resources import grammar_text

    def shared(_base: object, path: str) -> tuple[str, str]:
        return path, grammar_text(path.rsplit("/", 1)[-1].removesuffix(".lark"))

    return Lark(grammar_text("netlist"), parser="lalr", import_paths=[shared], maybe_placeholders=False)


def fields_by_grammar(line: LogicalLine) -> list[Field]:
    """Return the fields of a line as the grammar reads them.

    Raises
    ------
    LineError
        With the place where the line leaves the grammar.
    """
    from lark.exceptions import UnexpectedCharacters, UnexpectedInput

    text = line.text
    letter = text[:1].upper()
    form = ELEMENTS.get(letter, (0, "an element line such as R1 net net 10k, or a dot line"))[1]
    try:
        tree = netlist_grammar().parse(text)
    except UnexpectedCharacters as trouble:
        offset = trouble.pos_in_stream or 0
        raise _unreadable(text, offset, form) from trouble
    except UnexpectedInput as trouble:
        offset = (
            trouble.pos_in_stream if trouble.pos_in_stream is not None and trouble.pos_in_stream >= 0 else len(text)
        )
        raise LineError(
            "line-incomplete", "the line ends too early or a field is out of place", offset, 1, form
        ) from trouble
    fields: list[Field] = []
    _collect(tree, fields)
    fields.sort(key=lambda each: each.offset)
    return fields


def _unreadable(text: str, offset: int, form: str) -> LineError:
    char = text[offset] if offset < len(text) else ""
    pairs = {"{": "}", "'": "'", '"': '"'}
    if char in pairs:
        return LineError(
            "bracket-not-closed",
            f"`{char}` is not closed",
            offset,
            len(text) - offset,
            form,
            cure=f"close it with {pairs[char]}",
        )
    if char == "=":
        return LineError("equals-out-of-place", "`=` has no name before it", offset, 1, "name=value")
    return LineError("character-out-of-place", f"`{char}` is out of place", offset, 1, form)


def _collect(tree: Any, fields: list[Field]) -> None:
    if tree.data == "assignment":
        name, value = tree.children
        token = value.children[0]
        fields.append(Field(str(token), _FORMS.get(token.type, "word"), token.start_pos, str(name)))
        return
    for child in tree.children:
        if hasattr(child, "data"):
            _collect(child, fields)
        else:
            fields.append(Field(str(child), _FORMS.get(child.type, "word"), child.start_pos))
