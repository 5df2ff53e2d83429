"""Energy transfer by dipole coupling between a donor and an acceptor dye.

Source: IUPAC Gold Book FT07381 (Foerster-resonance-energy transfer); Foerster, Ann. Phys. 437, 55 (1948).
"""

from __future__ import annotations

from math import log, pi

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import HC_EV_NM, FloatArray
from scipy.integrate import trapezoid

from .units import AVOGADRO_PER_MOL

KAPPA2_RANDOM = 2 / 3
"""Mean orientation factor of dipoles that turn freely and fast."""

RADIUS6_CM6 = 9000 * log(10) / (128 * pi**5 * AVOGADRO_PER_MOL)
"""R0^6 (cm^6) per kappa^2 Phi n^-4 J with J in M^-1 cm^3, 8.785e-25."""

# J: nm^4 cm^-1 is 1e-28 cm^3; R^6: 1 cm is 1e7 nm
RADIUS_NM = (RADIUS6_CM6 * 1e-28) ** (1 / 6) * 1e7
"""R0 (nm) per (kappa^2 Phi n^-4 J)^(1/6) with J in M^-1 cm^-1 nm^4, 0.021084."""


_FWHM2_PER_VARIANCE = 8 * log(2)


def forster_radius_nm(
    overlap: ArrayLike,
    quantum_yield: ArrayLike,
    refractive_index: ArrayLike,
    kappa2: ArrayLike = KAPPA2_RANDOM,
) -> FloatArray:
    """Distance (nm) of half transfer; ``overlap`` in M^-1 cm^-1 nm^4, yield of the donor without acceptor."""
    index = np.asarray(refractive_index, dtype=float)
    product = np.asarray(kappa2, dtype=float) * np.asarray(quantum_yield, dtype=float) * np.asarray(overlap)
    return np.asarray(RADIUS_NM * (product / index**4) ** (1 / 6))


def overlap_for_radius(
    radius_nm: ArrayLike,
    quantum_yield: ArrayLike,
    refractive_index: ArrayLike,
    kappa2: ArrayLike = KAPPA2_RANDOM,
) -> FloatArray:
    """Spectral overlap (M^-1 cm^-1 nm^4) that a Foerster radius (nm) implies."""
    sixth = (np.asarray(radius_nm, dtype=float) / RADIUS_NM) ** 6
    weight = np.asarray(kappa2, dtype=float) * np.asarray(quantum_yield, dtype=float)
    return np.asarray(sixth * np.asarray(refractive_index, dtype=float) ** 4 / weight)


def spectral_overlap(wavelength_nm: ArrayLike, emission: ArrayLike, absorptivity: ArrayLike) -> FloatArray:
    """J (M^-1 cm^-1 nm^4) of a donor emission (per wavelength, any scale) and an acceptor absorptivity.

    Both are sampled on the rising wavelengths (nm) of the last axis.
    """
    wavelength, light = np.asarray(wavelength_nm, dtype=float), np.asarray(emission, dtype=float)
    weighted = trapezoid(light * np.asarray(absorptivity, dtype=float) * wavelength**4, wavelength)
    return np.asarray(weighted / trapezoid(light, wavelength))


def gaussian_overlap(
    donor_ev: ArrayLike, donor_width_ev: ArrayLike, acceptor_ev: ArrayLike, acceptor_width_ev: ArrayLike
) -> FloatArray:
    """J (nm^4) per acceptor absorptivity at its maximum, both bands Gaussian in energy; arguments broadcast.

    The product of the two is a Gaussian; lambda^4 is expanded about its centre to fourth order in its width. Good to
    1e-3 while the widths are below a fifth of the energies.
    """
    d, a = np.asarray(donor_ev, dtype=float), np.asarray(acceptor_ev, dtype=float)
    vd = np.asarray(donor_width_ev, dtype=float) ** 2 / _FWHM2_PER_VARIANCE
    va = np.asarray(acceptor_width_ev, dtype=float) ** 2 / _FWHM2_PER_VARIANCE
    total = vd + va
    centre, variance = (d * va + a * vd) / total, vd * va / total
    spread = variance / centre**2
    height = np.sqrt(va / total) * np.exp(-((d - a) ** 2) / (2 * total))
    return np.asarray(height * (HC_EV_NM / centre) ** 4 * (1 + 10 * spread + 105 * spread**2))


def kappa2(donor: ArrayLike, acceptor: ArrayLike, separation: ArrayLike) -> FloatArray:
    """Orientation factor, 0 to 4, of two dipoles and the vector between them, vectors on the last axis."""
    d, a, r = (_unit(vector) for vector in (donor, acceptor, separation))
    factor = np.sum(d * a, axis=-1) - 3 * np.sum(d * r, axis=-1) * np.sum(a * r, axis=-1)
    return np.asarray(factor**2)


def transfer_efficiency(distance_nm: ArrayLike, radius_nm: ArrayLike) -> FloatArray:
    """Share of excitations handed over at a distance, 1/(1 + (R/R0)^6)."""
    ratio = np.asarray(distance_nm, dtype=float) / np.asarray(radius_nm, dtype=float)
    return np.asarray(1 / (1 + ratio**6))


def _unit(vector: ArrayLike) -> FloatArray:
    array = np.asarray(vector, dtype=float)
    return np.asarray(array / np.linalg.norm(array, axis=-1, keepdims=True))
