"""What a state is: where hole and electron sit, along which axis it absorbs, which orbitals it is made of."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray

from .dipoles import hole_and_particle
from .environment import bonded
from .response import States
from .window import Window


@dataclass(frozen=True)
class Populations:
    """Share of hole and electron on each atom, both (states, atoms) with rows summing to 1."""

    hole: FloatArray
    electron: FloatArray

    @property
    def transferred(self) -> FloatArray:
        """Share of an electron that changes its atom: half the sum of |electron - hole| over atoms."""
        share: FloatArray = 0.5 * np.abs(self.electron - self.hole).sum(axis=1)
        return share

    @property
    def overlap(self) -> FloatArray:
        """Bhattacharyya overlap of the two distributions, 0 to 1."""
        shared: FloatArray = np.sqrt(np.clip(self.hole * self.electron, 0.0, None)).sum(axis=1)
        return np.minimum(shared, 1.0)


def populations(states: States, window: Window) -> Populations:
    """Loewdin populations of hole and electron by atom."""
    hole, particle = hole_and_particle(states.amplitudes)
    o = window.occupied
    return Populations(_by_atom(window.loewdin[:, :o], hole, window), _by_atom(window.loewdin[:, o:], particle, window))


def _by_atom(c: FloatArray, density: FloatArray, window: Window) -> FloatArray:
    """Diagonal of the density of some orbitals, summed by atom, (states, atoms)."""
    starts = np.flatnonzero(np.diff(window.where.atom, prepend=-1))
    summed: FloatArray = np.add.reduceat(((c @ density) * c).sum(axis=2), starts, axis=1)
    return summed


def _densities(states: States, window: Window) -> tuple[FloatArray, FloatArray]:
    """Hole and electron density matrices in the Loewdin basis, (states, functions, functions)."""
    o = window.occupied
    hole, particle = hole_and_particle(states.amplitudes)
    c_occ, c_virt = window.loewdin[:, :o], window.loewdin[:, o:]
    return c_occ @ hole @ c_occ.T, c_virt @ particle @ c_virt.T


def pi_share(states: States, window: Window) -> FloatArray:
    """Share of hole and electron in p functions along the normal of the local bonding plane, (states,)."""
    normals = bonding_normals(window.numbers, window.positions)
    starts = np.flatnonzero((window.where.momentum == 1) & (np.diff(window.where.shell, prepend=-1) != 0))
    functions = starts[:, None] + np.arange(3)
    along = normals[window.where.atom[starts]]
    shares = np.zeros(len(states.energies))
    for density in _densities(states, window):
        blocks = density[:, functions[:, :, None], functions[:, None, :]]
        shares += 0.5 * np.einsum("ax,naxy,ay->n", along, blocks, along)
    return np.clip(shares, 0.0, 1.0)


def bonding_normals(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """Unit normal of the plane through each atom and its neighbours, (atoms, 3).

    An atom with one neighbour takes the normal of that neighbour.
    """
    neighbours = bonded(numbers, positions)
    normals = np.zeros((len(numbers), 3))
    counts = neighbours.sum(axis=1)
    for atom in np.flatnonzero(counts >= 2):
        normals[atom] = _normal(positions[neighbours[atom]] - positions[atom])
    for atom in np.flatnonzero(counts == 1):
        normals[atom] = normals[np.argmax(neighbours[atom])]
    lonely = np.linalg.norm(normals, axis=1) < 0.5
    normals[lonely] = (0.0, 0.0, 1.0)
    return normals


def _normal(bonds: FloatArray) -> FloatArray:
    # two bonds alone span the plane; the smallest right singular vector serves any number of them
    _, _, rows = np.linalg.svd(np.vstack([bonds, np.zeros((1, 3))]))
    normal: FloatArray = rows[-1]
    return normal


def long_axis(masses: FloatArray, positions: FloatArray) -> FloatArray:
    """Unit vector along the axis of least moment of inertia, (3,)."""
    centred = positions - masses @ positions / masses.sum()
    spread = (centred * masses[:, None]).T @ centred
    axis: FloatArray = np.linalg.eigh(spread)[1][:, -1]
    return axis


def angle_to_axis(vectors: FloatArray, axis: FloatArray) -> FloatArray:
    """Angle between each vector (n, 3) and an axis (3,), 0 to 90 degrees; 90 for a vector of no length."""
    length = np.linalg.norm(vectors, axis=1)
    cosine = np.abs(vectors @ axis) / np.where(length > 1e-12, length, np.inf)
    return np.degrees(np.arccos(np.clip(cosine, 0.0, 1.0)))


def fixed_sign(vectors: FloatArray) -> FloatArray:
    """The vectors with their largest component positive: the sign of a transition dipole has no meaning."""
    largest = np.take_along_axis(vectors, np.abs(vectors).argmax(axis=1)[:, None], axis=1)
    return np.where(largest < 0, -vectors, vectors)


@dataclass(frozen=True)
class Leading:
    """Orbital pair of the largest weight by state: 0 is the HOMO and the LUMO, counted away from the gap."""

    start: IntArray
    end: IntArray
    weight: FloatArray


def leading_pairs(states: States) -> Leading:
    """The leading orbital pair of each state."""
    weights = states.amplitudes**2
    count, occupied, virtual = weights.shape
    place = weights.reshape(count, -1).argmax(axis=1)
    start, end = np.divmod(place, virtual)
    return Leading(occupied - 1 - start, end, weights.reshape(count, -1).max(axis=1))
