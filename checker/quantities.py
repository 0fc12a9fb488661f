"""Quantities as an engineer writes and reads them: units with dimensions, engineering notation, preferred values.

A dimension is a tuple of exponents of volt, ampere, second and kelvin, so that ``ohm`` is (1, -1, 0, 0). Ratios,
decibels, percent and degrees of phase are plain numbers. Prefixes are SI's: here ``M`` is mega (a netlist's ``M`` is
read by the text room, where it is milli).
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Sequence
from functools import lru_cache

Dimension = tuple[float, float, float, float]

PLAIN: Dimension = (0, 0, 0, 0)

# unit -> (dimension, factor to SI)
UNITS: dict[str, tuple[Dimension, float]] = {
    "": (PLAIN, 1.0),
    "1": (PLAIN, 1.0),
    "%": (PLAIN, 1e-2),
    "ppm": (PLAIN, 1e-6),
    "dB": (PLAIN, 1.0),
    "deg": (PLAIN, 1.0),
    "V": ((1, 0, 0, 0), 1.0),
    "A": ((0, 1, 0, 0), 1.0),
    "s": ((0, 0, 1, 0), 1.0),
    "min": ((0, 0, 1, 0), 60.0),
    "h": ((0, 0, 1, 0), 3600.0),
    "K": ((0, 0, 0, 1), 1.0),
    "degC": ((0, 0, 0, 1), 1.0),
    "Hz": ((0, 0, -1, 0), 1.0),
    "rtHz": ((0, 0, -0.5, 0), 1.0),
    "ohm": ((1, -1, 0, 0), 1.0),
    "S": ((-1, 1, 0, 0), 1.0),
    "F": ((-1, 1, 1, 0), 1.0),
    "H": ((1, -1, 1, 0), 1.0),
    "W": ((1, 1, 0, 0), 1.0),
    "J": ((1, 1, 1, 0), 1.0),
    "C": ((0, 1, 1, 0), 1.0),
}

_SAME = {
    "\u03a9": "ohm", "\u2126": "ohm", "Ohm": "ohm", "ohms": "ohm", "Ohms": "ohm", "R": "ohm",
    "°C": "degC", "°": "deg", "√Hz": "rtHz", "volt": "V", "volts": "V", "percent": "%",
}  # fmt: skip

PREFIXES = {
    "f": 1e-15, "p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3,
    "k": 1e3, "M": 1e6, "G": 1e9, "T": 1e12,
}  # fmt: skip

_NO_PREFIX = {"", "1", "%", "ppm", "dB", "deg", "degC", "min", "h"}

_STEPS = {-18: "a", -15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}

_NUMBER = re.compile(r"\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?)\s*(.*?)\s*$", re.DOTALL)


def _simple_unit(text: str) -> tuple[Dimension, float] | None:
    name = _SAME.get(text, text)
    if name in UNITS:
        return UNITS[name]
    if text[:1] in PREFIXES:
        rest = _SAME.get(text[1:], text[1:])
        if rest in UNITS and rest not in _NO_PREFIX:
            dimension, factor = UNITS[rest]
            return dimension, factor * PREFIXES[text[0]]
    return None


@lru_cache(maxsize=512)
def unit_of(text: str) -> tuple[Dimension, float]:
    """Return dimension and factor to SI of a unit such as ``kΩ``, ``V/us``, ``nV/rtHz``, ``K/W``.

    Raises
    ------
    ValueError
        When the unit is not known; the text names the nearest known units.
    """
    dimension = [0.0, 0.0, 0.0, 0.0]
    factor = 1.0
    for index, part in enumerate(text.replace("·", "*").split("/")):
        sign = 1 if index == 0 else -1
        for piece in part.split("*"):
            found = _simple_unit(piece.strip())
            if found is None:
                near = ", ".join(nearest_names(piece.strip(), UNITS)) or "V, A, ohm, F, H, W, Hz, s"
                raise ValueError(f"unknown unit `{piece.strip()}`; known units near it: {near}")
            for axis, exponent in enumerate(found[0]):
                dimension[axis] += sign * exponent
            factor *= found[1] ** sign
    return (dimension[0], dimension[1], dimension[2], dimension[3]), factor


def dimension_of(unit: str) -> Dimension:
    """Return the dimension of a unit; see :func:`unit_of`."""
    return unit_of(unit)[0]


def unit_name(dimension: Dimension) -> str:
    """Return a unit in which a reader expects a dimension, such as ``ohm`` for (1, -1, 0, 0)."""
    for name, (known, factor) in UNITS.items():
        if known == dimension and factor == 1.0 and name not in {"1", "degC"}:
            return name
    axes = zip(("V", "A", "s", "K"), dimension, strict=True)
    return "·".join(f"{axis}^{exponent:g}" for axis, exponent in axes if exponent)


def parse_quantity(value: float | str, unit: str) -> float:
    """Read a quantity of the given kind of unit and return it in SI units.

    A bare number is taken to be in SI units already; a string carries its own unit.

    Raises
    ------
    ValueError
        When the text is no quantity or has another dimension than ``unit``.

    Examples
    --------
    >>> parse_quantity("4.7 kΩ", "ohm")
    4700.0
    >>> parse_quantity("1 %", "")
    0.01
    """
    if isinstance(value, bool):
        raise ValueError(f"expected {_wanted(unit)}, found a yes/no value")
    if isinstance(value, int | float):
        if not math.isfinite(value):
            raise ValueError(f"expected {_wanted(unit)}, found {value}")
        return float(value)
    match = _NUMBER.match(value)
    if not match:
        raise ValueError(f"cannot read `{value}` as a quantity; expected {_wanted(unit)}")
    number, written = match.groups()
    wanted = dimension_of(unit)
    if not written and wanted != PLAIN:
        raise ValueError(f"`{value}` has no unit; expected {_wanted(unit)}")
    dimension, factor = unit_of(written)
    if dimension != wanted:
        raise ValueError(f"`{value}` is not {_wanted(unit)}")
    exponent = round(math.log10(factor)) if factor > 0 else 0
    if factor == 10.0**exponent and exponent and "e" not in number.lower():
        return float(f"{number}e{exponent}")
    return float(number) * factor


def _wanted(unit: str) -> str:
    examples = {
        "": 'a plain number or "1 %"',
        "degC": 'a temperature such as "85 degC"',
        "ohm": 'a resistance such as "4.7 kohm"',
    }
    return examples.get(unit) or f'a number with the unit {unit}, such as "1 {unit}"'


def engineering(value: float | None, unit: str = "", digits: int = 3, *, ascii: bool = False) -> str:
    """Write a figure as a reader expects it: significant digits, steps of a thousand, unit.

    >>> engineering(4700, "ohm"), engineering(0.0471, "V"), engineering(-4.7), engineering(33.98, "dB")
    ('4.70 kΩ', '47.1 mV', '-4.70', '34.0 dB')
    """
    if value is None or math.isnan(value):
        return "unknown"
    if unit == "V/s":
        value, unit = value / 1e6, "V/us"
    shown = _shown_unit(unit)
    if math.isinf(value):
        text = "infinite" if value > 0 else "-infinite"
        return text if unit in {"", "1"} else f"{text} {shown}"
    if unit == "%":
        return f"{_digits(value * 100, digits)} %"
    if unit in _NO_PREFIX or unit == "V/us" or value == 0:
        text = _digits(value, digits)
        gap = "" if shown in {"", "°"} else " "
        result = f"{text}{gap}{shown}"
    else:
        mantissa, exponent_text = f"{value:.{digits - 1}e}".split("e")
        exponent = int(exponent_text)
        step = min(max(3 * (exponent // 3), -18), 12)
        scaled = float(mantissa) * 10.0 ** (exponent - step)
        result = f"{_digits(scaled, digits)} {_STEPS[step]}{shown}"
    if ascii:
        for sign, plain in (("Ω", "ohm"), ("µ", "u"), ("°C", "degC"), ("°", " deg"), ("√Hz", "rtHz")):
            result = result.replace(sign, plain)
    return result


def _shown_unit(unit: str) -> str:
    whole = {"1": "", "deg": "°", "degC": "°C", "V/us": "V/µs"}
    return whole.get(unit) or unit.replace("rtHz", "√Hz").replace("ohm", "Ω") if unit not in {"", "1"} else ""


def _digits(value: float, digits: int) -> str:
    if value == 0:
        return "0"
    exponent = int(f"{value:.{digits - 1}e}".split("e")[1])
    if exponent >= 6 or exponent < -4:
        return f"{value:.{digits - 1}e}"
    return f"{value:.{max(0, digits - 1 - exponent)}f}"


@lru_cache(maxsize=16)
def preferred_series(name: str) -> tuple[int, ...]:
    """Return the significant digits of an IEC 60063 series (two digits for E3…E24, three for E48…E192)."""
    series = _series_table()
    if name not in series:
        raise ValueError(f"unknown series `{name}`; known: {', '.join(series)}")
    return series[name]


@lru_cache(maxsize=1)
def _series_table() -> dict[str, tuple[int, ...]]:
    from .resources import core_folder, read_toml

    document = read_toml(core_folder("series") / "e-series.toml")
    return {name: tuple(values) for name, values in document.data["series"].items()}


def preferred_between(low: float, high: float, series: str = "E24") -> tuple[float, ...]:
    """Return all preferred values v with ``low <= v <= high``, rising; both bounds must be positive."""
    if not 0 < low <= high or not math.isfinite(high):
        return ()
    steps = preferred_series(series)
    digits = len(str(steps[0]))
    values = []
    for decade in range(math.floor(math.log10(low)) - 1, math.floor(math.log10(high)) + 1):
        for step in steps:
            value = float(f"{step}e{decade - digits + 1}")
            if low * (1 - 1e-12) <= value <= high * (1 + 1e-12):
                values.append(value)
    return tuple(values)


def nearest_preferred(value: float, series: str = "E24") -> float:
    """Return the preferred value with the smallest relative distance from ``value`` (positive, finite)."""
    if not (value > 0 and math.isfinite(value)):
        raise ValueError(f"no preferred value lies near {value}")
    candidates = preferred_between(value / 3, value * 3, series)
    return min(candidates, key=lambda each: abs(math.log(each / value)))


def nearest_names(name: str, known: Iterable[str], count: int = 4) -> tuple[str, ...]:
    """Return up to ``count`` known names that lie near ``name``, nearest first."""
    import difflib

    folded: dict[str, str] = {}
    for each in known:
        folded.setdefault(each.casefold(), each)
    matches: Sequence[str] = difflib.get_close_matches(name.casefold(), list(folded), n=count, cutoff=0.6)
    return tuple(folded[each] for each in matches)
