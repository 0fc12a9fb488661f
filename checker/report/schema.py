"""The JSON format ``ampwarden-review/1``, declared once: as_json fills these models, the shipped schema is made of it.

Figures are SI base units in plain floats; what is unknown or was not computed is null.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, create_model

from .wording import MEASURES

FORMAT = "ampwarden-review/1"

Level = Literal["error", "warning", "note"]
Origin = Literal["source", "declared", "name", "part", "filtered"]


class Record(BaseModel):
    """A closed, frozen record of the format; figures must be finite."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


_KINDS: dict[str, Any] = {
    "number": float | None,
    "list": list[float] | None,
    "map": dict[str, float | None] | None,
}


def _measure_fields() -> dict[str, Any]:
    units = {"": "", "%": ""}
    said = {word.name: word.label + units.get(word.unit, f", {word.unit}") for word in MEASURES}
    return {word.name: (_KINDS[word.kind], Field(description=said[word.name])) for word in MEASURES}


Measures: type[Record] = create_model("Measures", __base__=Record, **_measure_fields())
Measures.__doc__ = "Figures of a stage; null where they do not apply or could not be computed."


class ProblemRecord(Record):
    """One thing that is wrong, or worth knowing, in the text of a netlist."""

    kind: str = Field(description="stable kebab-case word")
    level: Literal["error", "warning"]
    message: str
    file: str | None
    line: int | None = Field(ge=1)
    column: int | None = Field(ge=1)
    cure: str | None


class ErrorRecord(Record):
    """Why a netlist could not be read: the first problem, and all of them."""

    message: str
    file: str | None
    line: int | None = Field(ge=1)
    problems: list[ProblemRecord]


class RailRecord(Record):
    """A net at a fixed potential."""

    net: str
    volts: float | None
    origin: Origin


class StageRecord(Record):
    """A recognized stage with its roles and figures."""

    name: str
    topology: str
    amplifiers: list[str]
    inputs: list[str] = Field(description="nets that signals enter by, the first input first")
    output: str | None
    roles: dict[str, list[str]] = Field(description="designators by role")
    measures: Measures  # type: ignore[valid-type]
    properties: dict[str, list[str]] = Field(description="facts beside the topology, with designators")
    reason: str | None = Field(description="why an unrecognized stage fits no topology")
    notes: list[str]
    file: str
    line: int


class WaivedRecord(Record):
    """Who accepted a finding, why, and until when (ISO 8601 date)."""

    reason: str
    by: str | None
    until: str | None


class FindingRecord(Record):
    """One defect."""

    rule: str
    level: Level
    message: str
    remedy: str | None
    remedy_verified: bool = Field(description="true when the changed circuit was computed and passes the rule")
    because: str
    subject: str
    parts: list[str]
    nets: list[str]
    stage: str | None
    file: str
    line: int
    measured: float | None
    limit: float | None
    unit: str | None
    assumptions: list[str]
    waived: WaivedRecord | None
    follows_from: str | None = Field(description="fingerprint of the finding that causes this one")
    fingerprint: str = Field(description="stays when lines move or unrelated parts are added")


class UnevaluatedRecord(Record):
    """A check that could not be carried out, and what is missing."""

    rule: str
    subject: str
    reason: str


class CountsRecord(Record):
    """Outcomes of all pairs of rule and subject; each pair is in exactly one count."""

    passed: int = Field(ge=0)
    flagged: int = Field(ge=0)
    waived: int = Field(ge=0)
    unevaluated: int = Field(ge=0)


class NetlistRecord(Record):
    """The review of one netlist."""

    path: str
    title: str
    sha256: str
    error: ErrorRecord | None = Field(description="null, or why the netlist could not be read; then the rest is empty")
    problems: list[ProblemRecord] = Field(description="what the reader met in the text of a netlist that it could read")
    rails: list[RailRecord]
    stages: list[StageRecord]
    findings: list[FindingRecord]
    unevaluated: list[UnevaluatedRecord]
    counts: CountsRecord
    assumptions: list[str]


class ReviewRecord(Record):
    """A review of one or more netlists."""

    format: Literal["ampwarden-review/1"]
    version: str = Field(description="version of ampwarden")
    netlists: list[NetlistRecord]


def review_schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of the format."""
    schema = ReviewRecord.model_json_schema(mode="serialization")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def shipped_schema() -> str:
    """Return the text of the schema file that the package carries."""
    from importlib.resources import files

    return files(__package__).joinpath("review-schema.json").read_text(encoding="utf-8")
