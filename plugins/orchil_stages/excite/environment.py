"""The surroundings of each atom as smooth functions of the geometry: neighbours by distance, and their directions."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray, IntArray

from orchil_stages.ground_state import BOHR_ANGSTROM

# Covalent radii in angstrom: Pyykko, Atsumi, Chem. Eur. J. 15, 186 (2009), metals apart
_RADII = {
    1: 0.32, 3: 1.33, 5: 0.85, 6: 0.75, 7: 0.71, 8: 0.63, 9: 0.64, 11: 1.55, 12: 1.39, 13: 1.26,
    14: 1.16, 15: 1.11, 16: 1.03, 17: 0.99, 19: 1.96, 32: 1.21, 33: 1.21, 34: 1.16, 35: 1.14,
    50: 1.40, 52: 1.36, 53: 1.33,
}  # fmt: skip


def coordination_numbers(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """Fractional coordination number of each atom (positions in bohr).

    Counting function of the D3 dispersion model: Grimme, Antony, Ehrlich, Krieg, J. Chem. Phys. 132, 154104 (2010).
    """
    counts: FloatArray = bond_counts(numbers, positions).sum(axis=1)
    return counts


def bonded(numbers: IntArray, positions: FloatArray) -> NDArray[np.bool_]:
    """Which atoms are bonded (positions in bohr): counted by more than a half, shape (atoms, atoms)."""
    return bond_counts(numbers, positions) > 0.5


def bond_counts(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """How far each pair of atoms (positions in bohr) counts as bonded, 0 to 1, shape (atoms, atoms)."""
    radii = np.array([_RADII[int(n)] for n in numbers]) / BOHR_ANGSTROM
    distance = distances(positions)
    np.fill_diagonal(distance, np.inf)
    bond = 4.0 / 3.0 * (radii[:, None] + radii[None, :])
    counts: FloatArray = 1.0 / (1.0 + np.exp(-16.0 * (bond / distance - 1.0)))
    return counts


def distances(positions: FloatArray) -> FloatArray:
    """Matrix of distances between atoms, same unit as the positions."""
    steps = positions[:, None, :] - positions[None, :, :]
    matrix: FloatArray = np.sqrt((steps**2).sum(axis=2))
    return matrix


def bond_directions(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """Sum over the neighbours of the projector on the bond, shape (atoms, 3, 3).

    For an atom in a plane it is zero along the normal, so that it tells p functions of pi bonds from lone pairs and
    sigma bonds without any choice of axes.
    """
    counts = bond_counts(numbers, positions)
    steps = positions[:, None, :] - positions[None, :, :]
    length = np.sqrt((steps**2).sum(axis=2))
    np.fill_diagonal(length, 1.0)
    unit = steps / length[:, :, None]
    tensors: FloatArray = np.einsum("ab,abx,aby->axy", counts, unit, unit)
    return tensors


def neighbour_directions(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """The same for the bonds of the neighbours, which gives terminal atoms a plane, shape (atoms, 3, 3)."""
    counts = bond_counts(numbers, positions)
    tensors: FloatArray = np.einsum("ab,bxy->axy", counts, bond_directions(numbers, positions))
    return tensors
