"""Computed states as Gaussian bands on the measured scale."""

from __future__ import annotations

from dataclasses import dataclass
from math import log

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import HC_EV_NM, Band, FloatArray, Spectrum, Transitions

from orchil_stages.optics.strength import absorptivity_max, gaussian_area, strength_from_area
from orchil_stages.optics.units import ev_to_cm1

_LONGEST_EV = 0.3
"""No band is moved below this energy (4 micrometres)."""
_ONE_BAND = 0.1
"""States nearer to the reported one than this share of the width are one band with it (degenerate pairs)."""


@dataclass(frozen=True)
class Lines:
    """Gaussian bands (states,) of one width; heights are molar absorptivities (M^-1 cm^-1)."""

    energy_ev: FloatArray
    height: FloatArray
    width_ev: float

    def by_state(self, wavelength_nm: ArrayLike) -> FloatArray:
        """Molar absorptivity of each band, (states, points)."""
        return self.height[:, None] * self._shape(np.atleast_1d(np.asarray(wavelength_nm, dtype=float)), 0.0)

    def at(self, wavelength_nm: ArrayLike, shift_ev: ArrayLike = 0.0) -> FloatArray:
        """Molar absorptivity of the sum, (points,), or (shifts, points) with all bands moved by shifts (shifts,)."""
        points = np.atleast_1d(np.asarray(wavelength_nm, dtype=float))
        shift = np.asarray(shift_ev, dtype=float)
        return np.asarray(self.height @ self._shape(points, shift[..., None, None]))

    def _shape(self, wavelength_nm: FloatArray, shift_ev: FloatArray | float) -> FloatArray:
        offset = HC_EV_NM / wavelength_nm - (self.energy_ev[:, None] + shift_ev)
        return np.asarray(np.exp(-4 * log(2) * (offset / self.width_ev) ** 2))


def band_lines(band: Band, transitions: Transitions) -> Lines:
    """All states on the measured scale.

    The reported band has the calibrated position, absorptivity and width; states that coincide with it share its
    height by their oscillator strength. The others are moved by the same correction (eV) and have the same width. Their
    heights follow from their oscillator strengths, brought down by the factor by which the calibrated area of the
    reported band falls short of its computed strength: singles in a window overestimate strengths alike.
    """
    energy = transitions.energy_ev
    shift = HC_EV_NM / band.absorption_max_nm - energy[band.state]
    same = np.abs(energy - energy[band.state]) < _ONE_BAND * band.width_ev
    together = float(transitions.oscillator_strength[same].sum())
    factor = min(band_strength(band) / together, 1.0) if together > 0 else 1.0
    height = factor * absorptivity_max(transitions.oscillator_strength, ev_to_cm1(band.width_ev))
    share = transitions.oscillator_strength / together if together > 0 else np.arange(len(energy)) == band.state
    height = np.where(same, band.molar_absorptivity * share, height)
    return Lines(np.maximum(energy + shift, _LONGEST_EV), height, band.width_ev)


def lines_of(spectrum: Spectrum) -> Lines:
    """The bands that a spectrum was made of."""
    return Lines(spectrum.band_energy_ev, spectrum.band_absorptivity, spectrum.band_width_ev)


def band_strength(band: Band) -> float:
    """Oscillator strength that the calibrated height and width of the reported band amount to."""
    return float(strength_from_area(gaussian_area(band.molar_absorptivity, ev_to_cm1(band.width_ev))))
