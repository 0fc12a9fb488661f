"""The one table of styles: code names the meaning of a text, this table its colour.

Colours are the sixteen of the reader's own terminal palette, so that they suit a dark and a light background.
"""

from __future__ import annotations

STYLES = {
    "level.error": "bold red",
    "level.warning": "bold yellow",
    "level.note": "bold cyan",
    "level.waived": "dim",
    "rule.name": "bold",
    "netlist.path": "bold",
    "netlist.title": "",
    "netlist.rule": "dim",
    "stage.name": "bold",
    "stage.topology": "blue",
    "stage.unrecognized": "magenta",
    "net.name": "",
    "part.name": "",
    "place": "dim",
    "label": "dim",
    "figure": "",
    "figure.measured": "bold",
    "remedy": "green",
    "remedy.unverified": "",
    "because": "dim",
    "heading": "bold",
    "verdict.good": "bold green",
    "verdict.bad": "bold red",
    "verdict.open": "bold yellow",
    "": "",
}


def paint(text: str, style: str) -> str:
    """Return the text with the terminal codes of a style; rich is loaded only here, so only for a terminal."""
    from rich.color import ColorSystem
    from rich.style import Style

    written = STYLES[style]
    return Style.parse(written).render(text, color_system=ColorSystem.STANDARD) if written else text
