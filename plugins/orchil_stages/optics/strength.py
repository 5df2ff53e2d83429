"""How strong a transition is: dipole, oscillator strength, molar absorptivity, rate of emission.

Relations: Hilborn, Am. J. Phys. 50, 982 (1982), arXiv physics/0202029; Strickler and Berg, J. Chem. Phys. 37,
814 (1962). Molar absorptivity is the decadic one, M^-1 cm^-1.

Refractive index. A transition dipole in a medium of index n emits n times as fast as in vacuum, and its
absorptivity is 1/n of the vacuum one, both without a local-field factor. A rate from a measured absorptivity
therefore carries n^2 (Strickler and Berg), a rate from a dipole carries n.
"""

from __future__ import annotations

from math import log, pi, sqrt

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import FloatArray
from scipy.integrate import trapezoid

from .units import (
    AVOGADRO_PER_MOL,
    COULOMB_J_M,
    DEBYE_C_M,
    ELECTRON_MASS_KG,
    ELEMENTARY_CHARGE_C,
    HC_EV_CM,
    LIGHT_CM_S,
    LIGHT_M_S,
    PLANCK_J_S,
    VACUUM_PERMITTIVITY_F_M,
)

STRENGTH_PER_AREA = (
    # 1e-3 m^3/L x 1e2 cm/m turns M^-1 cm^-2 into SI: m^2 mol^-1 x m^-1
    4 * VACUUM_PERMITTIVITY_F_M * ELECTRON_MASS_KG * LIGHT_M_S**2 * log(10) * 10
) / (AVOGADRO_PER_MOL * ELEMENTARY_CHARGE_C**2)
"""Oscillator strength per integrated absorptivity (M^-1 cm^-2), 4.319e-9."""

STRENGTH_PER_CM1_DEBYE2 = (8 * pi**2 * ELECTRON_MASS_KG * LIGHT_M_S * 100 * DEBYE_C_M**2) / (
    3 * PLANCK_J_S * ELEMENTARY_CHARGE_C**2
)
"""Oscillator strength per wavenumber (cm^-1) and squared dipole (debye^2), 4.702e-7."""

EINSTEIN_A_PER_CM2 = 8 * pi**2 * COULOMB_J_M * ELEMENTARY_CHARGE_C**2 * 1e4 / (ELECTRON_MASS_KG * LIGHT_M_S)
"""Rate of spontaneous emission (s^-1) per squared wavenumber (cm^-2) and oscillator strength, 0.667025."""

DIPOLE2_PER_AREA = STRENGTH_PER_AREA / STRENGTH_PER_CM1_DEBYE2
"""Squared dipole (debye^2) per integral of absorptivity over ln(wavenumber) (M^-1 cm^-1), 9.186e-3."""

STRICKLER_BERG = 8 * pi * log(10) * 1000 * LIGHT_CM_S / AVOGADRO_PER_MOL
"""Constant of the Strickler-Berg relation, 2.880e-9."""

GAUSSIAN_AREA = sqrt(pi / log(2)) / 2
"""Area of a Gaussian of unit height and unit full width at half maximum, 1.064467."""


def oscillator_strength(energy_ev: ArrayLike, dipole_debye: ArrayLike) -> FloatArray:
    """Oscillator strength (2/3) E mu^2 of an energy (eV) and the length of a transition dipole (debye)."""
    wavenumber = np.asarray(energy_ev, dtype=float) / HC_EV_CM
    return np.asarray(STRENGTH_PER_CM1_DEBYE2 * wavenumber * np.asarray(dipole_debye, dtype=float) ** 2)


def dipole_length(energy_ev: ArrayLike, strength: ArrayLike) -> FloatArray:
    """Length of the transition dipole (debye) of an energy (eV) and an oscillator strength."""
    wavenumber = np.asarray(energy_ev, dtype=float) / HC_EV_CM
    return np.sqrt(np.asarray(strength, dtype=float) / (STRENGTH_PER_CM1_DEBYE2 * wavenumber))


def strength_from_area(area_per_m_cm2: ArrayLike) -> FloatArray:
    """Oscillator strength of an integral of molar absorptivity over wavenumber (M^-1 cm^-2)."""
    return STRENGTH_PER_AREA * np.asarray(area_per_m_cm2, dtype=float)


def gaussian_area(absorptivity_max: ArrayLike, fwhm_cm1: ArrayLike) -> FloatArray:
    """Integral (M^-1 cm^-2) of a Gaussian band of given height (M^-1 cm^-1) and full width (cm^-1)."""
    height, width = np.asarray(absorptivity_max, dtype=float), np.asarray(fwhm_cm1, dtype=float)
    return np.asarray(GAUSSIAN_AREA * height * width)


def absorptivity_max(strength: ArrayLike, fwhm_cm1: ArrayLike) -> FloatArray:
    """Height (M^-1 cm^-1) of a Gaussian band of given oscillator strength and full width (cm^-1)."""
    width = np.asarray(fwhm_cm1, dtype=float)
    return np.asarray(strength, dtype=float) / (STRENGTH_PER_AREA * GAUSSIAN_AREA * width)


def gaussian_band(energy_ev: ArrayLike, centre_ev: ArrayLike, strength: ArrayLike, fwhm_ev: ArrayLike) -> FloatArray:
    """Molar absorptivity (M^-1 cm^-1) at ``energy_ev`` of a Gaussian band; all arguments broadcast."""
    width = np.asarray(fwhm_ev, dtype=float)
    offset = (np.asarray(energy_ev, dtype=float) - np.asarray(centre_ev, dtype=float)) / width
    return np.asarray(absorptivity_max(strength, width / HC_EV_CM) * np.exp(-4 * log(2) * offset**2))


def squared_dipole_from_spectrum(wavenumber_cm1: ArrayLike, absorptivity: ArrayLike) -> FloatArray:
    """Squared dipole (debye^2) of an absorption band sampled on rising wavenumbers (last axis)."""
    wavenumber = np.asarray(wavenumber_cm1, dtype=float)
    return np.asarray(DIPOLE2_PER_AREA * trapezoid(np.asarray(absorptivity) / wavenumber, wavenumber))


def einstein_a(energy_ev: ArrayLike, strength: ArrayLike, refractive_index: ArrayLike = 1.0) -> FloatArray:
    """Rate of spontaneous emission (s^-1) from an oscillator strength read off an absorptivity spectrum.

    Equal degeneracies; the factor of the medium is n^2. A computed dipole: :func:`einstein_a_from_dipole`.
    """
    wavenumber = np.asarray(energy_ev, dtype=float) / HC_EV_CM
    index = np.asarray(refractive_index, dtype=float)
    return np.asarray(EINSTEIN_A_PER_CM2 * (index * wavenumber) ** 2 * np.asarray(strength, dtype=float))


def einstein_a_from_dipole(
    energy_ev: ArrayLike, dipole_debye: ArrayLike, refractive_index: ArrayLike = 1.0
) -> FloatArray:
    """Rate of spontaneous emission (s^-1) of a transition dipole (debye); the factor of the medium is n."""
    index = np.asarray(refractive_index, dtype=float)
    return np.asarray(einstein_a(energy_ev, oscillator_strength(energy_ev, dipole_debye)) * index)


def radiative_lifetime_ns(rate_per_s: ArrayLike) -> FloatArray:
    """Radiative lifetime (ns) of a rate of spontaneous emission (s^-1); infinite for a rate of zero."""
    rate = np.asarray(rate_per_s, dtype=float)
    return np.asarray(np.divide(1e9, rate, out=np.full(rate.shape, np.inf), where=rate > 0))


def radiative_rate(quantum_yield: ArrayLike, lifetime_ns: ArrayLike) -> FloatArray:
    """Radiative rate (s^-1) of a fluorescence quantum yield and a measured lifetime (ns)."""
    return np.asarray(np.asarray(quantum_yield, dtype=float) / (np.asarray(lifetime_ns, dtype=float) * 1e-9))


def strickler_berg(
    absorption_cm1: ArrayLike,
    absorptivity: ArrayLike,
    emission_cm1: ArrayLike,
    emission: ArrayLike,
    *,
    refractive_index: float = 1.0,
    degeneracy_ratio: float = 1.0,
) -> float:
    """Rate of spontaneous emission (s^-1) from the absorption band and the shape of the emission.

    Wavenumbers rise; ``emission`` is in photons per wavenumber, any scale; ``degeneracy_ratio`` is lower over
    upper. Holds for strongly allowed bands (Strickler and Berg 1962).
    """
    wavenumber, photons = np.asarray(emission_cm1, dtype=float), np.asarray(emission, dtype=float)
    mean_inverse_cube = trapezoid(photons / wavenumber**3, wavenumber) / trapezoid(photons, wavenumber)
    band = np.asarray(absorption_cm1, dtype=float)
    area = trapezoid(np.asarray(absorptivity, dtype=float) / band, band)
    return float(STRICKLER_BERG * refractive_index**2 * degeneracy_ratio * area / mean_inverse_cube)


def einstein_b(rate_per_s: ArrayLike, energy_ev: ArrayLike, refractive_index: ArrayLike = 1.0) -> FloatArray:
    """Einstein B (m^3 J^-1 s^-2) of a spontaneous rate A: A c^3/(8 pi h nu^3 n^3), per energy density and frequency.

    Stimulated emission, and absorption between states of equal degeneracy.
    """
    frequency = np.asarray(energy_ev, dtype=float) * ELEMENTARY_CHARGE_C / PLANCK_J_S
    modes = 8 * pi * PLANCK_J_S * (np.asarray(refractive_index, dtype=float) * frequency / LIGHT_M_S) ** 3
    return np.asarray(np.asarray(rate_per_s, dtype=float) / modes)


def absorption_cross_section(absorptivity: ArrayLike) -> FloatArray:
    """Cross-section (cm^2) of a molar absorptivity (M^-1 cm^-1), 3.824e-21 times it."""
    return np.asarray(np.asarray(absorptivity, dtype=float) * log(10) * 1000 / AVOGADRO_PER_MOL)


def stimulated_emission_cross_section(
    wavelength_nm: ArrayLike, photons_per_nm: ArrayLike, rate_per_s: ArrayLike, refractive_index: ArrayLike = 1.0
) -> FloatArray:
    """Cross-section (cm^2) lambda^4 E(lambda) k/(8 pi n^2 c) of an emission E of area one over wavelength.

    Fuechtbauer-Ladenburg relation as used for dye lasers: Peterson, Tuccio, Snavely, Appl. Phys. Lett. 17, 245
    (1970).
    """
    # nm^4 nm^-1 is 1e-21 cm^3
    shape = np.asarray(wavelength_nm, dtype=float) ** 4 * np.asarray(photons_per_nm, dtype=float) * 1e-21
    index = np.asarray(refractive_index, dtype=float)
    return np.asarray(shape * np.asarray(rate_per_s, dtype=float) / (8 * pi * index**2 * LIGHT_CM_S))
