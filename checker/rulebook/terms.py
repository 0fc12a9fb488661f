"""What the terms of a condition are: kinds, units and dimensions, and how two of them go together."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Protocol

from ..quantities import PLAIN, UNITS, Dimension, dimension_of, parse_quantity, unit_name, unit_of

if TYPE_CHECKING:
    from .evaluation import Run, Test
    from .syntax import Node

# Units of plain numbers that a reader wants to see again, and the temperature that is counted from freezing.
_SHOWN = {"%": "%", "percent": "%", "dB": "dB", "deg": "deg", "°": "deg", "degC": "degC", "°C": "degC"}

_COMPOUND = ("V/s", "A/s", "V/rtHz", "A/rtHz", "V/K", "A/K", "K/W", "A/V", "V/A", "ohm/K", "1/K", "1/V")

_WORDS = {
    "V": "a voltage (V)", "A": "a current (A)", "s": "a time (s)", "K": "a temperature (K)", "Hz": "a frequency (Hz)",
    "ohm": "a resistance (ohm)", "S": "a conductance (S)", "F": "a capacitance (F)", "H": "an inductance (H)",
    "W": "a power (W)", "J": "an energy (J)", "C": "a charge (C)", "V/s": "a slew rate (V/s)",
    "V/rtHz": "a noise density (V/rtHz)", "A/rtHz": "a noise density (A/rtHz)", "K/W": "a thermal resistance (K/W)",
    "": "a plain number", "%": "a plain number in %", "dB": "a level in dB", "deg": "an angle in degrees",
    "degC": "a temperature (degC)",
}  # fmt: skip

_DIGITS = re.compile(r"(?:\d+(?:\.\d+)?|\.\d+)(?:[eE][+-]?\d+(?!\w))?")

_KINDS = {
    "flag": "a yes-or-no figure",
    "word": "a word",
    "words": "a list of words",
    "numbers": "a list of figures",
    "map": "a table of figures by name",
}


@dataclass(frozen=True, slots=True)
class TermType:
    """What a term of a condition is.

    ``kind`` is one of number, flag, word, words, numbers, map; ``unit`` the SI unit in which a reader sees it;
    ``is_zero`` a written 0, which goes with any unit; ``words`` the only words it can be, when they are known.
    """

    kind: str
    unit: str = ""
    dimension: Dimension = PLAIN
    is_zero: bool = False
    words: tuple[str, ...] = ()

    def __str__(self) -> str:
        """Return the type in trade words, such as ``a voltage (V)``."""
        if self.kind == "number":
            return dimension_words(self.unit, self.dimension)
        if self.kind == "numbers":
            return f"{_KINDS['numbers']}, each {dimension_words(self.unit, self.dimension)}"
        return _KINDS[self.kind]


@dataclass(frozen=True, slots=True)
class NameType:
    """What a name stands for: its SI unit (``""`` for a plain ratio) and its kind.

    ``kind`` is one of number, flag, word, words, numbers, map. ``words`` lists all words that the figure can be, when
    they are known; another word compared with it is then a mistake.
    """

    unit: str
    kind: str
    words: tuple[str, ...] = ()


class Scope(Protocol):
    """What names mean while a rule file is loaded."""

    def type_of(self, name: str) -> NameType | None:
        """Return the type of a figure, None when there is none of that name."""

    def related(self, name: str) -> Scope | None:
        """Return the scope of a relation's members, None when there is no such relation."""

    def known(self) -> tuple[str, ...]:
        """Return all names, of figures and relations."""


@dataclass(frozen=True, slots=True)
class Term:
    """A bound part of a condition: its type, how it is evaluated, whether it is the same for every subject."""

    node: Node
    type: TermType
    run: Run
    test: Test | None = None
    is_constant: bool = False


FLAG = TermType("flag")
WORD = TermType("word")
WORDS = TermType("words")
NUMBER = TermType("number")


@lru_cache(maxsize=512)
def named_type(kind: str, unit: str, words: tuple[str, ...] = ()) -> TermType:
    """Return the type of a figure that is declared with a unit (the figure itself is in SI units)."""
    if kind not in {"number", "numbers", "map"}:
        return TermType(kind, words=words)
    dimension, _factor = unit_of(unit)
    return TermType(kind, shown_unit(unit), dimension)


def shown_unit(unit: str) -> str:
    """Return the unit without prefix in which a quantity written in ``unit`` is shown once it is in SI units."""
    dimension, factor = unit_of(unit)
    if unit in _SHOWN:
        return _SHOWN[unit]
    return unit if factor == 1.0 and unit != "1" and dimension != PLAIN else unit_of_dimension(dimension)


@lru_cache(maxsize=256)
def unit_of_dimension(dimension: Dimension) -> str:
    """Return the unit that a reader expects for a dimension, ``""`` for a plain number."""
    if dimension == PLAIN:
        return ""
    simple = {known for known, factor in UNITS.values() if factor == 1.0}
    if dimension not in simple:
        for unit in _COMPOUND:
            if dimension_of(unit) == dimension:
                return unit
    return unit_name(dimension)


def dimension_words(unit: str, dimension: Dimension) -> str:
    """Return a quantity's kind in trade words."""
    name = unit if unit in _WORDS and dimension_of(unit) == dimension else unit_of_dimension(dimension)
    return _WORDS.get(name, f"a quantity in {name}")


@lru_cache(maxsize=1024)
def read_quantity(text: str) -> tuple[float, TermType]:
    """Read a number with its unit.

    Raises
    ------
    ValueError
        When the unit is not known.
    """
    match = _DIGITS.match(text)
    unit = text[match.end() if match else 0 :].strip()
    if not unit:
        value = float(text)
        return value, TermType("number", is_zero=value == 0)
    dimension, _factor = unit_of(unit)
    return parse_quantity(text, unit), TermType("number", shown_unit(unit), dimension)


def goes_with(left: TermType, right: TermType) -> bool:
    """Tell whether two numbers can be added or compared."""
    if left.is_zero or right.is_zero:
        return True
    if left.dimension != right.dimension:
        return False
    marked = {left.unit, right.unit} & {"%", "dB", "deg"}
    return len(marked) < 2


def joined(left: TermType, right: TermType, *, is_difference: bool = False) -> TermType:
    """Return the type of a sum, a choice or a range of two numbers that go together."""
    if left.is_zero:
        return TermType("number", right.unit, right.dimension, right.is_zero)
    if right.is_zero or left.unit == right.unit:
        unit = "K" if is_difference and left.unit == right.unit == "degC" else left.unit
        return TermType("number", unit, left.dimension)
    units = {left.unit, right.unit}
    for unit in ("dB", "deg", "degC"):
        if unit in units:
            return TermType("number", unit, left.dimension)
    return TermType("number", "" if left.dimension == PLAIN else left.unit, left.dimension)


def compared_unit(*sides: TermType) -> str:
    """Return the unit in which a reader sees figures that are held against each other."""
    unit = sides[0]
    for each in sides[1:]:
        unit = joined(unit, each)
    return "%" if unit.unit == "" and any(each.unit == "%" for each in sides) else unit.unit


def multiplied(left: TermType, right: TermType, sign: int = 1) -> TermType:
    """Return the type of a product (``sign`` 1) or a quotient (-1)."""
    a, b = left.dimension, right.dimension
    dimension = (a[0] + sign * b[0], a[1] + sign * b[1], a[2] + sign * b[2], a[3] + sign * b[3])
    if b == PLAIN and right.unit == "" and left.unit != "%":
        unit = left.unit
    elif a == PLAIN and left.unit == "" and right.unit != "%" and sign == 1:
        unit = right.unit
    else:
        unit = unit_of_dimension(dimension)
    return TermType("number", unit, dimension)


def raised(base: TermType, exponent: float) -> TermType:
    """Return the type of a power; 0.5 for a square root."""
    a = base.dimension
    dimension = (a[0] * exponent, a[1] * exponent, a[2] * exponent, a[3] * exponent)
    return TermType("number", base.unit if exponent == 1 else unit_of_dimension(dimension), dimension)


def unit_cure(left: TermType, right: TermType, right_text: str, *, is_written: bool) -> str | None:
    """Return how two numbers of different units are most likely brought together."""
    if is_written and right.dimension == PLAIN:
        return f"give the number its unit: {right_text.split(maxsplit=1)[0]} {left.unit or unit_of_dimension(left.dimension)}"
    if is_written:
        return f"write {dimension_words(left.unit, left.dimension)}, such as 1 {left.unit}" if left.unit else None
    if left.dimension == right.dimension:
        return None
    apart = multiplied(left, right, -1)
    inverse = multiplied(right, left, -1)
    if multiplied(left, right).dimension == PLAIN:
        return f"take 1 / {right_text}"
    for kind, verb in ((apart, "multiply"), (inverse, "divide")):
        unit = unit_of_dimension(kind.dimension)
        if unit in _WORDS and unit:
            return f"{verb} `{right_text}` by {_WORDS[unit]}"
    return None


def unit_hint(text: str) -> str:
    """Return what the author of a number with an unknown unit most likely meant."""
    unit = text.lstrip("0123456789.").strip()
    if unit[:1] in {"k", "M", "G", "m", "u", "n", "p", "µ", "f", "T", "g"} and len(unit.rstrip("0123456789")) == 1:
        return f"add the unit behind the prefix, such as {unit[0]}ohm, {unit[0]}V or {unit[0]}F"
    if "/" in unit:
        return "put blanks around / to divide by a figure"
    if unit.casefold() in {"meg", "megohm"}:
        return "write Mohm"
    return "write * between a number and a figure"
