"""Text in, statements out: netlists and intent files as their authors wrote them, each line with its place."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .expressions import evaluate
    from .intent import Intent, find_intent, parse_intent, read_intent
    from .read import parse_netlist, read_netlist
    from .values import read_value

__all__ = [
    "Intent",
    "evaluate",
    "find_intent",
    "parse_intent",
    "parse_netlist",
    "read_intent",
    "read_netlist",
    "read_value",
]

_HOMES = {
    "Intent": "intent",
    "evaluate": "expressions",
    "find_intent": "intent",
    "parse_intent": "intent",
    "parse_netlist": "read",
    "read_intent": "intent",
    "read_netlist": "read",
    "read_value": "values",
}


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f".{_HOMES[name]}", __name__), name)
