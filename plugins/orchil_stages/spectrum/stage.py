"""The spectrum stage: Band and Transitions to a Spectrum."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import Availability, Band, Context, FloatArray, Frozen, Inputs, Record, Spectrum, Transitions
from pydantic import Field, model_validator
from typing_extensions import Self

from orchil_stages.installed import availability


class SpectrumSettings(Frozen):
    """The layer and the lights it is held into."""

    concentration_m: float = Field(default=1e-5, gt=0, le=10, description="mol/L of dye in the layer")
    path_cm: float = Field(default=1.0, gt=0, description="thickness of the layer")
    line_nm: float = Field(default=532.0, ge=200, le=3000, description="lamp, LED or laser line")
    line_width_nm: float = Field(default=0.0, ge=0, le=200, description="its full width at half maximum; 0: laser")
    sun_from_nm: float = Field(default=300.0, ge=280, le=3900, description="sunlight counts from here")
    sun_to_nm: float = Field(default=800.0, ge=300, le=4000, description="to here")
    from_nm: float = Field(default=250.0, ge=150, le=2000, description="first wavelength of the spectrum")
    to_nm: float = Field(default=900.0, ge=200, le=5000, description="last wavelength")
    step_nm: float = Field(default=5.0, ge=0.5, le=50, description="distance of its points")

    @model_validator(mode="after")
    def _rising(self) -> Self:
        if self.from_nm + self.step_nm > self.to_nm:
            raise ValueError("to_nm must be above from_nm by step_nm or more")
        if self.sun_from_nm >= self.sun_to_nm:
            raise ValueError("sun_to_nm must be above sun_from_nm")
        return self


class MakeSpectrum:
    """Absorption spectrum on the measured scale."""

    name = "spectrum"
    version = "1"
    needs: tuple[type[Record], ...] = (Transitions, Band)
    makes: tuple[type[Record], ...] = (Spectrum,)
    Settings: type[Frozen] = SpectrumSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy and SciPy."""
        return availability("numpy", "scipy")

    def run(self, inputs: Inputs, settings: SpectrumSettings, context: Context) -> Iterable[Record]:
        """One Spectrum."""
        yield make_spectrum(inputs[Band], inputs[Transitions], settings)


def make_spectrum(band: Band, transitions: Transitions, settings: SpectrumSettings) -> Spectrum:
    """The spectrum of the states and what the layer absorbs."""
    from orchil_stages.optics.layers import absorbance, current_density, light_harvesting_efficiency

    from .lights import line, sun_photons
    from .lines import band_lines, band_strength
    from .rounding import rounded
    from .spread import possible

    lines, maybe = band_lines(band, transitions), possible(band)
    grid = np.arange(settings.from_nm, settings.to_nm + 1e-6, settings.step_nm)
    layer = settings.concentration_m, settings.path_cm
    wavelength, photons = line(settings.line_nm, settings.line_width_nm)
    lit = _at_all(lines.at(wavelength, maybe.shift_ev), maybe.factor)
    absorptivity = lit @ photons / photons.sum()
    share = _absorbed(absorbance(lit, *layer), photons)
    sun_nm, sun = sun_photons(settings.sun_from_nm, settings.sun_to_nm)
    sun_share = _absorbed(absorbance(_at_all(lines.at(sun_nm, maybe.shift_ev), maybe.factor), *layer), sun)
    sun_total = sun.sum() * (settings.sun_to_nm - settings.sun_from_nm) / len(sun)
    strength = band_strength(band)
    return Spectrum(
        wavelength_nm=grid,
        molar_absorptivity=rounded(lines.at(grid)),
        band_energy_ev=lines.energy_ev,
        band_absorptivity=lines.height,
        band_width_ev=band.width_ev,
        band_strength=strength,
        concentration_m=settings.concentration_m,
        path_cm=settings.path_cm,
        line_nm=settings.line_nm,
        line_width_nm=settings.line_width_nm,
        line_absorptivity=maybe.spread(absorptivity),
        line_absorbance=maybe.spread(absorbance(absorptivity, *layer)),
        line_absorptance_percent=maybe.spread(100 * share),
        sunlight_absorptance_percent=maybe.spread(100 * sun_share),
        sunlight_current_ma_cm2=maybe.spread(current_density(sun_share * sun_total)),
        light_harvesting_efficiency=maybe.spread(light_harvesting_efficiency(strength * maybe.factor)),
    )


def _at_all(absorptivity: FloatArray, factor: FloatArray) -> FloatArray:
    """Spectra (shifts, points) times every factor, (shifts, factors, points)."""
    return np.asarray(absorptivity[:, None, :] * factor[:, None])


def _absorbed(decadic: FloatArray, photons: FloatArray) -> FloatArray:
    """Share of the photons absorbed, over the last axis."""
    from orchil_stages.optics.layers import absorptance

    return np.asarray(absorptance(decadic) @ photons / photons.sum())
