"""Change of the dipole moment and movement of the electron on excitation, from hole and particle
densities.
"""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray

from .window import Window


def hole_and_particle(amplitudes: FloatArray) -> tuple[FloatArray, FloatArray]:
    """One-particle density matrices of hole (n, o, o) and particle (n, v, v), each of trace 1."""
    hole = np.einsum("nia,nja->nij", amplitudes, amplitudes)
    particle = np.einsum("nia,nib->nab", amplitudes, amplitudes)
    return hole, particle


def centroid_shift(amplitudes: FloatArray, window: Window) -> FloatArray:
    """Vector from hole centroid to electron centroid in bohr, shape (n, 3)."""
    hole, particle = hole_and_particle(amplitudes)
    o = window.occupied
    electron = np.einsum("nab,xab->nx", particle, window.dipole[:, o:, o:])
    missing = np.einsum("nij,xij->nx", hole, window.dipole[:, :o, :o])
    shift: FloatArray = electron - missing
    return shift


def dipole_change(amplitudes: FloatArray, window: Window) -> FloatArray:
    """Change of the dipole moment in e bohr, shape (n, 3); unrelaxed: the electron carries charge -1."""
    change: FloatArray = -centroid_shift(amplitudes, window)
    return change
