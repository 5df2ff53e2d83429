"""Shift of a band with the polarity of the medium.

Sources: Lippert, Z. Elektrochem. 61, 962 (1957); Mataga, Kaifu, Koizumi, Bull. Chem. Soc. Jpn. 29, 465
(1956); ET(30): Reichardt, Chem. Rev. 94, 2319 (1994).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import FloatArray

from .units import AVOGADRO_PER_MOL, COULOMB_J_M, DEBYE_C_M, LIGHT_M_S, PLANCK_J_S

ET30_KCAL_NM = PLANCK_J_S * LIGHT_M_S * 1e9 * AVOGADRO_PER_MOL / 4184
"""ET(30) (kcal/mol) times wavelength (nm) of betaine-30, 28591."""


def orientation_polarisability(dielectric_constant: ArrayLike, refractive_index: ArrayLike) -> FloatArray:
    """Delta f = (eps - 1)/(2 eps + 1) - (n^2 - 1)/(2 n^2 + 1); may be negative in non-polar solvents."""
    n2 = np.asarray(refractive_index, dtype=float) ** 2
    eps = np.asarray(dielectric_constant, dtype=float)
    return np.asarray((eps - 1) / (2 * eps + 1) - (n2 - 1) / (2 * n2 + 1))


def lippert_mataga_slope(dipole_change_debye: ArrayLike, radius_angstrom: ArrayLike) -> FloatArray:
    """Slope (cm^-1) of the Stokes shift against Delta f, 2 (change of dipole)^2/(h c a^3)."""
    change = np.asarray(dipole_change_debye, dtype=float) * DEBYE_C_M
    radius_m = np.asarray(radius_angstrom, dtype=float) * 1e-10
    return 2 * COULOMB_J_M * change**2 / (PLANCK_J_S * LIGHT_M_S * radius_m**3) / 100


def et30(betaine_max_nm: ArrayLike) -> FloatArray:
    """ET(30) (kcal/mol) of the absorption maximum (nm) of betaine-30 in a medium."""
    return np.asarray(ET30_KCAL_NM / np.asarray(betaine_max_nm, dtype=float))


def et_normalised(et30_kcal_mol: ArrayLike) -> FloatArray:
    """ETN = (ET(30) - 30.7)/32.4: 0 for tetramethylsilane, 1 for water."""
    return (np.asarray(et30_kcal_mol, dtype=float) - 30.7) / 32.4
