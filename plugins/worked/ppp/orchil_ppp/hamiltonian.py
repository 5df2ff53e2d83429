"""The Pariser-Parr-Pople Hamiltonian, its self-consistent field, and its singlet states of single excitations.

R. Pariser, R. G. Parr, J. Chem. Phys. 21, 466 and 767 (1953); J. A. Pople, Trans. Faraday Soc. 49, 1375 (1953).
Repulsion of two atoms: N. Mataga, K. Nishimoto, Z. Phys. Chem. 13, 140 (1957), or K. Ohno, Theor. Chim. Acta 2, 219
(1964). Energies in eV, lengths in angstrom.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, NotConverged

E2_EV_ANGSTROM = 14.399645
"""Square of the elementary charge over 4 pi epsilon_0 (CODATA 2018)."""
CYCLES = 300
CONVERGED_EV = 1e-8
HISTORY = 8


@dataclass(frozen=True)
class Field:
    """A closed-shell self-consistent field: orbital energies, coefficients (atoms, orbitals), occupied orbitals."""

    energies: FloatArray
    orbitals: FloatArray
    occupied: int
    populations: FloatArray


@dataclass(frozen=True)
class Singlets:
    """k states: energies, amplitudes (k, occupied, virtual) in the window, transition dipoles (k, 3) in e angstrom."""

    energies: FloatArray
    amplitudes: FloatArray
    dipoles: FloatArray
    occupied: FloatArray
    virtual: FloatArray


def mataga_nishimoto(repulsion: FloatArray, distances: FloatArray) -> FloatArray:
    """e^2 / (R + a), with a from the mean of the two one-centre repulsions."""
    mean = (repulsion[:, None] + repulsion[None, :]) / 2
    return E2_EV_ANGSTROM / (distances + E2_EV_ANGSTROM / mean)


def ohno(repulsion: FloatArray, distances: FloatArray) -> FloatArray:
    """e^2 / sqrt(R^2 + a^2), with a from the mean of the two one-centre repulsions."""
    mean = (repulsion[:, None] + repulsion[None, :]) / 2
    return E2_EV_ANGSTROM / np.sqrt(distances**2 + (E2_EV_ANGSTROM / mean) ** 2)


REPULSION: dict[str, Callable[[FloatArray, FloatArray], FloatArray]] = {
    "mataga-nishimoto": mataga_nishimoto,
    "ohno": ohno,
}


def self_consistent_field(
    levels: FloatArray, hopping: FloatArray, repulsion: FloatArray, cores: FloatArray, electrons: int
) -> Field:
    """Closed shell by direct inversion (Pulay 1980); NotConverged after 300 cycles.

    ``levels``: one-centre core energies (minus the ionisation energies); ``hopping``: resonance integrals (n, n);
    ``repulsion``: (n, n); ``cores``: charges of the cores.
    """
    occupied = electrons // 2
    one_electron = hopping + np.diag(levels - repulsion @ cores + np.diag(repulsion) * cores)
    density = _density(one_electron + np.diag(repulsion @ cores), occupied)
    focks: list[FloatArray] = []
    errors: list[FloatArray] = []
    for _ in range(CYCLES):
        fock = one_electron + _repelled(density, repulsion)
        error = fock @ density - density @ fock
        if np.abs(error).max() < CONVERGED_EV:
            energies, orbitals = np.linalg.eigh(fock)
            return Field(energies, orbitals, occupied, np.diag(density))
        focks, errors = [*focks, fock][-HISTORY:], [*errors, error][-HISTORY:]
        density = _density(_extrapolated(focks, errors), occupied)
    raise NotConverged(f"the pi-electron field gave up after {CYCLES} cycles")


def singlets(field: Field, repulsion: FloatArray, positions: FloatArray, window: int) -> Singlets:
    """Single excitations between the ``window`` orbitals on either side of the gap."""
    occupied = field.orbitals[:, max(0, field.occupied - window) : field.occupied]
    virtual = field.orbitals[:, field.occupied : field.occupied + window]
    n, m = occupied.shape[1], virtual.shape[1]
    first = field.energies[max(0, field.occupied - window) : field.occupied]
    second = field.energies[field.occupied : field.occupied + window]
    pairs = np.einsum("pi,pa->iap", occupied, virtual).reshape(n * m, -1)
    holes = np.einsum("pi,pj->ijp", occupied, occupied).reshape(n * n, -1)
    electrons = np.einsum("pa,pb->abp", virtual, virtual).reshape(m * m, -1)
    coulomb = (holes @ repulsion @ electrons.T).reshape(n, n, m, m).transpose(0, 2, 1, 3).reshape(n * m, n * m)
    matrix = 2 * pairs @ repulsion @ pairs.T - coulomb
    matrix[np.diag_indices(n * m)] += (second[None, :] - first[:, None]).ravel()
    energies, vectors = np.linalg.eigh(matrix)
    dipoles = -np.sqrt(2) * vectors.T @ (pairs @ positions)
    return Singlets(energies, vectors.T.reshape(-1, n, m), dipoles, occupied, virtual)


def _repelled(density: FloatArray, repulsion: FloatArray) -> FloatArray:
    """Coulomb minus exchange; density counts both spins."""
    result: FloatArray = np.diag(repulsion @ np.diag(density)) - 0.5 * density * repulsion
    return result


def _density(fock: FloatArray, occupied: int) -> FloatArray:
    filled = np.linalg.eigh(fock)[1][:, :occupied]
    result: FloatArray = 2 * filled @ filled.T
    return result


def _extrapolated(focks: list[FloatArray], errors: list[FloatArray]) -> FloatArray:
    size = len(focks)
    matrix = -np.ones((size + 1, size + 1))
    matrix[size, size] = 0
    matrix[:size, :size] = [[np.vdot(a, b) for b in errors] for a in errors]
    right = np.zeros(size + 1)
    right[size] = -1
    weights = np.linalg.lstsq(matrix, right, rcond=None)[0][:size]
    return np.tensordot(weights, np.array(focks), axes=1)
