"""Part files: ``rules/parts/<family>.toml`` checked by pydantic; used only when the catalogue is compiled."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError, ValidationInfo, field_validator, model_validator

from ..errors import Problem, RulePackError
from ..quantities import nearest_names, parse_quantity
from ..resources import TomlDocument

KINDS = (
    "op-amp",
    "comparator",
    "current-feedback",
    "instrumentation amplifier",
    "difference amplifier",
    "buffer",
    "rail splitter",
    "voltage reference",
    "voltage regulator",
    "charge pump inverter",
    "bipolar transistor",
    "junction FET",
    "MOSFET",
)

# Unit of a field by the end of its name, the longest ending first.
UNITS = (
    ("_v_per_s", "V/s"),
    ("_v_rthz", "V/rtHz"),
    ("_hz", "Hz"),
    ("_ohm", "ohm"),
    ("_db", "dB"),
    ("_v", "V"),
    ("_a", "A"),
    ("_f", "F"),
)

Volts = Annotated[float, Field(ge=-1000, le=1000)]
Positive = Annotated[float, Field(gt=0)]
NotNegative = Annotated[float, Field(ge=0)]


def unit_of_field(name: str) -> str | None:
    """Return the unit of a field of part data by its name; None for words, counts and ratios."""
    if name == "is_read":
        return None
    return next((unit for ending, unit in UNITS if name.endswith(ending)), None)


class PartFile(BaseModel):
    """One part family as its file gives it; SI units, unknown values absent. See :class:`PartData` for meanings."""

    model_config = ConfigDict(extra="forbid", strict=False)

    name: str = Field(min_length=1)
    kind: Literal[KINDS]  # type: ignore[valid-type]
    aliases: list[str] = []
    channels: list[Annotated[int, Field(ge=1, le=8)]] = [1]
    output_stage: Literal["push-pull", "rail-to-rail", "open-collector", "open-drain", "shunt"] | None = None
    technology: str | None = None
    supply_total_min_v: Positive | None = None
    supply_total_max_v: Positive | None = None
    supply_abs_max_v: Positive | None = None
    input_low_headroom_v: Volts | None = None
    input_high_headroom_v: Volts | None = None
    output_low_headroom_v: Volts | None = None
    output_high_headroom_v: Volts | None = None
    headroom_basis: Literal["guaranteed", "typical"] | None = None
    load_ohm: Positive | None = None
    test_supply_v: Positive | None = None
    gbw_hz: Positive | None = None
    slew_v_per_s: Positive | None = None
    open_loop_gain_db: Annotated[float, Field(gt=0, le=200)] | None = None
    input_bias_a: NotNegative | None = None
    input_bias_max_a: NotNegative | None = None
    offset_max_v: NotNegative | None = None
    noise_v_rthz: Positive | None = None
    output_current_a: Positive | None = None
    output_current_kind: str | None = None
    output_resistance_ohm: NotNegative | None = None
    min_stable_gain: Annotated[float, Field(ge=1)] | None = None
    max_direct_capacitive_load_f: NotNegative | None = None
    differential_input_limit_v: Positive | None = None
    phase_reversal: bool | None = None
    quiescent_a: Positive | None = None
    cmrr_min_db: Positive | None = None
    pinouts: dict[str, str] = {}
    fixed_output_v: list[Volts] = []
    dropout_v: NotNegative | None = None
    min_load_a: NotNegative | None = None
    gain_formula: str | None = None
    source: str = ""
    verified: Literal["yes", "partly", "no"] = "no"
    from_memory: list[str] = []
    notes: str = ""
    extra: dict[str, float] = {}
    channels_by_name: dict[str, Annotated[int, Field(ge=1, le=8)]] = {}
    output_by_name: dict[str, Volts] = {}
    pin_order: list[str] = []
    fixed_gain: Positive | None = None

    @field_validator("*", mode="before")
    @classmethod
    def _quantity(cls, value: Any, info: ValidationInfo) -> Any:
        """Read strings with a unit; bare numbers are in SI units."""
        name = info.field_name or ""
        if name == "pin_order" and isinstance(value, str):
            return value.split()
        unit = unit_of_field(name)
        if unit is None:
            return value
        if isinstance(value, list):
            return [parse_quantity(each, unit) for each in value]
        return parse_quantity(value, unit) if isinstance(value, str | int | float) else value

    @model_validator(mode="after")
    def _supplies_in_order(self) -> PartFile:
        bounds = [
            each
            for each in (self.supply_total_min_v, self.supply_total_max_v, self.supply_abs_max_v)
            if each is not None
        ]
        if bounds != sorted(bounds):
            raise ValueError("supply minimum, maximum and absolute maximum are not in rising order")
        return self


def read_part(document: TomlDocument) -> dict[str, Any]:
    """Return one part file as JSON-able data; trouble is raised with the line of the key."""
    return check_part(document.data, document.path, document)


def check_part(data: Mapping[str, Any], name: str, document: TomlDocument | None = None) -> dict[str, Any]:
    """Check the data of one part and spell out its pinouts."""
    try:
        part = PartFile.model_validate(dict(data))
    except ValidationError as trouble:
        problems = []
        for each in trouble.errors():
            key = ".".join(str(step) for step in each["loc"])
            what = (
                f"`{key}` is not part data" if each["type"] == "extra_forbidden" else f"`{key}`: {each['msg'].lower()}"
            )
            near = nearest_names(key, PartFile.model_fields) if each["type"] == "extra_forbidden" else ()
            place = document.location(*each["loc"]) if document is not None else None
            problems.append(Problem("part-data-wrong", what, place, nearest=near))
        raise RulePackError(problems) from trouble
    plain = {key: value for key, value in part.model_dump().items() if value not in (None, "", [], {})}
    plain["pinouts"] = [_pinout(package, text, name) for package, text in part.pinouts.items()]
    return plain


def _pinout(package: str, text: str, name: str) -> dict[str, Any]:
    words = text.split()
    if len(words) % 2 or not all(word.isdigit() for word in words[1::2]):
        raise RulePackError(Problem("pinout-wrong", f"{name}: pinout `{package}` is not a list of role and number"))
    roles = sorted(zip(words[::2], map(int, words[1::2]), strict=True), key=lambda each: each[1])
    numbers = {int(match[1]) for role, _ in roles if (match := re.match(r"^(?:OUT|IN)(\d)", role))}
    return {"package": package, "channels": max(numbers, default=1), "roles": [list(each) for each in roles]}
