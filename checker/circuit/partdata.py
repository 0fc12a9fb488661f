"""Part data: what is known of a part family, with its source and whether it was read there.

Units are SI. ``None`` means not known, never zero. Headrooms are distances from the rails: the highest output is
``V+ − output_high_headroom_v``; a negative input headroom lies beyond the rail.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Pinout:
    """Pin numbers by role for one package: ``roles`` is ``((role, number), …)`` in package pin order.

    Roles of channels carry their number for packages with several (``OUT1``, ``IN1-``, ``IN1+``); supplies are
    ``V+`` and ``V-``.
    """

    package: str
    channels: int
    roles: tuple[tuple[str, int], ...]


@dataclass(frozen=True, slots=True)
class PartData:
    """One part family.

    ``channels_by_name`` tells the members of a family that is numbered by channel count apart, ``output_by_name`` the
    output voltage of a fixed regulator or reference by its number (V). ``pin_order`` is the order of the nets on an
    instance line where it is declared. ``gain_formula`` is in ``rg`` (ohm); ``fixed_gain`` is that of a one-chip
    amplifier without gain resistor.
    """

    name: str
    kind: str
    aliases: tuple[str, ...] = ()
    channels: tuple[int, ...] = (1,)
    output_stage: str | None = None
    technology: str | None = None
    supply_total_min_v: float | None = None
    supply_total_max_v: float | None = None
    supply_abs_max_v: float | None = None
    input_low_headroom_v: float | None = None
    input_high_headroom_v: float | None = None
    output_low_headroom_v: float | None = None
    output_high_headroom_v: float | None = None
    headroom_basis: str | None = None
    load_ohm: float | None = None
    test_supply_v: float | None = None
    gbw_hz: float | None = None
    slew_v_per_s: float | None = None
    open_loop_gain_db: float | None = None
    input_bias_a: float | None = None
    input_bias_max_a: float | None = None
    offset_max_v: float | None = None
    noise_v_rthz: float | None = None
    output_current_a: float | None = None
    output_current_kind: str | None = None
    output_resistance_ohm: float | None = None
    min_stable_gain: float | None = None
    max_direct_capacitive_load_f: float | None = None
    differential_input_limit_v: float | None = None
    phase_reversal: bool | None = None
    quiescent_a: float | None = None
    cmrr_min_db: float | None = None
    pinouts: tuple[Pinout, ...] = ()
    fixed_output_v: tuple[float, ...] = ()
    dropout_v: float | None = None
    min_load_a: float | None = None
    gain_formula: str | None = None
    source: str = ""
    verified: str = "no"
    from_memory: tuple[str, ...] = ()
    notes: str = ""
    extra: Mapping[str, float] = field(default_factory=dict)
    channels_by_name: Mapping[str, int] = field(default_factory=dict)
    output_by_name: Mapping[str, float] = field(default_factory=dict)
    pin_order: tuple[str, ...] = ()
    fixed_gain: float | None = None

    def channels_of(self, name: str) -> int | None:
        """Return how many amplifiers a package of this name holds; None when the name does not tell."""
        if len(self.channels) == 1:
            return self.channels[0]
        from .partnames import longest_prefix

        member = longest_prefix(name, self.channels_by_name)
        return None if member is None else self.channels_by_name[member]

    def is_read(self, field_name: str) -> bool:
        """True when the value of ``field_name`` was read in the named source rather than recalled from memory."""
        return self.verified != "no" and field_name not in self.from_memory
