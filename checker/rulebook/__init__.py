"""Rule files, the condition language, findings, remedies that are computed, waivers."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from .findings import Finding, NetlistReview, Review, Unevaluated

if TYPE_CHECKING:
    from .apply import Outcome, apply_pack
    from .pack import Pack, load_pack

__all__ = [
    "Finding",
    "NetlistReview",
    "Outcome",
    "Pack",
    "Review",
    "Unevaluated",
    "apply_pack",
    "load_pack",
]

_HOMES = {"Outcome": "apply", "apply_pack": "apply", "Pack": "pack", "load_pack": "pack"}


def __getattr__(name: str) -> Any:
    home = _HOMES.get(name)
    if home is None:
        raise AttributeError(name)
    from importlib import import_module

    return getattr(import_module(f".{home}", __name__), name)
