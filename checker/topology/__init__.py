"""A circuit in, stages out: what each amplifier is, which parts play which role, and why."""

from __future__ import annotations

from .recognize import find_stages
from .stages import Branch, Stage
from .templates import Template, load_templates

__all__ = ["Branch", "Stage", "Template", "find_stages", "load_templates"]
