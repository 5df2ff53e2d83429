"""Shift of a band with the polarity of the medium.

Sources: Lippert, Z. Elektrochem. 61, 962 (1957); Mataga, Kaifu, Koizumi, Bull. Chem. Soc. Jpn. 29, 465
(1956); McRae, J. Phys. Chem. 61, 562 (1957); Ravi, Soujanya, Samanta, Radhakrishnan, J. Chem. Soc. Faraday Trans. 91,
2739 (1995); ET(30): Reichardt, Chem. Rev. 94, 2319 (1994). Dipoles are vectors on the last axis, in debye.
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


def absorption_slope(ground_debye: ArrayLike, change_debye: ArrayLike, radius_angstrom: ArrayLike) -> FloatArray:
    """Slope (cm^-1) of the absorption maximum against Delta f, -2 mu_g.(mu_e - mu_g)/(h c a^3)."""
    return -2 * _coupling(ground_debye, change_debye, radius_angstrom)


def emission_slope(ground_debye: ArrayLike, change_debye: ArrayLike, radius_angstrom: ArrayLike) -> FloatArray:
    """Slope (cm^-1) of the emission maximum against Delta f, -2 mu_e.(mu_e - mu_g)/(h c a^3)."""
    excited = np.asarray(ground_debye, dtype=float) + np.asarray(change_debye, dtype=float)
    return -2 * _coupling(excited, change_debye, radius_angstrom)


def mcrae_shift(
    ground_debye: ArrayLike,
    change_debye: ArrayLike,
    radius_angstrom: ArrayLike,
    dielectric_constant: ArrayLike,
    refractive_index: ArrayLike,
) -> FloatArray:
    """Shift (cm^-1) of the absorption maximum from the gas phase by the dipoles of both states (McRae 1957).

    B (n^2 - 1)/(2 n^2 + 1) + C [(eps - 1)/(eps + 2) - (n^2 - 1)/(n^2 + 2)] with B = (mu_g^2 - mu_e^2)/(h c a^3) and
    C = -2 mu_g.(mu_e - mu_g)/(h c a^3). The dispersion term, which needs the whole spectrum, is left out.
    """
    ground, change = np.asarray(ground_debye, dtype=float), np.asarray(change_debye, dtype=float)
    n2, eps = np.asarray(refractive_index, dtype=float) ** 2, np.asarray(dielectric_constant, dtype=float)
    squares = -_coupling(2 * ground + change, change, radius_angstrom)  # mu_e^2 - mu_g^2 is (2 mu_g + change).change
    oriented = (eps - 1) / (eps + 2) - (n2 - 1) / (n2 + 2)
    induced = (n2 - 1) / (2 * n2 + 1)
    return np.asarray(squares * induced - 2 * _coupling(ground, change, radius_angstrom) * oriented)


def stokes_slope_etn(dipole_change_debye: ArrayLike, radius_angstrom: ArrayLike) -> FloatArray:
    """Slope (cm^-1) of the Stokes shift against ETN, 11307.6 (change/9 D)^2 (6.2 angstrom/a)^3.

    Ravi and others 1995: betaine-30, of known dipoles and radius, is the yardstick.
    """
    change = np.asarray(dipole_change_debye, dtype=float) / 9.0
    return np.asarray(11307.6 * change**2 * (6.2 / np.asarray(radius_angstrom, dtype=float)) ** 3)


def _coupling(one: ArrayLike, other: ArrayLike, radius_angstrom: ArrayLike) -> FloatArray:
    """Energy (cm^-1) of two dipoles (debye) over the cube of a radius (angstrom), m1.m2/(h c a^3)."""
    product = np.sum(np.asarray(one, dtype=float) * np.asarray(other, dtype=float), axis=-1) * DEBYE_C_M**2
    radius_m = np.asarray(radius_angstrom, dtype=float) * 1e-10
    return np.asarray(COULOMB_J_M * product / (PLANCK_J_S * LIGHT_M_S * radius_m**3) / 100)


def et30(betaine_max_nm: ArrayLike) -> FloatArray:
    """ET(30) (kcal/mol) of the absorption maximum (nm) of betaine-30 in a medium."""
    return np.asarray(ET30_KCAL_NM / np.asarray(betaine_max_nm, dtype=float))


def et_normalised(et30_kcal_mol: ArrayLike) -> FloatArray:
    """ETN = (ET(30) - 30.7)/32.4: 0 for tetramethylsilane, 1 for water."""
    return (np.asarray(et30_kcal_mol, dtype=float) - 30.7) / 32.4
