"""Force-constant matrix in internal coordinates: a diagonal model plus BFGS updates kept as vectors."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray

RIDGE = 1e-6
"""hartree/bohr^2 on every Cartesian diagonal; soft torsions of large groups are only ten times stiffer."""
POWELL = 0.2
"""Least share of the expected curvature an update may have (Powell's damping)."""


class Curvature:
    """K = diag(model) + sum of p p^T - sum of m m^T, positive definite throughout."""

    def __init__(self, model: FloatArray) -> None:
        self.model = model
        self._plus: list[FloatArray] = []
        self._minus: list[FloatArray] = []

    def times(self, vector: FloatArray) -> FloatArray:
        """K times a vector of internal coordinates."""
        made = self.model * vector
        for p, m in zip(self._plus, self._minus, strict=True):
            made += p * (p @ vector) - m * (m @ vector)
        return np.asarray(made)

    def update(self, step: FloatArray, change: FloatArray) -> None:
        """Learn that ``step`` changed the internal gradient by ``change`` (BFGS)."""
        image = self.times(step)
        expected, measured = float(step @ image), float(step @ change)
        if expected < 1e-14:
            return
        if measured < POWELL * expected:
            mix = (1 - POWELL) * expected / (expected - measured)
            change = mix * change + (1 - mix) * image
            measured = float(step @ change)
        self._plus.append(change / np.sqrt(measured))
        self._minus.append(image / np.sqrt(expected))

    def add_updates(self, model: FloatArray, rows: FloatArray) -> FloatArray:
        """The Cartesian model Hessian plus the updates, brought over by the B matrix ``rows``."""
        if not self._plus:
            return model.copy()
        plus, minus = np.array(self._plus) @ rows, np.array(self._minus) @ rows
        return np.asarray(model + plus.T @ plus - minus.T @ minus)


def cartesian_model(model: FloatArray, rows: FloatArray, x: FloatArray) -> FloatArray:
    """B^T K B of the diagonal model, with unit constants for translations and rotations and the ridge."""
    scaled = np.vstack([np.sqrt(model)[:, None] * rows, _rigid_moves(x)])
    made = scaled.T @ scaled
    made[np.diag_indices_from(made)] += RIDGE
    return np.asarray(made)


def _rigid_moves(x: FloatArray) -> FloatArray:
    """Orthonormal translations and rotations at positions ``x`` (atoms, 3), shape (6, 3 atoms)."""
    centred = x - x.mean(axis=0)
    moves = np.empty((6, *x.shape))
    moves[:3] = np.eye(3)[:, None, :]
    moves[3:] = np.cross(np.eye(3)[:, None, :], centred[None])
    basis, _ = np.linalg.qr(moves.reshape(6, -1).T)
    return np.asarray(basis.T)
