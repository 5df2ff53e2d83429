"""Constants of CODATA 2018 and the conversions between the units of spectroscopy.

Source: Tiesinga, Mohr, Newell, Taylor, Rev. Mod. Phys. 93, 025010 (2021). The values are written out, because
``scipy.constants`` moves to the next adjustment with its version and results must not.
"""

from __future__ import annotations

from math import pi

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import HC_EV_NM, FloatArray

PLANCK_J_S = 6.62607015e-34
LIGHT_M_S = 299792458.0
ELEMENTARY_CHARGE_C = 1.602176634e-19
AVOGADRO_PER_MOL = 6.02214076e23
ELECTRON_MASS_KG = 9.1093837015e-31
VACUUM_PERMITTIVITY_F_M = 8.8541878128e-12
BOHR_ANGSTROM = 0.529177210903
HARTREE_EV = 27.211386245988

LIGHT_CM_S = 100 * LIGHT_M_S
HC_EV_CM = PLANCK_J_S * LIGHT_CM_S / ELEMENTARY_CHARGE_C
"""One wavenumber (cm^-1) in eV."""

DEBYE_C_M = 1e-21 / LIGHT_M_S
"""One debye in C m: 1e-18 statcoulomb cm, exact."""

EA0_DEBYE = ELEMENTARY_CHARGE_C * BOHR_ANGSTROM * 1e-10 / DEBYE_C_M
"""The atomic unit of dipole moment, e a0, in debye."""

COULOMB_J_M = 1 / (4 * pi * VACUUM_PERMITTIVITY_F_M)
"""1/(4 pi eps0) in J m C^-2, which turns squares of SI charges into those of the Gaussian system."""


def ev_to_nm(energy_ev: ArrayLike) -> FloatArray:
    """Wavelength in vacuum (nm) of a photon energy (eV); its own inverse."""
    return np.asarray(HC_EV_NM / _positive(energy_ev, "energy_ev"))


def nm_to_ev(wavelength_nm: ArrayLike) -> FloatArray:
    """Photon energy (eV) of a wavelength in vacuum (nm)."""
    return np.asarray(HC_EV_NM / _positive(wavelength_nm, "wavelength_nm"))


def ev_to_cm1(energy_ev: ArrayLike) -> FloatArray:
    """Wavenumber (cm^-1) of an energy (eV); differences and widths convert alike."""
    return np.asarray(energy_ev, dtype=float) / HC_EV_CM


def cm1_to_ev(wavenumber_cm1: ArrayLike) -> FloatArray:
    """Energy (eV) of a wavenumber (cm^-1); differences and widths convert alike."""
    return np.asarray(wavenumber_cm1, dtype=float) * HC_EV_CM


def nm_to_cm1(wavelength_nm: ArrayLike) -> FloatArray:
    """Wavenumber (cm^-1) of a wavelength (nm); its own inverse."""
    return np.asarray(1e7 / _positive(wavelength_nm, "wavelength_nm"))


def width_nm_to_cm1(width_nm: ArrayLike, centre_nm: ArrayLike) -> FloatArray:
    """Width (cm^-1) of a band whose half-maxima lie ``width_nm``/2 on both sides of the centre."""
    half = np.asarray(width_nm, dtype=float) / 2
    centre = np.asarray(centre_nm, dtype=float)
    return nm_to_cm1(centre - half) - nm_to_cm1(centre + half)


def ea0_to_debye(dipole_ea0: ArrayLike) -> FloatArray:
    """Dipole in debye of one in atomic units (e a0)."""
    return np.asarray(dipole_ea0, dtype=float) * EA0_DEBYE


def debye_to_ea0(dipole_debye: ArrayLike) -> FloatArray:
    """Dipole in atomic units (e a0) of one in debye."""
    return np.asarray(dipole_debye, dtype=float) / EA0_DEBYE


def _positive(value: ArrayLike, name: str) -> FloatArray:
    array = np.asarray(value, dtype=float)
    if not np.all(array > 0):
        raise ValueError(f"{name} must be above zero")
    return array
