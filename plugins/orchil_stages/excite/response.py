"""The response Hamiltonian: configuration interaction of single excitations in the window, singlets.

A(ia,jb) = d_ij F_ab - d_ab F_ij + d_ij d_ab c + 2 K(ia|jb) - J(ij|ab) in the spirit of the simplified
Tamm-Dancoff approach (Grimme, J. Chem. Phys. 138, 244104, 2013): K and J act between Loewdin transition
charges.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
from orchil_schemas import FloatArray, NotConverged

from .environment import distances
from .kernels import coulomb_kernel, exchange_kernel
from .levels import LevelFeatures, corrected_levels, level_features
from .parameters import Parameters
from .window import Window


@dataclass(frozen=True)
class ChargeBlocks:
    """Loewdin charges by atom: occupied (atoms, o, o), virtual (atoms, v, v), transition (atoms, o, v)."""

    occupied: FloatArray
    virtual: FloatArray
    transition: FloatArray


@dataclass(frozen=True)
class States:
    """Energies (n,) eV ascending, amplitudes (n, o, v) normalised to 1, transition dipoles (n, 3) e bohr."""

    energies: FloatArray
    amplitudes: FloatArray
    dipoles: FloatArray

    @property
    def strengths(self) -> FloatArray:
        """Oscillator strengths f = 2/3 E |mu|^2 in atomic units (length gauge)."""
        from orchil_stages.ground_state import HARTREE_EV

        f: FloatArray = 2.0 / 3.0 * self.energies / HARTREE_EV * (self.dipoles**2).sum(axis=1)
        return f


def charge_blocks(window: Window) -> ChargeBlocks:
    """Transition charges of all orbital pairs of the window."""
    atoms = len(window.numbers)
    starts = np.flatnonzero(np.diff(window.where.atom, prepend=-1))
    pairs = window.loewdin[:, :, None] * window.loewdin[:, None, :]
    charges = np.add.reduceat(pairs, starts, axis=0)
    assert len(charges) == atoms
    o = window.occupied
    return ChargeBlocks(charges[:, :o, :o], charges[:, o:, o:], charges[:, :o, o:])


@dataclass(frozen=True)
class Prepared:
    """What does not depend on the trained numbers, so that training computes it once."""

    window: Window
    blocks: ChargeBlocks
    features: LevelFeatures
    distance: FloatArray


def prepare(window: Window) -> Prepared:
    """Charges, level features and distances of a window."""
    return Prepared(window, charge_blocks(window), level_features(window), distances(window.positions))


def hamiltonian(prepared: Prepared, parameters: Parameters) -> FloatArray:
    """The matrix A in eV, shape (o v, o v), symmetric."""
    window, blocks = prepared.window, prepared.blocks
    o, v = window.occupied, window.virtual
    levels = corrected_levels(window, prepared.features, parameters)
    coulomb = coulomb_kernel(window.numbers, prepared.distance, parameters)
    exchange = exchange_kernel(window.numbers, prepared.distance, parameters)
    return assemble(levels.occupied, levels.virtual, blocks, coulomb, 2.0 * exchange) + parameters["constant"] * np.eye(
        o * v
    )


def assemble(
    occupied: FloatArray, virtual: FloatArray, blocks: ChargeBlocks, coulomb: FloatArray, exchange: FloatArray
) -> FloatArray:
    """A from one-electron matrices, charges and atom-atom kernels (``exchange`` already times its spin
    factor).
    """
    o, v, atoms = len(occupied), len(virtual), len(coulomb)
    screened = coulomb @ blocks.virtual.reshape(atoms, v * v)
    attraction = blocks.occupied.reshape(atoms, o * o).T @ screened
    matrix = -attraction.reshape(o, o, v, v).transpose(0, 2, 1, 3)
    transition = blocks.transition.reshape(atoms, o * v)
    matrix = matrix.reshape(o * v, o * v) + transition.T @ (exchange @ transition)
    full = matrix.reshape(o, v, o, v)
    diagonal = np.arange(o)
    full[diagonal, :, diagonal, :] += virtual
    across = np.arange(v)
    full[:, across, :, across] -= occupied
    return matrix


def solve(matrix: FloatArray, window: Window, states: int) -> States:
    """Lowest states of A; NotConverged when the eigenvalue search fails."""
    count = min(states, len(matrix))
    try:
        energies, vectors = scipy.linalg.eigh(matrix, subset_by_index=(0, count - 1), driver="evr", check_finite=False)
    except np.linalg.LinAlgError as error:
        raise NotConverged(f"eigenvalues of the response Hamiltonian: {error}") from None
    amplitudes = np.ascontiguousarray(vectors.T).reshape(count, window.occupied, window.virtual)
    return States(energies, amplitudes, transition_dipoles(amplitudes, window))


def transition_dipoles(amplitudes: FloatArray, window: Window) -> FloatArray:
    """sqrt(2) sum v_ia <i|r|a> in e bohr (the sign of the electron's charge left out), shape (n, 3)."""
    o = window.occupied
    dipoles: FloatArray = np.sqrt(2.0) * np.einsum("nia,xia->nx", amplitudes, window.dipole[:, :o, o:])
    return dipoles
