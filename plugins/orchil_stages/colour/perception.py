"""From a transmittance to CIE XYZ, L*a*b* and sRGB, with the tables and transformations of colour-science.

XYZ: CIE 15, summation at 5 nm from 380 to 780 nm, Y of the clear medium 100. L*a*b*: CIE 1976.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from functools import cache
from types import ModuleType

import numpy as np
from orchil_schemas import FloatArray

OBSERVERS = {"2 degree": "CIE 1931 2 Degree Standard Observer", "10 degree": "CIE 1964 10 Degree Standard Observer"}
WAVELENGTH_NM = np.arange(380.0, 781.0, 5.0)


@cache
def library() -> ModuleType:
    """The colour-science package; it warns at import of what it could do with packages that are not here."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import colour
    return colour


@dataclass(frozen=True)
class Viewer:
    """An observer under an illuminant: weights (points, 3) that turn a transmittance into XYZ, and the white (3,)."""

    weights: FloatArray
    white: FloatArray

    def xyz(self, transmittance: FloatArray) -> FloatArray:
        """Tristimulus values (..., 3) of transmittances (..., points) at WAVELENGTH_NM."""
        return np.asarray(transmittance @ self.weights)

    def lab(self, transmittance: FloatArray) -> FloatArray:
        """CIE L*a*b* (..., 3), white being the clear medium."""
        return np.asarray(library().XYZ_to_Lab(self.xyz(transmittance) / 100, self._white_xy))

    def srgb(self, transmittance: FloatArray) -> FloatArray:
        """Colour as sRGB (..., 3), gamma-encoded and adapted to its white; outside 0 to 1 where the gamut ends."""
        return np.asarray(library().XYZ_to_sRGB(self.xyz(transmittance) / 100, self._white_xy))

    @property
    def _white_xy(self) -> FloatArray:
        return np.asarray(library().XYZ_to_xy(self.white))


@cache
def viewer(illuminant: str, observer: str) -> Viewer:
    """The viewer of an illuminant and an observer (a key of OBSERVERS)."""
    colour = library()
    shape = colour.SpectralShape(WAVELENGTH_NM[0], WAVELENGTH_NM[-1], 5)
    matching = colour.MSDS_CMFS[OBSERVERS[observer]].copy().align(shape).values
    power = colour.SDS_ILLUMINANTS[illuminant].copy().align(shape).values
    weights = 100 * power[:, None] * matching / float(power @ matching[:, 1])
    return Viewer(weights, weights.sum(axis=0))


def hexadecimal(srgb: FloatArray) -> tuple[str, bool]:
    """``#rrggbb`` of one sRGB triple, and whether it lies inside the gamut."""
    inside = bool(((srgb > -1e-3) & (srgb < 1.001)).all())
    return "#" + "".join(f"{round(255 * part):02x}" for part in np.clip(srgb, 0, 1).tolist()), inside
