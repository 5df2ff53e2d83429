"""Walls that keep a species as drawn where GFN2-xTB in an implicit solvent would turn it into another.

Explicit solvent molecules hold open rhodamines and zwitterions that a continuum lets close or pass a
proton. A wall is a half parabola on one distance: zero inside, so that it does not touch the structure
where nothing happens.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from orchil_schemas import FloatArray

from orchil_stages.ground_state import BOHR_ANGSTROM

from .optimiser import EnergyAndGradient
from .topology import Change

STIFFNESS = 0.2
"""hartree/bohr^2"""
APART, TOGETHER = 1.7, 1.1
"""Times the sum of covalent radii: unbonded atoms stay farther, bonded ones closer."""


class Walls:
    """Half-parabola walls on the distances that changed."""

    def __init__(self, changes: Sequence[Change]) -> None:
        self._atoms = np.array([change.atoms for change in changes])
        self._sign = np.array([1.0 if change.formed else -1.0 for change in changes])
        factor = np.where(self._sign > 0, APART, TOGETHER)
        self._limit = factor * np.array([change.radii_angstrom for change in changes]) / BOHR_ANGSTROM

    def energy_and_gradient(self, x: FloatArray) -> tuple[float, FloatArray]:
        """Energy (hartree) and gradient (atoms, 3) of the walls at ``x`` (bohr)."""
        first, second = self._atoms.T
        vector = x[second] - x[first]
        length = np.linalg.norm(vector, axis=1)
        inside = np.maximum(0.0, self._sign * (self._limit - length))
        slope = (-STIFFNESS * self._sign * inside / length)[:, None] * vector
        gradient = np.zeros_like(x)
        np.add.at(gradient, second, slope)
        np.add.at(gradient, first, -slope)
        return 0.5 * STIFFNESS * float(inside @ inside), gradient

    def around(self, evaluate: EnergyAndGradient) -> EnergyAndGradient:
        """The energy function with the walls added."""

        def walled(x: FloatArray) -> tuple[float, FloatArray]:
            energy, gradient = evaluate(x)
            extra, slope = self.energy_and_gradient(x)
            return energy + extra, gradient + slope

        return walled
