"""The intent file ``review.toml``: what the schematic cannot say.

The models below are the reference of its keys; quantities are numbers in SI units or strings with a unit. All problems
of a file are reported in one run, each with its line.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date
from pathlib import Path
from typing import Any

from ..errors import IntentError, Location, Problem
from ..quantities import nearest_names, parse_quantity
from ..resources import TomlDocument, parse_toml, read_toml

FILE_NAME = "review.toml"

STAGE_KEYS: dict[str, tuple[str, str]] = {
    "gain": ("", "signed gain, V/V"),
    "gain_tolerance": ("", "how far the gain may be off"),
    "corner": ("Hz", "wanted corner frequency"),
    "accuracy": ("", "wanted accuracy of gain, threshold or corner"),
    "hysteresis": ("V", "wanted hysteresis"),
    "threshold_low": ("V", "wanted lower threshold"),
    "threshold_high": ("V", "wanted upper threshold"),
    "hold_time": ("s", "time that a peak must be held"),
    "rejection": ("", "wanted common-mode rejection, dB"),
    "load": ("ohm", "resistance that the output drives outside the sheet"),
    "load_capacitance": ("F", "capacitance that the output drives outside the sheet"),
    "output_low": ("V", "lowest output that is wanted"),
    "output_high": ("V", "highest output that is wanted"),
    "noise": ("V", "noise on the input, peak to peak"),
}
STAGE_FLAGS = {
    "integrator": "the stage integrates on purpose: its loop closes elsewhere",
    "attenuator": "the stage attenuates on purpose",
    "clips": "the stage clips on purpose",
    "high_pass": "the stage is a high-pass on purpose",
    "low_pass": "the stage is a low-pass on purpose",
    "latch": "the stage latches on purpose",
    "loop_outside": "the loop closes outside the netlist",
}
STAGE_WORDS = {"decoupling": ("elsewhere",), "purpose": ()}
SIGNAL_KEYS = {
    "low",
    "high",
    "frequency",
    "noise",
    "current",
    "source_resistance",
    "common_mode_low",
    "common_mode_high",
    "accuracy",
}
TOLERANCE_KEYS = {"resistor", "capacitor", "inductor", "rail", "resistor_ratio", "reference"}
LEVELS = ("error", "warning", "note")


@dataclass(frozen=True, slots=True)
class SignalIntent:
    """A declared signal: extremes (V, or A when ``current``), band (Hz), noise (V peak to peak), source resistance."""

    low: float | None = None
    high: float | None = None
    frequency: tuple[float, ...] = ()
    noise: float | None = None
    current: bool = False
    source_resistance: float | None = None
    common_mode_low: float | None = None
    common_mode_high: float | None = None
    accuracy: float | None = None


@dataclass(frozen=True, slots=True)
class WaiverIntent:
    """One accepted finding: the rule, the designator, net or stage, the reason, who, until when."""

    rule: str
    where: str
    reason: str
    by: str | None = None
    until: date | None = None
    location: Location | None = None


@dataclass(frozen=True, slots=True)
class Intent:
    """What the designer declared. ``stages`` maps a stage to its declared keys (numbers, flags, words)."""

    path: str | None = None
    rails: Mapping[str, float] = field(default_factory=dict)
    signals: Mapping[str, SignalIntent] = field(default_factory=dict)
    stages: Mapping[str, Mapping[str, float | bool | str]] = field(default_factory=dict)
    tolerance: Mapping[str, float] = field(default_factory=dict)
    temperature: tuple[float, float] | None = None
    limits: Mapping[str, Mapping[str, float | str]] = field(default_factory=dict)
    parts: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    rule_folders: tuple[str, ...] = ()
    rules_off: tuple[str, ...] = ()
    rule_levels: Mapping[str, str] = field(default_factory=dict)
    libraries: tuple[str, ...] = ()
    style: str | None = None
    series: Mapping[str, str] = field(default_factory=dict)
    decoupling: str | None = None
    waivers: tuple[WaiverIntent, ...] = ()
    document: TomlDocument | None = None

    def stage(self, name: str) -> Mapping[str, float | bool | str]:
        """Return what is declared for a stage (any letter case); empty when nothing is."""
        return _folded(self.stages, name) or {}

    def rail(self, net: str) -> float | None:
        """Return the declared voltage of a net, or None."""
        found: float | None = _folded(self.rails, net)
        return found

    def signal(self, net: str) -> SignalIntent | None:
        """Return the declared signal on a net, or None."""
        found: SignalIntent | None = _folded(self.signals, net)
        return found

    def limit(self, rule: str, name: str) -> float | str | None:
        """Return a changed limit of a rule, or None."""
        return self.limits.get(rule, {}).get(name)

    def folders(self, names: tuple[str, ...]) -> tuple[Path, ...]:
        """Return declared folders as paths; they are relative to the intent file."""
        base = Path(self.path).parent if self.path else Path()
        return tuple(base / name for name in names)

    def location(self, *keys: str | int) -> Location | None:
        """Return where a key stands in the intent file."""
        return self.document.location(*keys) if self.document is not None else None


def _folded(table: Mapping[str, Any], name: str) -> Any:
    if name in table:
        return table[name]
    wanted = name.casefold()
    return next((value for key, value in table.items() if key.casefold() == wanted), None)


def find_intent(netlist: str | Path) -> Path | None:
    """Return the nearest ``review.toml`` in the netlist's folder or above, or None."""
    place = Path(netlist).absolute()
    for folder in place.parents if not place.is_dir() else (place, *place.parents):
        candidate = folder / FILE_NAME
        if candidate.is_file():
            return candidate
    return None


def read_intent(path: str | Path) -> Intent:
    """Read an intent file; every problem in it is raised at once as :class:`IntentError`."""
    return _Reader(read_toml(Path(path), IntentError)).read(str(path))


def parse_intent(text: str, name: str = FILE_NAME) -> Intent:
    """Read an intent from text. See :func:`read_intent`."""
    return _Reader(parse_toml(text, name, IntentError)).read(name)


class _Reader:
    """Turns the plain data of a document into an :class:`Intent`, collecting problems."""

    SECTIONS = (
        "rails",
        "signals",
        "stages",
        "tolerance",
        "temperature",
        "limits",
        "parts",
        "rules",
        "netlists",
        "waivers",
        "series",
        "decoupling",
    )

    def __init__(self, document: TomlDocument) -> None:
        self.document = document
        self.problems: list[Problem] = []

    def read(self, path: str) -> Intent:
        data = self.document.data
        for key in data:
            if key not in self.SECTIONS:
                self.wrong("unknown-key", f"`{key}` is not a section of the intent file", (key,), known=self.SECTIONS)
        intent = Intent(
            path=path,
            rails=self._numbers("rails", "V"),
            signals={net: self._signal(net, each) for net, each in self._tables("signals").items()},
            stages={name: self._stage(name, each) for name, each in self._tables("stages").items()},
            tolerance=self._tolerance(),
            temperature=self._temperature(),
            limits=self._limits(),
            parts=self._tables("parts"),
            rule_folders=self._words("rules", "folders"),
            rules_off=self._words("rules", "off"),
            rule_levels=self._levels(),
            libraries=self._words("netlists", "libraries"),
            style=self._style(),
            series=self._series(),
            decoupling=self._decoupling(),
            waivers=self._waivers(),
            document=self.document,
        )
        if self.problems:
            raise IntentError(self.problems)
        return intent

    def wrong(
        self, kind: str, what: str, keys: tuple[str | int, ...], *, known: Any = (), cure: str | None = None
    ) -> None:
        near = nearest_names(str(keys[-1]), known) if known else ()
        self.problems.append(
            Problem(
                kind,
                what,
                self.document.location(*keys),
                nearest=near,
                cure=cure,
                expected=", ".join(known) if known and not near else None,
            )
        )

    def _table(self, name: str) -> dict[str, Any]:
        value = self.document.data.get(name, {})
        if not isinstance(value, dict):
            self.wrong("wrong-form", f"`{name}` must be a table", (name,), cure=f"write [{name}]")
            return {}
        return value

    def _tables(self, name: str) -> dict[str, dict[str, Any]]:
        found = {}
        for key, value in self._table(name).items():
            if isinstance(value, dict):
                found[key] = value
            else:
                self.wrong("wrong-form", f"`{name}.{key}` must be a table", (name, key), cure=f"write [{name}.{key}]")
        return found

    def _quantity(self, value: Any, unit: str, keys: tuple[str | int, ...]) -> float | None:
        if not isinstance(value, int | float | str) or isinstance(value, bool):
            self.wrong("wrong-form", f"`{'.'.join(map(str, keys))}` must be a number or a quantity in quotes", keys)
            return None
        try:
            return parse_quantity(value, unit)
        except ValueError as trouble:
            self.wrong("wrong-quantity", f"`{'.'.join(map(str, keys))}`: {trouble}", keys)
            return None

    def _numbers(self, section: str, unit: str) -> dict[str, float]:
        found = {}
        for key, value in self._table(section).items():
            number = self._quantity(value, unit, (section, key))
            if number is not None:
                found[key] = number
        return found

    def _signal(self, net: str, data: dict[str, Any]) -> SignalIntent:
        keys = ("signals", net)
        for key in data:
            if key not in SIGNAL_KEYS:
                self.wrong(
                    "unknown-key", f"`{key}` cannot be declared for a signal", (*keys, key), known=sorted(SIGNAL_KEYS)
                )
        current = data.get("current", False)
        if not isinstance(current, bool):
            self.wrong("wrong-form", "`current` must be true or false", (*keys, "current"))
            current = False
        unit = "A" if current else "V"
        band = data.get("frequency", [])
        bands = [
            self._quantity(each, "Hz", (*keys, "frequency")) for each in (band if isinstance(band, list) else [band])
        ]

        def number(name: str, kind: str) -> float | None:
            return self._quantity(data[name], kind, (*keys, name)) if name in data else None

        low, high = number("low", unit), number("high", unit)
        if low is not None and high is not None and low > high:
            self.wrong("wrong-order", f"signal {net}: low is above high", (*keys, "low"), cure="exchange the two")
        return SignalIntent(
            low=low,
            high=high,
            frequency=tuple(sorted(each for each in bands if each is not None)),
            noise=number("noise", "V"),
            current=current,
            source_resistance=number("source_resistance", "ohm"),
            common_mode_low=number("common_mode_low", "V"),
            common_mode_high=number("common_mode_high", "V"),
            accuracy=number("accuracy", ""),
        )

    def _stage(self, name: str, data: dict[str, Any]) -> dict[str, float | bool | str]:
        found: dict[str, float | bool | str] = {}
        for key, value in data.items():
            keys = ("stages", name, key)
            if key in STAGE_KEYS:
                number = self._quantity(value, "dB" if key == "rejection" else STAGE_KEYS[key][0], keys)
                if number is not None:
                    found[key] = number
            elif key in STAGE_FLAGS:
                if isinstance(value, bool):
                    found[key] = value
                else:
                    self.wrong("wrong-form", f"`{key}` must be true or false", keys)
            elif key in STAGE_WORDS:
                if isinstance(value, str) and (not STAGE_WORDS[key] or value in STAGE_WORDS[key]):
                    found[key] = value
                else:
                    self.wrong("wrong-form", f"`{key}` must be one of: {', '.join(STAGE_WORDS[key])}", keys)
            else:
                known = (*STAGE_KEYS, *STAGE_FLAGS, *STAGE_WORDS)
                self.wrong("unknown-key", f"`{key}` cannot be declared for a stage", keys, known=known)
        return found

    def _tolerance(self) -> dict[str, float]:
        found = self._numbers("tolerance", "")
        for key, value in found.items():
            if not 0 <= value < 1:
                self.wrong(
                    "wrong-quantity",
                    f"a tolerance of {value:g} is not between 0 and 100 %",
                    ("tolerance", key),
                    cure='write "1 %"',
                )
        return found

    def _temperature(self) -> tuple[float, float] | None:
        data = self._table("temperature")
        for key in data:
            if key not in {"low", "high"}:
                self.wrong(
                    "unknown-key", f"`{key}` is not a temperature bound", ("temperature", key), known=("low", "high")
                )
        if not data:
            return None
        low = self._quantity(data.get("low", 25.0), "degC", ("temperature", "low"))
        high = self._quantity(data.get("high", 25.0), "degC", ("temperature", "high"))
        return None if low is None or high is None else (min(low, high), max(low, high))

    def _limits(self) -> dict[str, dict[str, float | str]]:
        found: dict[str, dict[str, float | str]] = {}
        for rule, limits in self._tables("limits").items():
            found[rule] = {}
            for name, value in limits.items():
                if isinstance(value, int | float | str) and not isinstance(value, bool):
                    found[rule][name] = value
                else:
                    self.wrong(
                        "wrong-form", f"limit `{name}` must be a number or a quantity in quotes", ("limits", rule, name)
                    )
        return found

    def _words(self, section: str, key: str) -> tuple[str, ...]:
        value = self._table(section).get(key, [])
        if isinstance(value, list) and all(isinstance(each, str) for each in value):
            return tuple(value)
        self.wrong("wrong-form", f"`{section}.{key}` must be a list of names in quotes", (section, key))
        return ()

    def _levels(self) -> dict[str, str]:
        rules = self._table("rules")
        for key in rules:
            if key not in {"folders", "off", "levels"}:
                self.wrong(
                    "unknown-key",
                    f"`{key}` is not a setting of [rules]",
                    ("rules", key),
                    known=("folders", "off", "levels"),
                )
        levels = rules.get("levels", {})
        found = {}
        for rule, level in levels.items() if isinstance(levels, dict) else ():
            if level in LEVELS:
                found[rule] = level
            else:
                self.wrong("wrong-form", f"level of {rule} must be error, warning or note", ("rules", "levels", rule))
        return found

    def _style(self) -> str | None:
        netlists = self._table("netlists")
        for key in netlists:
            if key not in {"libraries", "style"}:
                self.wrong(
                    "unknown-key",
                    f"`{key}` is not a setting of [netlists]",
                    ("netlists", key),
                    known=("libraries", "style"),
                )
        style = netlists.get("style")
        if style in {None, "simulation", "board"}:
            return style
        self.wrong("wrong-form", "`netlists.style` must be simulation or board", ("netlists", "style"))
        return None

    def _series(self) -> dict[str, str]:
        names = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")
        found = {}
        for key, value in self._table("series").items():
            if key in {"resistor", "capacitor", "inductor"} and value in names:
                found[key] = value
            else:
                self.wrong("wrong-form", f"series of `{key}` must be one of {', '.join(names)}", ("series", key))
        return found

    def _decoupling(self) -> str | None:
        value = self.document.data.get("decoupling")
        if value in {None, "elsewhere"}:
            return value
        self.wrong("wrong-form", '`decoupling` can only be "elsewhere"', ("decoupling",))
        return None

    def _waivers(self) -> tuple[WaiverIntent, ...]:
        listed = self.document.data.get("waivers", [])
        if not isinstance(listed, list):
            self.wrong("wrong-form", "waivers must be written as [[waivers]]", ("waivers",))
            return ()
        found = []
        for index, data in enumerate(listed):
            keys: tuple[str | int, ...] = ("waivers", index)
            known = ("rule", "where", "reason", "by", "until")
            for key in data:
                if key not in known:
                    self.wrong("unknown-key", f"`{key}` is not part of a waiver", (*keys, key), known=known)
            texts = {}
            for key in ("rule", "where", "reason"):
                value = data.get(key)
                if isinstance(value, str) and value.strip():
                    texts[key] = value
                else:
                    self.wrong("waiver-incomplete", f"waiver {index + 1} gives no {key}", keys, cure=f'add {key} = "…"')
            until = data.get("until")
            if until is not None and not isinstance(until, date):
                self.wrong(
                    "wrong-form",
                    "`until` must be a date",
                    (*keys, "until"),
                    cure="write until = 2027-06-30, without quotes",
                )
                until = None
            if len(texts) == 3:
                found.append(
                    WaiverIntent(
                        texts["rule"],
                        texts["where"],
                        texts["reason"],
                        data.get("by"),
                        until,
                        self.document.location(*keys),
                    )
                )
        return tuple(found)
