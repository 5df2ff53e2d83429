"""From the computed change of dipole to the one that solvent shifts show.

Densities of singles are not relaxed: in states of strong charge transfer their change of dipole is too large, and
where it is small the field of the solvent still makes one. Three numbers, fitted to the Stokes shifts of measured dyes
in four or more media without hydrogen-bond donation (:mod:`orchil_stages.training.solvents`), turn it into the
effective one.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from orchil_schemas import FloatArray

LEAST_DEBYE = 1.0
"""Joined in quadrature to the computed change: below it the logarithm says nothing."""


@dataclass(frozen=True)
class Effective:
    """Constant and exponents of computed change (debye) and volume (cubic angstrom); share of the absorption slope."""

    constant: float
    dipole: float
    volume: float
    absorption: float

    def length(self, computed_debye: float, volume_angstrom3: float) -> float:
        """Effective change of dipole in debye."""
        grown = self.constant + self.dipole * np.log(np.hypot(computed_debye, LEAST_DEBYE))
        return float(np.exp(grown + self.volume * np.log(volume_angstrom3)))

    def change(self, computed_debye: FloatArray, volume_angstrom3: float) -> FloatArray:
        """Effective change of dipole (3,) along the computed one; zero where that is zero."""
        length = float(np.linalg.norm(computed_debye))
        if length == 0.0:
            return np.zeros(3)
        return np.asarray(computed_debye) * (self.length(length, volume_angstrom3) / length)


@cache
def effective() -> Effective:
    """The numbers shipped with the package."""
    return Effective(**json.loads(files(__package__).joinpath("trained.json").read_text(encoding="utf-8")))
