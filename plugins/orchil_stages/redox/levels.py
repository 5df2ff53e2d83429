"""From orbital levels to potentials: a straight line through well-known compounds, with the error it makes on them.

Potentials go with the frontier level (Koopmans; measured ones go with ionisation energies and electron affinities:
Parker, J. Am. Chem. Soc. 98, 98, 1976); gap, charge and size stand for relaxation and solvation of the ion that is
made. Five numbers a line, fitted when first asked for to the compounds of ``potentials.csv``.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Literal

import numpy as np
from orchil_schemas import FloatArray

COVERAGE = 0.9
Process = Literal["oxidation", "reduction"]
LEVELS = {"oxidation": "homo_ev", "reduction": "lumo_ev"}

FROM_SCE = {"SCE": 0.0, "Fc": -0.38, "NHE": 0.241}
"""Added to a potential against SCE: ferrocene is at +0.380 V in acetonitrile (Pavlishchuk, Addison, Inorg. Chim. Acta
298, 97, 2000, from memory), SCE at +0.241 V against the normal hydrogen electrode (CRC Handbook).
"""
LABORATORIES = 0.15
"""Half-width (V) of what separates measurements of one compound in different laboratories; common practice."""


@dataclass(frozen=True)
class Line:
    """Coefficients (5,) of the features, and what each compound is off when left out of the fit (compounds,)."""

    slope: FloatArray
    left_out: FloatArray

    def potential(self, features: FloatArray) -> float:
        """Potential in V against SCE."""
        return float(features @ self.slope)

    @property
    def error(self) -> float:
        """Half-width (V) of the interval: COVERAGE of the compounds left out, and what laboratories differ by."""
        rank = int(np.ceil(COVERAGE * (len(self.left_out) + 1))) - 1
        own = float(np.sort(np.abs(self.left_out))[min(rank, len(self.left_out) - 1)])
        return float(np.hypot(own, LABORATORIES))


def features(level_ev: float, gap_ev: float, charge: int, heavy_atoms: int) -> FloatArray:
    """Constant, level, gap, charge and the reciprocal of a radius (any scale), (5,)."""
    return np.array([1.0, -level_ev, gap_ev, charge, heavy_atoms ** (-1 / 3)])


@cache
def line(process: Process) -> Line:
    """The line of oxidation or reduction."""
    known = [row for row in compounds() if row[f"{process}_v"]]
    x = np.array([_features(row, LEVELS[process]) for row in known])
    y = np.array([float(row[f"{process}_v"]) for row in known])
    inverse = np.linalg.pinv(x)
    slope = inverse @ y
    return Line(slope, (y - x @ slope) / (1 - np.einsum("cf,fc->c", x, inverse)))


@cache
def compounds() -> tuple[dict[str, str], ...]:
    """The rows of ``potentials.csv``."""
    text = files(__package__).joinpath("potentials.csv").read_text(encoding="utf-8")
    return tuple(csv.DictReader(row for row in text.splitlines() if not row.startswith("#")))


def _features(row: dict[str, str], level: str) -> FloatArray:
    homo, lumo = float(row["homo_ev"]), float(row["lumo_ev"])
    return features(float(row[level]), lumo - homo, int(row["charge"]), int(row["heavy_atoms"]))
