"""Medium terms added to each state to first order: what the implicit solvent of the ground state leaves out.

The reaction field of the ground state is already in the orbital energies. The three terms here are scaled by
trained numbers: linear response of the fast polarisation to the transition dipole; the same field acting on
the change of dipole (Lippert, Z. Naturforsch. A 10, 541, 1955; Mataga, Kaifu, Koizumi, Bull. Chem. Soc. Jpn.
29, 465, 1956); and the general red shift by the polarisability of the medium (Bayliss, J. Chem. Phys. 18,
292, 1950).
"""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, IntArray, Medium

from orchil_stages.optics.units import BOHR_ANGSTROM, HARTREE_EV

SOLVENT_NAMES = ("solvent_transition", "solvent_dipole", "solvent_polarisability")

_VOLUME_PER_ATOM = 15.0 / BOHR_ANGSTROM**3
"""Cavity volume per heavy atom in bohr^3: 15 cubic angstrom, about the molar volume of organic crystals."""


def medium_features(
    medium: Medium, numbers: IntArray, transition: FloatArray, ground: FloatArray, change: FloatArray
) -> FloatArray:
    """Terms in eV that the trained solvent numbers multiply, shape (states, 3).

    transition (n, 3), ground (3,) and change (n, 3) are the transition dipoles, the ground-state dipole and
    the change of dipole in e bohr.
    """
    cubed = 3.0 / (4.0 * np.pi) * _VOLUME_PER_ATOM * max(int(np.count_nonzero(numbers > 1)), 1)
    fast, total = _onsager(medium.refractive_index**2), _onsager(medium.dielectric_constant)
    field = HARTREE_EV / cubed
    return np.stack(
        [
            -2.0 * fast * field * (transition**2).sum(axis=1),
            -2.0 * max(total - fast, 0.0) * field * (change @ ground),
            np.full(len(transition), -fast),
        ],
        axis=1,
    )


def _onsager(permittivity: float) -> float:
    """(e - 1) / (2 e + 1) of Onsager's reaction field."""
    return (permittivity - 1.0) / (2.0 * permittivity + 1.0)
