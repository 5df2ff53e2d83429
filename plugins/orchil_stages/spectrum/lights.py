"""Lights: a laser or lamp line, an LED, and sunlight."""

from __future__ import annotations

import csv
from functools import cache
from importlib.resources import files
from math import log

import numpy as np
from orchil_schemas import FloatArray

from orchil_stages.optics.layers import photon_flux

_STEPS = 25


def line(centre_nm: float, width_nm: float) -> tuple[FloatArray, FloatArray]:
    """Wavelengths and photons (any scale) of a Gaussian line of full width at half maximum ``width_nm``.

    A width of zero is a laser: one wavelength.
    """
    if width_nm == 0:
        return np.array([centre_nm]), np.ones(1)
    offset = np.linspace(-1.5, 1.5, _STEPS)
    return centre_nm + offset * width_nm, np.exp(-4 * log(2) * offset**2)


@cache
def sunlight() -> tuple[FloatArray, FloatArray]:
    """Wavelengths (nm) and irradiance (W m^-2 nm^-1) of AM1.5G, 280 to 4000 nm."""
    text = files(__package__).joinpath("sunlight.csv").read_text(encoding="utf-8")
    rows = list(csv.reader(row for row in text.splitlines() if not row.startswith("#")))[1:]
    wavelength, irradiance = np.array(rows, dtype=float).T
    return wavelength, irradiance


def sun_photons(from_nm: float, to_nm: float, step_nm: float = 5.0) -> tuple[FloatArray, FloatArray]:
    """Wavelengths and photons (m^-2 s^-1 nm^-1) of AM1.5G, means over steps that keep the total."""
    wavelength, irradiance = sunlight()
    edges = np.linspace(from_nm, to_nm, max(round((to_nm - from_nm) / step_nm), 1) + 1)
    flux = photon_flux(wavelength, irradiance)
    total = np.concatenate([[0.0], np.cumsum(np.diff(wavelength) * (flux[1:] + flux[:-1]) / 2)])
    return (edges[1:] + edges[:-1]) / 2, np.diff(np.interp(edges, wavelength, total)) / np.diff(edges)
