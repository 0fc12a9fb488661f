"""The nouns of a circuit: pins, parts, rails, signals, amplifiers.

Nets are plain strings: the first spelling met in the netlist stands for all spellings of the net, so equal strings
mean the same net. Designators likewise. Parts inside a subcircuit instance are ``X1/R3``, their nets ``X1/n4``.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum

from ..errors import Location
from .partdata import PartData


class PartKind(StrEnum):
    """What a part is, as far as the analysis is concerned."""

    RESISTOR = "resistor"
    CAPACITOR = "capacitor"
    INDUCTOR = "inductor"
    COUPLING = "coupling"
    VOLTAGE_SOURCE = "voltage source"
    CURRENT_SOURCE = "current source"
    VCVS = "voltage-controlled voltage source"
    VCCS = "voltage-controlled current source"
    CCCS = "current-controlled current source"
    CCVS = "current-controlled voltage source"
    BEHAVIOURAL = "behavioural source"
    DIODE = "diode"
    BJT = "bipolar transistor"
    JFET = "junction FET"
    MOSFET = "MOSFET"
    SWITCH = "switch"
    AMPLIFIER = "amplifier"
    REGULATOR = "rail source"
    CONNECTOR = "connector"
    OPAQUE = "opaque part"


@dataclass(frozen=True, slots=True)
class Pin:
    """One pin of a part: its name within the part (``1``/``2`` for two-terminal parts, ``anode``, ``base``, ``IN+``…)."""

    name: str
    net: str


@dataclass(frozen=True, slots=True)
class DeviceModel:
    """Evaluated ``.model``: ``kind`` in capitals, ``params`` with lower-case names, SI units."""

    name: str
    kind: str
    params: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Drive:
    """An independent source evaluated: DC value, extremes, frequency; ``None`` where the source does not say.

    ``low`` and ``high`` are the extremes of its value over time (V or A), ``frequency_hz`` its repetition or sine
    frequency, ``ac`` the small-signal magnitude.
    """

    dc: float | None = None
    low: float | None = None
    high: float | None = None
    frequency_hz: float | None = None
    ac: float | None = None


@dataclass(frozen=True, slots=True)
class Part:
    """One part after flattening.

    ``value`` is in ohm, farad, henry, volt, ampere or the gain of a controlled source; ``None`` when the netlist does
    not give it. Controlled sources and switches have their two ends as pins ``1`` and ``2``; ``control`` names the
    controlling nets (E, G) or sources (F, H), through which no current flows. ``tolerance`` is a fraction when the
    netlist states one, ``rating_v``/``rating_w`` likewise. ``is_fitted`` is false for parts marked not fitted.
    """

    designator: str
    kind: PartKind
    pins: tuple[Pin, ...]
    location: Location
    value: float | None = None
    model: DeviceModel | None = None
    part_name: str | None = None
    params: Mapping[str, float] = field(default_factory=dict)
    drive: Drive | None = None
    control: tuple[str, ...] = ()
    coefficients: tuple[float, ...] = ()
    expression: str | None = None
    tolerance: float | None = None
    rating_v: float | None = None
    rating_w: float | None = None
    marks: tuple[str, ...] = ()
    is_fitted: bool = True

    @property
    def nets(self) -> tuple[str, ...]:
        """Nets of the pins, in pin order."""
        return tuple(pin.net for pin in self.pins)

    def net_of(self, pin: str) -> str | None:
        """Return the net on the named pin, or None when the part has no such pin."""
        for each in self.pins:
            if each.name == pin:
                return each.net
        return None


@dataclass(frozen=True, slots=True)
class Rail:
    """A net at a fixed potential: ``origin`` is source, declared, name, part or filtered.

    ``volts`` is None when the net is known to be a rail but not at which voltage. ``feed`` is the net that a filtered
    rail is fed from. ``evidence`` says in a few words where the voltage came from.
    """

    net: str
    volts: float | None
    origin: str
    evidence: str = ""
    feed: str | None = None
    tolerance: float | None = None


@dataclass(frozen=True, slots=True)
class Signal:
    """A signal that enters the circuit on ``net``: extremes in volts (amperes when ``is_current``), band in hertz.

    ``other`` is the return net of a floating source; the extremes are then those of ``net`` against ``other``.
    """

    net: str
    low: float | None
    high: float | None
    frequencies_hz: tuple[float, ...] = ()
    origin: str = "source"
    source: str | None = None
    is_current: bool = False
    noise_v: float | None = None
    other: str | None = None


@dataclass(frozen=True, slots=True)
class Amplifier:
    """One amplifier channel with its pins found.

    ``name`` is the designator, with the channel letter for packages (``U1A``). ``kind`` is ``op-amp``,
    ``comparator``, ``current-feedback``, ``instrumentation amplifier``, ``difference amplifier`` or ``buffer``.
    Pins are nets; supply pins are None for ideal amplifiers that have none. ``others`` maps further roles (``REF``,
    ``RG``, ``NULL``…) to nets. ``gain`` is the open-loop gain (V/V); ``gain_origin`` is ``part``, ``netlist`` or
    ``assumed``. ``inner`` holds the linear parts of a subcircuit body that the solver can use in place of a
    behavioural model (empty when there is none). ``evidence`` says how the pin roles were found.
    """

    name: str
    designator: str
    kind: str
    plus: str
    minus: str
    output: str
    location: Location
    supply_plus: str | None = None
    supply_minus: str | None = None
    others: tuple[tuple[str, str], ...] = ()
    part_name: str | None = None
    data: PartData | None = None
    gain: float = 1e5
    gain_origin: str = "assumed"
    inner: tuple[Part, ...] = ()
    evidence: str = ""
    is_open_output: bool = False

    @property
    def has_supply_pins(self) -> bool:
        """True when the amplifier shows both supply pins in the netlist."""
        return self.supply_plus is not None and self.supply_minus is not None


@dataclass(frozen=True, slots=True)
class Undetermined:
    """A part that may be an amplifier but whose pin roles are not known: why, and what the reviewer can declare."""

    designator: str
    reason: str
    declare: str
    location: Location
