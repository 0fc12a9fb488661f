"""Subjects that exist only for tests of the condition language: names with a unit and a kind, figures set by hand."""

from collections.abc import Mapping

from ampwarden.analysis.figures import Known, Unknown
from ampwarden.errors import Location
from ampwarden.rulebook.conditions import NameType, compile_condition, compile_value

WHERE = Location("rules/checks/gain/some-rule.toml", 7)


class Names:
    """A scope: name -> (unit, kind) or (unit, kind, words), relation -> scope."""

    def __init__(self, types, relations=None):
        self.types = types
        self.relations = relations or {}

    def type_of(self, name):
        return NameType(*self.types[name]) if name in self.types else None

    def related(self, name):
        return self.relations.get(name)

    def known(self):
        return (*self.types, *self.relations)


class Figures:
    """A reading: a figure that is not given is unknown; those already Known or Unknown are handed on as they are."""

    def __init__(self, given: Mapping[str, object] | None = None, members=None, **figures):
        self.given = {**(given or {}), **figures}
        self.related = members or {}
        self.asked = []

    def figure(self, name):
        self.asked.append(name)
        if name not in self.given:
            return Unknown(f"{name} is not computed", f"the part data behind {name}")
        found = self.given[name]
        return found if isinstance(found, Known | Unknown) else Known(found)

    def members(self, relation):
        return self.related.get(relation, ())


PIN = Names(
    {
        "name": ("", "word"),
        "resistance_ohm": ("ohm", "number"),
        "bias_a": ("A", "number"),
        "is_open": ("", "flag"),
        "gain": ("", "number"),
        "nets": ("", "words"),
    }
)
AMPLIFIER = Names(
    {"name": ("", "word"), "supply_current_a": ("A", "number"), "gain": ("", "number")}, {"input_pins": PIN}
)
STAGE = Names(
    {
        "topology": ("", "word", ("comparator", "voltage-follower", "inverting-amplifier")),
        "name": ("", "word"),
        "gain": ("", "number"),
        "a": ("", "number"),
        "b": ("", "number"),
        "c": ("", "number"),
        "p": ("", "flag"),
        "q": ("", "flag"),
        "supply_v": ("V", "number"),
        "output_v": ("V", "number"),
        "output_a": ("A", "number"),
        "load_ohm": ("ohm", "number"),
        "decoupling_f": ("F", "number"),
        "rate": ("V/s", "number"),
        "noise": ("V/rtHz", "number"),
        "bandwidth_hz": ("Hz", "number"),
        "delay_s": ("s", "number"),
        "temperature_c": ("degC", "number"),
        "rise_k": ("K", "number"),
        "cmrr_db": ("dB", "number"),
        "phase_margin_deg": ("deg", "number"),
        "mismatch": ("%", "number"),
        "corner_hz": ("Hz", "numbers"),
        "gains": ("", "map"),
        "nets": ("", "words"),
        "headroom": ("V", "number"),
    },
    {"input_pins": PIN, "amplifiers": AMPLIFIER},
)


def verdict(text, reading=None, /, *, members=None, scope=STAGE, **figures):
    """Compile a condition for a stage and answer it."""
    return compile_condition(text, scope, WHERE).evaluate(reading or Figures(figures, members))


def value(text, /, *, members=None, scope=STAGE, **figures):
    """Compile an expression for a stage and compute it."""
    return compile_value(text, scope, WHERE).evaluate(Figures(figures, members))
