"""How orbitals and states of the window transform under the operations of a molecule.

A Loewdin function moves with its atom and turns with the operation: symmetric orthogonalisation keeps the behaviour of
the atomic functions (Loewdin, J. Chem. Phys. 18, 365, 1950).
"""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, IntArray

from orchil_stages.excite.response import States
from orchil_stages.excite.window import Window
from orchil_stages.ground_state.basis import BasisMap

from .irreps import Irreps
from .operations import Operation, SymmetryGroup

_HALF = 1.0 / np.sqrt(2.0)
_D_TENSORS = np.array(
    [
        [[0, _HALF, 0], [_HALF, 0, 0], [0, 0, 0]],
        [[0, 0, 0], [0, 0, _HALF], [0, _HALF, 0]],
        [[-1 / np.sqrt(6), 0, 0], [0, -1 / np.sqrt(6), 0], [0, 0, 2 / np.sqrt(6)]],
        [[0, 0, _HALF], [0, 0, 0], [_HALF, 0, 0]],
        [[_HALF, 0, 0], [0, -_HALF, 0], [0, 0, 0]],
    ]
)
"""d functions xy, yz, z2, xz, x2-y2 as normalised quadratic forms."""


def turned(operation: Operation, coefficients: FloatArray, where: BasisMap) -> FloatArray:
    """Orbitals after an operation, (functions, orbitals)."""
    moved = np.empty_like(coefficients)
    blocks = (np.eye(1), operation.matrix, _d_matrix(operation.matrix))
    starts = np.flatnonzero(np.diff(where.shell, prepend=-1))
    images = _image_starts(starts, where, operation.images)
    for momentum, block in enumerate(blocks):
        chosen = where.momentum[starts] == momentum
        steps = np.arange(2 * momentum + 1)
        moved[images[chosen][:, None] + steps] = block @ coefficients[starts[chosen][:, None] + steps]
    return moved


def _image_starts(starts: IntArray, where: BasisMap, images: IntArray) -> IntArray:
    """First function of the image of each shell: shells keep their order within an atom."""
    atom = where.atom[starts]
    first = np.searchsorted(atom, np.arange(len(images)))
    places: IntArray = starts[first[images[atom]] + np.arange(len(starts)) - first[atom]]
    return places


def _d_matrix(matrix: FloatArray) -> FloatArray:
    rotated = matrix @ _D_TENSORS @ matrix.T
    found: FloatArray = np.einsum("lxy,kxy->lk", _D_TENSORS, rotated)
    return found


def orbital_matrices(group: SymmetryGroup, window: Window) -> tuple[FloatArray, FloatArray]:
    """<i|g|j> of the occupied (operations, o, o) and <a|g|b> of the virtual orbitals (operations, v, v)."""
    o = window.occupied
    c = window.loewdin
    moved = [turned(operation, c, window.where) for operation in group.operations]
    occupied = np.array([c[:, :o].T @ found[:, :o] for found in moved])
    virtual = np.array([c[:, o:].T @ found[:, o:] for found in moved])
    return occupied, virtual


def state_shares(states: States, matrices: tuple[FloatArray, FloatArray], found: Irreps) -> FloatArray:
    """Share of each irreducible representation in each state, (states, irreps), rows summing to 1."""
    occupied, virtual = matrices
    v = states.amplitudes
    half = np.einsum("gij,njb->ngib", occupied, v, optimize=True)
    moved = np.einsum("ngib,gab->ngia", half, virtual, optimize=True)
    return _shares(np.einsum("nia,ngia->ng", v, moved, optimize=True), found)


def vector_shares(vectors: FloatArray, matrices: FloatArray, found: Irreps) -> FloatArray:
    """The same for orbitals given as combinations of those of the window, vectors (n, orbitals)."""
    return _shares(np.einsum("ni,gij,nj->ng", vectors, matrices, vectors, optimize=True), found)


def _shares(elements: FloatArray, found: Irreps) -> FloatArray:
    """From <n|g|n> (n, operations) to shares."""
    shares = np.clip(elements @ found.projectors.T, 0.0, None)
    total: FloatArray = shares / np.maximum(shares.sum(axis=1, keepdims=True), 1e-12)
    return total
