"""The reference of the condition language, for the contributor guide."""

from __future__ import annotations

from .functions import FUNCTIONS

_REFERENCE = """\
A condition reads figures of its subject by name and answers true, false or cannot tell.

figures       headroom_v < 1.5 V; a yes-or-no figure stands alone: is_rail_to_rail
quantities    10 nF   4.7 kohm   4.7 kΩ   -40 degC   2 V/us   5 nV/rtHz   1 % (0.01)   60 dB   45 deg
              prefixes f p n u m k M G T; a number without unit is a ratio; 0 goes with any unit
arithmetic    + - * / and ** by a whole number from -9 to 9; units are carried along: r_ohm * i_a is in V;
              pi is 3.14159…
comparison    < <= > >= == !=; measured figure on the left, limit on the right
              figures that differ by less than a part in 10^9 are equal
ranges        low <= x <= high   x in low .. high   x not in low .. high (bounds included)
words         topology in ["comparator", "schmitt-trigger"]   kind == "jfet"   "VCC" in nets
              in double or single quotes; letter case makes no difference
tables        gains["IN1"] is the figure of one name; "IN1" in gains asks whether there is one
logic         and or not, with brackets; not binds closest, then and, then or
unknowns      false and unknown is false, true or unknown is true, everything else with an unknown figure is
              unknown: the rule is then unevaluated and tells what is missing
              phase_margin_deg is known   phase_margin_deg is unknown
members       any(input_pins, resistance_ohm > 1 Mohm and outer.gain > 10): inside, names are the member's first, then
              the subject's; outer.name is the subject's where both have one; of no members any is false, all is
              true, count is 0
"""

_CLOSING = """\
lines         a condition may run over several lines; # starts a comment
bounds        4000 characters, brackets 60 deep, questions about members 2 deep; no code is ever run
errors        a wrong name, kind or unit stops the loading of the pack, with file, line, column and the cure
"""


def reference() -> str:
    """Return the reference as plain text, its functions listed from their table."""
    width = max(len(each.usage) for each in FUNCTIONS.values())
    rows = [f"              {each.usage:<{width}}  {each.text}" for each in FUNCTIONS.values()]
    rows[0] = "functions" + rows[0][len("functions") :]
    return _REFERENCE + "\n".join(rows) + "\n" + _CLOSING
