"""The active window: orbitals around the gap in the Loewdin basis, with all that the response Hamiltonian
needs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import BadResult, FloatArray, IntArray

from orchil_stages.ground_state import HARTREE_EV, Wavefunction
from orchil_stages.ground_state.basis import BasisMap, Integrals, basis_map, shells

OVERLAP_TOLERANCE = 1e-5
DIPOLE_TOLERANCE = 1e-3
"""e bohr. The engine converges its own dipole to about 1e-5."""

HOPPING_CLASSES: tuple[tuple[int, int], ...] = (
    (6, 6),
    (6, 7),
    (6, 8),
    (6, 16),
    (7, 7),
    (5, 7),
    (5, 6),
    (7, 8),
    (8, 16),
    (7, 16),
)
"""Element pairs whose p-p couplings are scaled; see :mod:`.levels`."""


@dataclass(frozen=True)
class Window:
    """``occupied`` + ``virtual`` orbitals (m in all) around the gap of one species at one geometry.

    energies: (m,) eV; loewdin: (functions, m) symmetrically orthogonalised coefficients; hopping: (classes,
    m, m) one-electron matrix elements of the p-p couplings between atoms, by element pair, eV; dipole: (3, m,
    m) position integrals, bohr; numbers, positions (bohr) and charges (e) by atom; where: the basis map.
    """

    occupied: int
    energies: FloatArray
    loewdin: FloatArray
    hopping: FloatArray
    dipole: FloatArray
    numbers: IntArray
    positions: FloatArray
    charges: FloatArray
    where: BasisMap

    @property
    def virtual(self) -> int:
        """Number of virtual orbitals in the window."""
        return len(self.energies) - self.occupied


@dataclass(frozen=True)
class Assertions:
    """What the run-time assertions found: largest error of C^T S C = 1 and of the dipole (e bohr)."""

    overlap_error: float
    dipole_error: float


def check_integrals(numbers: IntArray, positions: FloatArray, wave: Wavefunction, ints: Integrals) -> Assertions:
    """Assert that the rebuilt basis is the engine's: orthonormal orbitals and the same dipole (BadResult if
    not).
    """
    c = wave.coefficients
    if c.shape[0] != ints.overlap.shape[0]:
        raise BadResult(f"{c.shape[0]} orbitals from the engine, {ints.overlap.shape[0]} basis functions rebuilt")
    overlap_error = float(np.abs(c.T @ ints.overlap @ c - np.eye(c.shape[1])).max())
    dipole_error = float(np.abs(molecular_dipole(numbers, positions, wave, ints) - wave.dipole).max())
    if overlap_error > OVERLAP_TOLERANCE:
        raise BadResult(f"orbitals are not orthonormal in the rebuilt basis (largest error {overlap_error:.1e})")
    if dipole_error > DIPOLE_TOLERANCE:
        raise BadResult(f"the rebuilt dipole differs by {dipole_error:.1e} e bohr from that of GFN2-xTB")
    return Assertions(overlap_error, dipole_error)


def molecular_dipole(numbers: IntArray, positions: FloatArray, wave: Wavefunction, ints: Integrals) -> FloatArray:
    """Dipole (e bohr) from the density in the rebuilt basis and the valence charges of the nuclei."""
    density = (wave.coefficients * wave.occupations) @ wave.coefficients.T
    electronic = -np.einsum("xij,ij->x", ints.position, density)
    dipole: FloatArray = electronic + valence_charges(numbers) @ positions
    return dipole


def valence_charges(numbers: IntArray) -> FloatArray:
    """Charges of the atomic cores: atomic number minus the electrons GFN2-xTB leaves in the core."""
    return np.array([float(n - _core_electrons(int(n))) for n in numbers])


def _core_electrons(number: int) -> int:
    # main-group elements only: a filled d shell below a p block belongs to the core
    if number > 48:
        return 46
    if number > 36:
        return 36
    if number > 30:
        return 28
    if number > 18:
        return 18
    if number > 10:
        return 10
    return 2 if number > 2 else 0


def open_window(
    numbers: IntArray,
    positions: FloatArray,
    wave: Wavefunction,
    ints: Integrals,
    *,
    occupied: int,
    virtual: int,
) -> Window:
    """Cut the window out of a converged wavefunction; smaller where the molecule has fewer orbitals."""
    filled = int(np.count_nonzero(wave.occupations > 1.0))
    low, high = max(0, filled - occupied), min(len(wave.energies), filled + virtual)
    if filled in (low, high):
        raise BadResult("no occupied or no virtual orbitals: nothing can be excited")
    half = _half_overlap(ints.overlap)
    orthogonal = half @ wave.coefficients
    where = basis_map(numbers)
    loewdin = np.ascontiguousarray(orthogonal[:, low:high])
    fock = (orthogonal * (wave.energies * HARTREE_EV)) @ orthogonal.T
    c = wave.coefficients[:, low:high]
    return Window(
        occupied=filled - low,
        energies=wave.energies[low:high] * HARTREE_EV,
        loewdin=loewdin,
        hopping=_hopping(numbers, where, fock, loewdin),
        dipole=np.einsum("pm,xpq,qn->xmn", c, ints.position, c, optimize=True),
        numbers=np.asarray(numbers),
        positions=np.asarray(positions),
        charges=wave.charges,
        where=where,
    )


def _half_overlap(overlap: FloatArray) -> FloatArray:
    values, vectors = np.linalg.eigh(overlap)
    half: FloatArray = (vectors * np.sqrt(values)) @ vectors.T
    return half


def _hopping(numbers: IntArray, where: BasisMap, fock: FloatArray, loewdin: FloatArray) -> FloatArray:
    """Window matrix elements of the p-p blocks of the Fock matrix between different atoms, by element
    pair.
    """
    p_type = where.momentum == 1
    element = np.where(p_type, numbers[where.atom], 0)
    blocks = []
    for one, other in HOPPING_CLASSES:
        rows, columns = np.flatnonzero(element == one), np.flatnonzero(element == other)
        coupling = np.where(where.atom[rows][:, None] == where.atom[columns], 0.0, fock[np.ix_(rows, columns)])
        half = loewdin[rows].T @ coupling @ loewdin[columns]
        blocks.append(half if one == other else half + half.T)
    return np.array(blocks)


def hardness(numbers: IntArray) -> FloatArray:
    """Chemical hardness of each atom (hartree), the value of GFN2-xTB."""
    return np.array([shells(int(n))[0].hardness for n in numbers])
