"""Made-up reviews that every report format is tried on."""

from dataclasses import replace
from datetime import date

import pytest

from ampwarden.errors import Location, Problem
from ampwarden.rulebook.findings import (
    STAGE_MEASURES,
    Counts,
    Finding,
    NetlistReview,
    Remedy,
    Review,
    RuleText,
    StageReport,
    Unevaluated,
    Waived,
)

SWING = Finding(
    rule="output-near-rail",
    level="warning",
    message="output of U2A reaches 11.4 V, 0.600 V below rail VCC; the part needs 1.50 V",
    remedy=Remedy("lower the gain from 5.70 to 5.22: R4 47k -> 42.2k (E96)", True),
    because="an output stage leaves its linear range before it meets the rail",
    parts=("U2", "R4"),
    nets=("VCC", "out"),
    stage="U2A",
    file="boards/gauge.cir",
    line=9,
    measured=0.6,
    limit=1.5,
    unit="V",
    fingerprint="f1",
    subject="U2A",
)
BYPASS = replace(
    SWING,
    rule="supply-decoupling-missing",
    level="error",
    message="supply net -12V of U2 has no capacitor of at least 10.0 nF to ground",
    remedy=Remedy("add 100 nF from -12V to 0 beside U2"),
    because="the supply's impedance closes a second loop around the amplifier",
    parts=("U2",),
    nets=("-12V",),
    stage=None,
    line=12,
    measured=None,
    limit=None,
    unit=None,
    fingerprint="f2",
    subject="-12V",
)
CLIPS = replace(
    SWING,
    message="output of U3B reaches 11.9 V",
    stage=None,
    subject="U3B",
    fingerprint="f3",
    waived=Waived("clips on purpose: limiter ahead of the converter", "initials", date(2027, 6, 30)),
)
CONSEQUENCE = replace(
    SWING,
    rule="gain-off",
    level="note",
    message="U2A: gain cannot be held near the rail",
    fingerprint="f4",
    follows_from="f1",
)

FIGURES = {
    "dc_gain": 5.7,
    "midband_gain": 5.7,
    "noise_gain": 5.7,
    "bandwidth_hz": 526e3,
    "output_low_v": -2.85,
    "output_high_v": 11.4,
    "corner_hz": (1591.5, 15915.0),
}

STAGE = StageReport(
    name="U2A",
    topology="non-inverting-amplifier",
    amplifiers=("U2A",),
    inputs=("wave",),
    output="out",
    roles={"feedback": ("R4",), "ground_resistor": ("R3",)},
    measures=dict.fromkeys(STAGE_MEASURES) | FIGURES,
    properties={"input_filter": ("R9", "C9")},
    line=9,
    file="boards/gauge.cir",
)
LOST = StageReport(
    name="U4",
    topology="unrecognized",
    amplifiers=("U4",),
    inputs=(),
    output="n7",
    roles={},
    measures=dict.fromkeys(STAGE_MEASURES),
    reason="the feedback ends at a transistor whose kind is not known",
    line=30,
    file="boards/gauge.cir",
)

READ = NetlistReview(
    path="boards/gauge.cir",
    title="wave gauge",
    sha256="ab" * 32,
    rails=(("VCC", 12.0, "source"), ("-12V", -12.0, "name"), ("VREF", None, "part")),
    stages=(STAGE, LOST),
    findings=(SWING, BYPASS, CLIPS, CONSEQUENCE),
    unevaluated=(
        Unevaluated("slew-rate-exceeded", "U2A", "no frequency is declared for wave"),
        Unevaluated("slew-rate-exceeded", "U3B", "no frequency is declared for wave"),
        Unevaluated("bias-current-offset", "U4", "stage is not recognized"),
    ),
    counts=Counts(passed=34, flagged=3, waived=1, unevaluated=3),
    assumptions=("headroom of 1.50 V assumed for U4: no part data",),
)
UNREAD = NetlistReview(
    path="boards/torn.cir",
    title="",
    sha256="cd" * 32,
    error=(
        Problem("value", "R7: cannot read the value `4..7k`", Location("boards/torn.cir", 14, 11, "R7 a b 4..7k", 5)),
        Problem("nets", "R8: has one net, needs two", Location("boards/torn.cir", 15)),
    ),
)
RULES = (
    RuleText("gain-off", "note", "gain is off", "a reason", ("a source",), "gain"),
    RuleText("output-near-rail", "error", "output comes near a rail", "an output stage leaves its range", (), "range"),
)


@pytest.fixture
def whole() -> Review:
    """One netlist that shows everything a report can hold, and one that could not be read."""
    return Review((READ, UNREAD), RULES)


@pytest.fixture
def read() -> NetlistReview:
    return READ


@pytest.fixture
def clean() -> Review:
    """A netlist without findings and without open questions."""
    netlist = replace(READ, findings=(), unevaluated=(), counts=Counts(passed=38), stages=(STAGE,), assumptions=())
    return Review((netlist,))


@pytest.fixture
def swing() -> Finding:
    return SWING
