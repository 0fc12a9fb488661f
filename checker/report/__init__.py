"""Turn a review into text for people and programs; nothing is judged or computed here."""

from __future__ import annotations

from .formats import FORMATS, Format, Options, find_format

__all__ = ["FORMATS", "Format", "Options", "find_format"]
