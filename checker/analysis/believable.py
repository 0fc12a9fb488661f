"""What a solved figure must look like to be reported."""

from __future__ import annotations

BELIEVABLE_V = 1e4  # an ideal amplifier that nothing feeds back goes beyond; no circuit of this kind does
RUNS_AWAY = "an amplifier without known rails is not held by feedback at DC"


def tidy(value: float) -> float:
    """Return a voltage or current without the dust of the solve."""
    return 0.0 if abs(value) < 1e-12 else value
