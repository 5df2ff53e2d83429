"""What a ground-state engine gives: energies with gradients, and the converged orbitals."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

from orchil_schemas import FloatArray, IntArray

KELVIN_HARTREE = 3.166811563e-6
"""Boltzmann constant in hartree/kelvin (CODATA 2018)."""


@dataclass(frozen=True)
class Evaluation:
    """Energy (hartree) and its gradient (hartree/bohr, shape (atoms, 3)) at one geometry."""

    energy: float
    gradient: FloatArray


@dataclass(frozen=True)
class Wavefunction:
    """Converged GFN2-xTB orbitals at one geometry.

    ``coefficients`` has shape (basis functions, orbitals) with the basis functions atom by atom, shell by
    shell in the order of libcint (p: x, y, z; d: xy, yz, z2, xz, x2-y2). Energies in hartree, occupations 0
    to 2, atomic charges in e, dipole in e bohr.
    """

    energies: FloatArray
    occupations: FloatArray
    coefficients: FloatArray
    charges: FloatArray
    dipole: FloatArray


class GroundState(Protocol):
    """A GFN2-xTB calculator bound to one species and one medium; restarts from its last density."""

    engine: str

    def evaluate(self, positions_bohr: FloatArray) -> Evaluation:
        """Energy and gradient; raises NotConverged when the self-consistent field fails."""
        ...

    def wavefunction(self) -> Wavefunction:
        """Orbitals at the geometry of the last evaluation."""
        ...


@dataclass(frozen=True)
class Request:
    """What a calculator is made for: species, medium (None: gas phase) and how the field is to be converged."""

    numbers: IntArray
    charge: int
    solvation: str | None
    accuracy: float
    temperature_kelvin: float
    max_iterations: int
