"""Review analog schematics: a netlist in, findings with part, number, limit and a computed fix out.

``review(path)`` reviews netlists and returns a :class:`Review`. Names are loaded on first use: importing this package
loads none of its rooms.

Examples
--------
>>> import ampwarden
>>> result = ampwarden.review("board.cir")  # doctest: +SKIP
>>> [finding.message for finding in result.findings]  # doctest: +SKIP
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from .version import __version__

if TYPE_CHECKING:
    from .errors import AmpwardenError
    from .pipeline import review
    from .rulebook.findings import Finding, Review, Unevaluated

__all__ = ["AmpwardenError", "Finding", "Review", "Unevaluated", "__version__", "review"]

_HOMES = {
    "AmpwardenError": "errors",
    "Finding": "rulebook.findings",
    "Review": "rulebook.findings",
    "Unevaluated": "rulebook.findings",
    "review": "pipeline",
}


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    found = getattr(import_module(f".{_HOMES[name]}", __name__), name)
    globals()[name] = found
    return found


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
