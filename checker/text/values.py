"""Numbers as netlists write them: scale suffixes, marking codes of IEC 60062, units that are ignored.

A value is read as decimal text with its exponent, never multiplied by a factor, so that ``47n`` is the float nearest
to 47e-9. In the suffix table ``M`` is milli in either case and ``MEG`` is mega; a marking code such as ``4M7`` on a
resistor follows IEC 60062, where M is mega.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

# Scale suffixes of the SPICE3 family; MEG and MIL are tried before M.
SUFFIXES: dict[str, int] = {
    "t": 12,
    "g": 9,
    "meg": 6,
    "k": 3,
    "m": -3,
    "u": -6,
    "n": -9,
    "p": -12,
    "f": -15,
}

# Marking letters of IEC 60062, by kind of element.
_MARKS: dict[str, dict[str, int]] = {
    "R": {"r": 0, "k": 3, "m": 6, "g": 9, "t": 12},
    "C": {"p": -12, "n": -9, "u": -6, "m": -3, "f": 0},
    "L": {"n": -9, "u": -6, "m": -3, "h": 0, "r": -6},
}

_NUMBER = re.compile(
    r"(?P<mantissa>[+-]?(?:\d+\.?\d*|\.\d+))(?:e(?P<exponent>[+-]?\d+))?(?P<letters>[a-zµμΩω%°]*)$",
    re.IGNORECASE,
)
_MARKING = re.compile(
    r"(?P<sign>[+-]?)(?P<before>\d*)(?P<mark>[a-zµμ])(?P<after>\d+)(?P<letters>[a-zΩω]*)$", re.IGNORECASE
)

_MICRO = str.maketrans({"µ": "u", "μ": "u", "æ": "u", "\u2126": "Ω"})


@dataclass(frozen=True, slots=True)
class ReadValue:
    """A value with how it was read: ``remark`` names what a reader of another dialect would read differently."""

    value: float
    remark: str | None = None


@lru_cache(maxsize=65536)
def read_value_closely(text: str, kind: str | None = None) -> ReadValue | None:
    """Read a number and say what is ambiguous about it; None when the text is no number.

    Parameters
    ----------
    text
        The value as written.
    kind
        Element letter; ``R``, ``C`` and ``L`` allow marking codes.

    References
    ----------
    Suffixes: SPICE3 Version 3f3 User's Manual, University of California, Berkeley, May 1993, number fields.
    Marking codes: IEC 60062:2016.
    """
    plain = text.translate(_MICRO)
    match = _NUMBER.match(plain)
    if match:
        exponent = int(match["exponent"] or 0)
        if abs(exponent) > 300:
            return None
        letters = match["letters"].lower()
        if letters.startswith("mil"):
            return ReadValue(float(f"{match['mantissa']}e{exponent}") * 25.4e-6)
        power = 0
        if letters.startswith("meg"):
            power = 6
        elif letters and letters[0] in SUFFIXES:
            power = SUFFIXES[letters[0]]
        return ReadValue(float(f"{match['mantissa']}e{exponent + power}"))
    return _read_marking(plain, kind)


def _read_marking(text: str, kind: str | None) -> ReadValue | None:
    match = _MARKING.match(text)
    if not match or len(text) > 24:
        return None
    marks = _MARKS.get(kind or "", {})
    mark = match["mark"].lower()
    if mark not in marks:
        return None
    number = f"{match['sign']}{match['before'] or '0'}.{match['after']}e{marks[mark]}"
    return ReadValue(float(number), "digits after the letter are read as a marking code (IEC 60062)")


def read_value(text: str, kind: str | None = None) -> float | None:
    """Read a number with its suffix or marking code; None when the text is no number.

    >>> read_value("4.7k"), read_value("100nF"), read_value("4k7", "R"), read_value("1M"), read_value("ten")
    (4700.0, 1e-07, 4700.0, 0.001, None)
    """
    found = read_value_closely(text, kind)
    return None if found is None else found.value
