"""Statements in, a circuit out: flat parts, nets, rails, signals and amplifiers with their pins found."""

from __future__ import annotations

from .build import build_circuit
from .catalogue import Catalogue, load_catalogue
from .graph import Circuit
from .partdata import PartData
from .parts import Amplifier, Part, PartKind

__all__ = ["Amplifier", "Catalogue", "Circuit", "Part", "PartData", "PartKind", "build_circuit", "load_catalogue"]
