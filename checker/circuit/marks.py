"""What stands behind a value: tolerance, ratings, and the marks that say a part is not fitted."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from ..text.values import read_value

NOT_FITTED = frozenset(
    {"dnp", "dnf", "dni", "dnm", "nofit", "no_fit", "not_fitted", "notfitted", "unfitted", "unpopulated"}
)

_TOLERANCE = re.compile(r"^(?:\+/?-|±)?(\d+(?:\.\d+)?)\s*(?:%|pct)$", re.IGNORECASE)
_VOLTS = re.compile(r"^(\d+(?:\.\d+)?)(k?)V(?:dc|ac)?$", re.IGNORECASE)
_VOLTS_CODE = re.compile(r"^(\d+)V(\d+)$", re.IGNORECASE)
_WATTS = re.compile(r"^(?:(\d+)/(\d+)|(\d+(?:\.\d+)?))\s*(m?)W$", re.IGNORECASE)
_SPLIT = re.compile(r"[\s/,;_@|]+")


@dataclass(frozen=True, slots=True)
class Marks:
    """What the words behind a value state; ``value`` is set when the value itself stood among them."""

    words: tuple[str, ...] = ()
    value: float | None = None
    tolerance: float | None = None
    rating_v: float | None = None
    rating_w: float | None = None
    is_fitted: bool = True


_NOTHING = Marks()


def read_marks(words: Iterable[str], params: Mapping[str, float], value_text: str | None, letter: str) -> Marks:
    """Read the marks of a part line.

    Parameters
    ----------
    words
        Fields behind the value.
    params
        ``name=value`` pairs of the line; ``tol`` above 0.5 is taken as percent.
    value_text
        The value as written when it could not be read as a number: ``100n/50V`` is taken apart here.
    letter
        Element letter, for marking codes.
    """
    kept = tuple(words)
    if not kept and value_text is None and not params:
        return _NOTHING
    value: float | None = None
    pieces: list[str] = []
    if value_text is not None:
        first, *rest = [each for each in _SPLIT.split(value_text) if each] or [""]
        value = read_value(first, letter)
        pieces = rest if value is not None else [first, *rest]
    tolerance = params.get("tol", params.get("tolerance"))
    if tolerance is not None and tolerance > 0.5:
        tolerance /= 100
    volts: float | None = None
    watts: float | None = None
    is_fitted = True
    for word in (*pieces, *kept):
        plain = word.strip("()[]")
        if plain.lower() in NOT_FITTED:
            is_fitted = False
        elif match := _TOLERANCE.match(plain):
            tolerance = float(match[1]) / 100
        elif match := _VOLTS.match(plain):
            volts = float(match[1]) * (1000 if match[2] else 1)
        elif match := _VOLTS_CODE.match(plain):
            volts = float(f"{match[1]}.{match[2]}")
        elif match := _WATTS.match(plain):
            watts = float(match[1]) / float(match[2]) if match[1] and float(match[2]) else float(match[3] or 0) or None
            if watts is not None and match[4]:
                watts /= 1000
    return Marks((*pieces, *kept), value, tolerance, volts, watts, is_fitted)
