"""The emission stage: Band, Transitions and Medium to an Emission."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from math import log

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    Emission,
    FloatArray,
    Frozen,
    Inputs,
    Medium,
    OutOfScope,
    Record,
    Spread,
    Transitions,
)
from pydantic import Field

from orchil_stages.installed import availability


class EmissionSettings(Frozen):
    """What the dye emits into."""

    refractive_index: float | None = Field(
        default=None, ge=1, le=5, description="of the surroundings; left out: that of the medium"
    )


class Emit:
    """Emission band, rates and cross-section of the reported state."""

    name = "emission"
    version = "1"
    needs: tuple[type[Record], ...] = (Medium, Transitions, Band)
    makes: tuple[type[Record], ...] = (Emission,)
    Settings: type[Frozen] = EmissionSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy and SciPy."""
        return availability("numpy", "scipy")

    def run(self, inputs: Inputs, settings: EmissionSettings, context: Context) -> Iterable[Record]:
        """One Emission; OutOfScope where the band tells no emission maximum."""
        yield emission(inputs[Band], inputs[Transitions], settings.refractive_index or inputs[Medium].refractive_index)


def emission(band: Band, transitions: Transitions, refractive_index: float) -> Emission:
    """Rates, and the mirror image of the calibrated absorption band at the emission maximum."""
    from orchil_stages.optics import strength
    from orchil_stages.optics.units import ev_to_cm1
    from orchil_stages.spectrum.rounding import rounded

    if band.emission_max_nm is None:
        raise OutOfScope("the calibration tells no emission maximum for this dye")
    absorbs, emits = HC_EV_NM / band.absorption_max_nm, HC_EV_NM / band.emission_max_nm
    energy, photons = mirror_image(emits, band.width_ev)
    rates = _rates(band, energy, photons, refractive_index)
    rate = rates.value
    wavelength, per_nm = by_wavelength(energy, photons)
    cross_section = strength.stimulated_emission_cross_section(wavelength, per_nm, rate, refractive_index)
    below = max(float(transitions.energy_ev[band.state] - transitions.energy_ev[0]), 0.0)
    dipole = float(np.linalg.norm(transitions.transition_dipole_debye[band.state]))
    return Emission(
        wavelength_nm=np.round(wavelength, 2),
        photons_per_nm=rounded(per_nm),
        stimulated_emission_cm2=rounded(cross_section),
        refractive_index=refractive_index,
        radiative_rate_per_s=rates,
        radiative_lifetime_ns=Spread(
            value=1e9 / rate, low=1e9 / rates.high, high=1e9 / rates.low, coverage=band.coverage
        ),
        dipole_rate_per_s=float(strength.einstein_a_from_dipole(emits, dipole, refractive_index)),
        einstein_b_m3_per_j_s2=float(strength.einstein_b(rate, emits, refractive_index)),
        stimulated_cross_section_cm2=_in_step(float(cross_section.max()), rates),
        zero_zero_ev=(absorbs + emits) / 2,
        stokes_shift_cm1=float(ev_to_cm1(absorbs - emits)),
        dark_below_ev=below,
        cautions=tuple(_cautions(below, band)),
    )


_REACH, _POINTS = 2.5, 101
_LEAST_EV = 0.1


def mirror_image(centre_ev: float, width_ev: float) -> tuple[FloatArray, FloatArray]:
    """Energies (eV, rising) and photons per energy, area one, of a Gaussian emission band."""
    from scipy.integrate import trapezoid

    low = max(centre_ev - _REACH * width_ev, min(_LEAST_EV, centre_ev / 2))
    energy = np.linspace(low, centre_ev + _REACH * width_ev, _POINTS)
    photons = np.exp(-4 * log(2) * ((energy - centre_ev) / width_ev) ** 2)
    return energy, photons / trapezoid(photons, energy)


LEARNED_WEIGHT = 0.6
"""Of the learned rate against that of Strickler and Berg: on unseen scaffolds 0.5 to 1 do about as well, and dyes of
the strongest emission are drawn less towards the middle."""


def _rates(band: Band, energy: FloatArray, photons: FloatArray, refractive_index: float) -> Spread:
    """Radiative rate (s^-1): two estimates brought together where the band tells a learned strength."""
    from orchil_stages.optics.strength import einstein_a
    from orchil_stages.spectrum.spread import factor_spread

    by_band = rate_from_band(band, energy, photons, refractive_index)
    learned = (band.emission_strength, band.emission_strength_low, band.emission_strength_high)
    if band.emission_max_nm is None or None in learned:
        return factor_spread(by_band, band)
    emits = HC_EV_NM / band.emission_max_nm
    middle, low, high = (float(einstein_a(emits, strength or 0.0, refractive_index)) for strength in learned)
    value = float(together(middle, by_band))
    return Spread(value=value, low=value * low / middle, high=value * high / middle, coverage=band.coverage)


def together(learned: FloatArray | float, by_band: FloatArray | float) -> FloatArray:
    """Weighted geometric mean of two estimates of a rate."""
    return np.asarray(learned) ** LEARNED_WEIGHT * np.asarray(by_band) ** (1.0 - LEARNED_WEIGHT)


def _in_step(value: float, rates: Spread) -> Spread:
    """Interval of a number that is proportional to the rate."""
    return Spread(
        value=value, low=value * rates.low / rates.value, high=value * rates.high / rates.value, coverage=rates.coverage
    )


def rate_from_band(band: Band, energy: FloatArray, photons: FloatArray, refractive_index: float) -> float:
    """Strickler-Berg rate (s^-1) of the reported absorption band and an emission over energy (eV)."""
    from orchil_stages.optics.strength import strickler_berg
    from orchil_stages.optics.units import ev_to_cm1

    absorbing, shape = mirror_image(HC_EV_NM / band.absorption_max_nm, band.width_ev)
    absorptivity = band.molar_absorptivity * shape / shape.max()
    return strickler_berg(
        ev_to_cm1(absorbing), absorptivity, ev_to_cm1(energy), photons, refractive_index=refractive_index
    )


def by_wavelength(energy: FloatArray, photons: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Wavelengths (nm, rising) and photons per nm of photons per energy (eV, rising)."""
    wavelength = HC_EV_NM / energy[::-1]
    return wavelength, photons[::-1] * HC_EV_NM / wavelength**2


_THERMAL_EV = 0.1
"""Four times kT: a state that far below is the one that is filled."""
_DARK_EMITTER = (
    "a darker state lies {below:.2f} eV below the one that absorbs: emission may be weak, slow and further to the red"
)


def _cautions(below: float, band: Band) -> Iterator[str]:
    if below > _THERMAL_EV:
        yield _DARK_EMITTER.format(below=below)
    if band.molar_absorptivity < 1000:
        yield "the band is weak: the Strickler-Berg relation holds for strongly allowed bands"
