"""What a layer of dye takes out of a light: absorbance, absorptance, light harvesting.

Absorbance is decadic, absorptance the share of light absorbed (IUPAC Gold Book A00028, A00035); scattering and
reflection are left out. LED and sun are weighted by photons, because a photon makes one excited dye.
"""

from __future__ import annotations

from math import log

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import FloatArray
from scipy.integrate import trapezoid

from .units import ELEMENTARY_CHARGE_C, LIGHT_M_S, PLANCK_J_S


def absorbance(absorptivity: ArrayLike, concentration_m: ArrayLike, path_cm: ArrayLike) -> FloatArray:
    """Decadic absorbance eps c l of a molar absorptivity (M^-1 cm^-1), a concentration (M) and a path (cm)."""
    concentration, path = np.asarray(concentration_m, dtype=float), np.asarray(path_cm, dtype=float)
    return np.asarray(np.asarray(absorptivity, dtype=float) * concentration * path)


def absorptance(decadic: ArrayLike) -> FloatArray:
    """Share of light absorbed, 1 - 10^-A, exact also for small A."""
    return np.asarray(-np.expm1(-log(10) * np.asarray(decadic, dtype=float)))


def light_harvesting_efficiency(strength: ArrayLike) -> FloatArray:
    """1 - 10^-f of an oscillator strength: the usual measure for sensitisers, as if f were an absorbance."""
    return absorptance(strength)


def photon_flux(wavelength_nm: ArrayLike, irradiance: ArrayLike) -> FloatArray:
    """Photons (m^-2 s^-1 nm^-1) of a spectral irradiance (W m^-2 nm^-1)."""
    energy_j = PLANCK_J_S * LIGHT_M_S / (np.asarray(wavelength_nm, dtype=float) * 1e-9)
    return np.asarray(np.asarray(irradiance, dtype=float) / energy_j)


def weighted_absorptance(wavelength_nm: ArrayLike, decadic: ArrayLike, photons: ArrayLike) -> FloatArray:
    """Share of the photons of a light that is absorbed; spectra on the last axis, wavelengths rising."""
    wavelength, light = np.asarray(wavelength_nm, dtype=float), np.asarray(photons, dtype=float)
    return np.asarray(trapezoid(absorptance(decadic) * light, wavelength) / trapezoid(light, wavelength))


def current_density(photons_per_m2_s: ArrayLike) -> FloatArray:
    """Current (mA cm^-2) of one electron per photon."""
    return np.asarray(np.asarray(photons_per_m2_s, dtype=float) * ELEMENTARY_CHARGE_C * 1000 / 1e4)
