"""Parameter expressions: parsed by ``expression.lark`` into a small tree, evaluated without running any code.

A tree is nested tuples ``(operation, argument…)``; both depth and the number of steps are bounded. Texts are parsed
once and remembered.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Iterable, Mapping
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from .netlist import FunctionLine
from .values import read_value

if TYPE_CHECKING:
    from lark import Lark

Tree = tuple[Any, ...]

MAX_DEPTH = 60
MAX_LENGTH = 4_000

CONSTANTS: dict[str, float] = {"pi": math.pi, "e": math.e, "true": 1.0, "false": 0.0, "temper": 27.0, "temp": 27.0}


class ExpressionError(ValueError):
    """An expression that cannot be read or evaluated; ``column`` counts from 1 within its text."""

    def __init__(self, message: str, column: int | None = None, kind: str = "expression") -> None:
        super().__init__(message)
        self.column = column
        self.kind = kind


def _log(value: float) -> float:
    return math.log(value)


def _power(base: float, exponent: float) -> float:
    if base < 0 and exponent != int(exponent):
        raise ValueError("negative base with a broken exponent")
    if base == 0 and exponent < 0:
        raise ZeroDivisionError
    return float(math.pow(base, exponent))


def _table(*values: float) -> float:
    position, points = values[0], values[1:]
    if len(points) < 2 or len(points) % 2:
        raise ValueError("table needs pairs of values")
    xs, ys = points[::2], points[1::2]
    if position <= xs[0]:
        return ys[0]
    for index in range(1, len(xs)):
        if position <= xs[index]:
            share = (position - xs[index - 1]) / (xs[index] - xs[index - 1])
            return ys[index - 1] + share * (ys[index] - ys[index - 1])
    return ys[-1]


FUNCTIONS: dict[str, tuple[int, int, Callable[..., float]]] = {
    "abs": (1, 1, abs),
    "sqrt": (1, 1, math.sqrt),
    "exp": (1, 1, math.exp),
    "ln": (1, 1, math.log),
    "log": (1, 1, _log),
    "log10": (1, 1, math.log10),
    "sin": (1, 1, math.sin),
    "cos": (1, 1, math.cos),
    "tan": (1, 1, math.tan),
    "asin": (1, 1, math.asin),
    "acos": (1, 1, math.acos),
    "atan": (1, 1, math.atan),
    "arctan": (1, 1, math.atan),
    "atan2": (2, 2, math.atan2),
    "sinh": (1, 1, math.sinh),
    "cosh": (1, 1, math.cosh),
    "tanh": (1, 1, math.tanh),
    "min": (1, 99, min),
    "max": (1, 99, max),
    "pow": (2, 2, _power),
    "pwr": (2, 2, lambda base, exponent: _power(abs(base), exponent)),
    "pwrs": (2, 2, lambda base, exponent: math.copysign(_power(abs(base), exponent), base)),
    "sgn": (1, 1, lambda value: (value > 0) - (value < 0)),
    "sign": (1, 1, lambda value: (value > 0) - (value < 0)),
    "int": (1, 1, lambda value: float(math.trunc(value))),
    "floor": (1, 1, math.floor),
    "ceil": (1, 1, math.ceil),
    "nint": (1, 1, round),
    "round": (1, 1, round),
    "u": (1, 1, lambda value: 1.0 if value > 0 else 0.0),
    "uramp": (1, 1, lambda value: max(value, 0.0)),
    "limit": (3, 3, lambda value, low, high: min(max(value, min(low, high)), max(low, high))),
    "table": (3, 999, _table),
    "hypot": (2, 2, math.hypot),
}

_OPERATORS: dict[str, Callable[[float, float], float]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": operator.truediv,
    "%": math.fmod,
    "<": lambda a, b: float(a < b),
    ">": lambda a, b: float(a > b),
    "<=": lambda a, b: float(a <= b),
    ">=": lambda a, b: float(a >= b),
    "==": lambda a, b: float(a == b),
    "!=": lambda a, b: float(a != b),
}


@lru_cache(maxsize=1)
def _grammar() -> Lark:
    from lark import Lark

    from ..resources import grammar_text

    def shared(_base: object, path: str) -> tuple[str, str]:
        return path, grammar_text(path.rsplit("/", 1)[-1].removesuffix(".lark"))

    return Lark(grammar_text("expression"), parser="lalr", import_paths=[shared], maybe_placeholders=False)


_PREPARED: dict[str, Tree] = {}


def prepare(texts: Iterable[str]) -> None:
    """Parse many expressions at once, from the cache of compiled knowledge when they were parsed before.

    Texts that are no expressions are left for :func:`parse_expression` to complain about.
    """
    from ..resources import compiled

    wanted = sorted(set(texts) - _PREPARED.keys())
    if not wanted:
        return

    def build() -> dict[str, Any]:
        rows = {}
        for text in wanted:
            try:
                rows[text] = parse_expression(text)
            except ExpressionError:
                continue
        return rows

    rows = compiled("expressions", [(text, b"") for text in wanted], build)
    _PREPARED.update({text: _as_tuples(row) for text, row in rows.items()})


def _as_tuples(row: Any) -> Any:
    return tuple(_as_tuples(each) for each in row) if isinstance(row, list | tuple) else row


@lru_cache(maxsize=16384)
def parse_expression(text: str) -> Tree:
    """Parse an expression into nested tuples.

    Raises
    ------
    ExpressionError
        With the column where reading stopped.
    """
    held = _PREPARED.get(text)
    if held is not None:
        return held
    number = read_value(text.strip())
    if number is not None:
        return ("number", number)
    if len(text) > MAX_LENGTH:
        raise ExpressionError(f"expression of {len(text)} characters, more than the bound of {MAX_LENGTH}")
    if max(_nesting(text), text.count("?")) > MAX_DEPTH:
        raise ExpressionError(f"expression nested deeper than the bound of {MAX_DEPTH}")
    from lark.exceptions import UnexpectedCharacters, UnexpectedInput

    try:
        tree = _grammar().parse(text)
    except UnexpectedCharacters as trouble:
        raise ExpressionError(f"cannot read `{text[trouble.pos_in_stream or 0 :][:12]}`", trouble.column) from trouble
    except UnexpectedInput as trouble:
        column = getattr(trouble, "column", -1)
        at_end = not isinstance(column, int) or column < 1 or getattr(trouble, "token", None) == ""
        what = "the expression ends too early" if at_end else f"`{trouble.token}` is out of place"  # type: ignore[attr-defined]
        raise ExpressionError(what, len(text) + 1 if at_end else column) from trouble
    return _plain(tree)


def _nesting(text: str) -> int:
    depth = deepest = 0
    for char in text:
        if char in "({":
            depth += 1
            deepest = max(deepest, depth)
        elif char in ")}":
            depth -= 1
    return deepest


def _plain(node: Any) -> Tree:
    rule, children = node.data, node.children
    if rule == "number" and str(children[0])[0].isalpha():  # `R2` in an expression is a parameter, not 0.2 ohm
        return ("name", str(children[0]).lower())
    if rule == "number":
        value = read_value(str(children[0]), "R")
        if value is None:
            raise ExpressionError(f"`{children[0]}` is not a number", children[0].column)
        return ("number", value)
    if rule == "name":
        return ("name", str(children[0]).lower())
    if rule == "call":
        return ("call", str(children[0]).lower(), *(_plain(each) for each in children[1:]))
    if rule == "choose":
        return ("choose", *(_plain(each) for each in children))
    if rule == "sign":
        return ("sign", str(children[0]), _plain(children[1]))
    if rule == "negate":
        return ("negate", _plain(children[-1]))
    if rule == "raise":
        base = _plain(children[0])
        return base if len(children) == 1 else ("power", base, _plain(children[2]))
    folded = _plain(children[0])
    for index in range(1, len(children), 2):
        folded = ("fold", str(children[index]), folded, _plain(children[index + 1]))
    return folded


def names_in(tree: Tree) -> frozenset[str]:
    """Return the parameter names (lower case) that a tree reads."""
    if tree[0] == "name":
        return frozenset((tree[1],))
    found: frozenset[str] = frozenset()
    for each in tree[1:]:
        if isinstance(each, tuple):
            found |= names_in(each)
    return found


def evaluate(
    text: str,
    names: Mapping[str, float] | Callable[[str], float | None],
    functions: Mapping[str, FunctionLine] | None = None,
) -> float:
    """Evaluate an expression.

    Parameters
    ----------
    text
        Expression without braces or quotes.
    names
        Values by lower-case name, or a function that returns a value or None.
    functions
        ``.func`` definitions by lower-case name.

    Raises
    ------
    ExpressionError
        When it cannot be read, a name is unknown, or the arithmetic has no finite answer.
    """
    lookup: Callable[[str], float | None] = names if callable(names) else names.get
    try:
        result = _value(parse_expression(text), lookup, functions or {}, 0)
    except RecursionError:
        raise ExpressionError(f"expression nested deeper than the bound of {MAX_DEPTH}") from None
    if not math.isfinite(result):
        raise ExpressionError("the expression has no finite value", kind="arithmetic")
    return result


def _value(
    tree: Tree, lookup: Callable[[str], float | None], functions: Mapping[str, FunctionLine], depth: int
) -> float:
    if depth > MAX_DEPTH * 4:
        raise ExpressionError(f"expression nested deeper than the bound of {MAX_DEPTH}")
    operation = tree[0]
    if operation == "number":
        return float(tree[1])
    if operation == "name":
        found = lookup(tree[1])
        if found is None:
            found = CONSTANTS.get(tree[1])
        if found is None:
            raise ExpressionError(f"no parameter is called `{tree[1]}`", kind="unknown-parameter")
        return found
    if operation == "call":
        return _call(tree, lookup, functions, depth)
    if operation == "choose":
        chosen = tree[2] if _value(tree[1], lookup, functions, depth + 1) else tree[3]
        return _value(chosen, lookup, functions, depth + 1)
    arguments = [_value(each, lookup, functions, depth + 1) for each in tree[1:] if isinstance(each, tuple)]
    try:
        if operation == "sign":
            return -arguments[0] if tree[1] == "-" else arguments[0]
        if operation == "negate":
            return float(not arguments[0])
        if operation == "power":
            return _power(arguments[0], arguments[1])
        if tree[1] in {"&&", "&"}:
            return float(bool(arguments[0]) and bool(arguments[1]))
        if tree[1] in {"||", "|"}:
            return float(bool(arguments[0]) or bool(arguments[1]))
        return float(_OPERATORS[tree[1]](arguments[0], arguments[1]))
    except ZeroDivisionError:
        raise ExpressionError("the expression divides by zero", kind="arithmetic") from None
    except (OverflowError, ValueError) as trouble:
        raise ExpressionError(f"the expression has no value: {trouble}", kind="arithmetic") from trouble


def _call(
    tree: Tree, lookup: Callable[[str], float | None], functions: Mapping[str, FunctionLine], depth: int
) -> float:
    name = tree[1]
    if name == "if" and len(tree) == 5:
        chosen = tree[3] if _value(tree[2], lookup, functions, depth + 1) else tree[4]
        return _value(chosen, lookup, functions, depth + 1)
    arguments = [_value(each, lookup, functions, depth + 1) for each in tree[2:]]
    own = functions.get(name)
    if own is not None:
        if len(arguments) != len(own.arguments):
            raise ExpressionError(f"`{name}` takes {len(own.arguments)} arguments, {len(arguments)} are given")
        local = {each.lower(): value for each, value in zip(own.arguments, arguments, strict=True)}

        def inner(wanted: str) -> float | None:
            return local[wanted] if wanted in local else lookup(wanted)

        return _value(parse_expression(own.body.text), inner, functions, depth + 8)
    if name not in FUNCTIONS:
        raise ExpressionError(f"no function is called `{name}`", kind="unknown-function")
    least, most, compute = FUNCTIONS[name]
    if not least <= len(arguments) <= most:
        raise ExpressionError(f"`{name}` does not take {len(arguments)} arguments")
    try:
        return float(compute(*arguments))
    except ZeroDivisionError:
        raise ExpressionError("the expression divides by zero", kind="arithmetic") from None
    except (OverflowError, ValueError, TypeError) as trouble:
        raise ExpressionError(f"`{name}` has no value there", kind="arithmetic") from trouble
