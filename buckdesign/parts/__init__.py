"""Parts and cores: frozen dataclasses, their CSV tables and the one loader."""

from buckdesign.parts.catalogue import Problem, Tables
from buckdesign.parts.cores import InductanceFactor, LossPoint, Material, Ring
from buckdesign.parts.kinds import Capacitor, Rectifier, Regulator, Transistor, Wire
from buckdesign.parts.loading import KINDS, load_tables, names_in, user_folder

__all__ = [
    "KINDS",
    "Capacitor",
    "InductanceFactor",
    "LossPoint",
    "Material",
    "Problem",
    "Rectifier",
    "Regulator",
    "Ring",
    "Tables",
    "Transistor",
    "Wire",
    "load_tables",
    "names_in",
    "user_folder",
]
