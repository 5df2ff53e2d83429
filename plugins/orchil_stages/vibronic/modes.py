"""Normal modes of a relaxed geometry: Hessian by central differences of gradients, translations and rotations out."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray

from orchil_stages.optics.units import AVOGADRO_PER_MOL, ELECTRON_MASS_KG, HARTREE_EV, HC_EV_CM

STEP_BOHR = 0.01
ELECTRON_MASSES = 1e-3 / (AVOGADRO_PER_MOL * ELECTRON_MASS_KG)
"""One g/mol in electron masses, 1822.89."""


@dataclass(frozen=True)
class Modes:
    """Wavenumbers (modes,), imaginary ones as negative numbers, and the path along each: bohr for one unit of the
    dimensionless coordinate (modes, atoms, 3).
    """

    wavenumber_cm1: FloatArray
    path_bohr: FloatArray


def normal_modes(gradient: Callable[[FloatArray], FloatArray], positions: FloatArray, masses: FloatArray) -> Modes:
    """Modes of a minimum; ``gradient`` takes and gives (atoms, 3) in hartree and bohr, ``masses`` in g/mol."""
    return modes_of_hessian(hessian(gradient, positions), positions, masses)


def hessian(gradient: Callable[[FloatArray], FloatArray], positions: FloatArray) -> FloatArray:
    """Symmetrised second derivatives (3 atoms, 3 atoms), hartree/bohr^2."""
    rows = []
    for at in range(positions.size):
        step = np.zeros(positions.size)
        step[at] = STEP_BOHR
        moved = step.reshape(positions.shape)
        rows.append((gradient(positions + moved) - gradient(positions - moved)).ravel() / (2 * STEP_BOHR))
    whole = np.array(rows)
    return np.asarray((whole + whole.T) / 2)


def modes_of_hessian(second: FloatArray, positions: FloatArray, masses: FloatArray) -> Modes:
    """Vibrations of a Hessian with translations and rotations projected out."""
    root = np.sqrt(np.repeat(masses * ELECTRON_MASSES, 3))
    inside = _vibrations(positions, root)
    squares, vectors = np.linalg.eigh(inside.T @ (second / np.outer(root, root)) @ inside)
    omega = np.sign(squares) * np.sqrt(np.abs(squares))
    cartesian = (inside @ vectors / root[:, None]).T
    safe = np.maximum(np.abs(omega), 1e-6)
    path = (cartesian / np.sqrt(safe)[:, None]).reshape(-1, *positions.shape)
    return Modes(omega * HARTREE_EV / HC_EV_CM, path)


def _vibrations(positions: FloatArray, root: FloatArray) -> FloatArray:
    """Orthonormal basis (3 atoms, modes) of the mass-weighted space without translations and rotations."""
    weights = root[::3, None] ** 2
    centred = positions - (weights * positions).sum(axis=0) / weights.sum()
    shifts = [np.tile(axis, (len(positions), 1)) for axis in np.eye(3)]
    turns = [np.cross(axis, centred) for axis in np.eye(3)]
    outside = np.array([motion.ravel() * root for motion in (*shifts, *turns)]).T
    left, sizes, _ = np.linalg.svd(outside, full_matrices=True)
    return np.asarray(left[:, int((sizes > 1e-6 * sizes[0]).sum()) :])
