"""The colour stage: the bands of a Spectrum in its layer to a Colour."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Literal

import numpy as np
from orchil_schemas import Availability, Band, Colour, Context, FloatArray, Frozen, Inputs, Record, Spectrum
from pydantic import Field

from orchil_stages.installed import availability

Illuminant = Literal["A", "C", "D50", "D55", "D65", "D75", "E", "FL2", "FL7", "FL11"]


class ColourSettings(Frozen):
    """Who looks, and under which light."""

    illuminant: Illuminant = Field(default="D65", description="CIE name of the light")
    observer: Literal["2 degree", "10 degree"] = Field(default="2 degree", description="CIE standard observer")


class MakeColour:
    """Colour of the layer of the spectrum stage."""

    name = "colour"
    version = "1"
    needs: tuple[type[Record], ...] = (Band, Spectrum)
    makes: tuple[type[Record], ...] = (Colour,)
    Settings: type[Frozen] = ColourSettings
    time_limit_seconds = 60.0

    def found(self) -> Availability:
        """Is colour-science here?"""
        return availability("colour-science")

    def run(self, inputs: Inputs, settings: ColourSettings, context: Context) -> Iterable[Record]:
        """One Colour."""
        yield make_colour(inputs[Band], inputs[Spectrum], settings)


def make_colour(band: Band, spectrum: Spectrum, settings: ColourSettings) -> Colour:
    """Colour of the layer with the intervals that those of the band allow."""
    from orchil_stages.optics.layers import absorbance
    from orchil_stages.spectrum.lines import lines_of
    from orchil_stages.spectrum.spread import possible

    from .perception import WAVELENGTH_NM, hexadecimal, viewer

    seen, lines, maybe = viewer(settings.illuminant, settings.observer), lines_of(spectrum), possible(band)
    layer = spectrum.concentration_m, spectrum.path_cm
    central = 10.0 ** -absorbance(lines.at(WAVELENGTH_NM), *layer)
    around = lines.at(WAVELENGTH_NM, maybe.shift_ev)[:, None, :] * maybe.factor[:, None]
    lightness, a, b = (maybe.spread(part) for part in seen.lab(10.0 ** -absorbance(around, *layer)).reshape(-1, 3).T)
    srgb, inside = hexadecimal(seen.srgb(central))
    chroma, hue = _chroma_hue(seen.lab(central))
    return Colour(
        illuminant=settings.illuminant,
        observer=settings.observer,
        lightness=lightness,
        a=a,
        b=b,
        chroma=chroma,
        hue_deg=hue,
        srgb=srgb,
        in_gamut=inside,
    )


def _chroma_hue(lab: FloatArray) -> tuple[float, float]:
    return float(np.hypot(lab[1], lab[2])), float(np.degrees(np.arctan2(lab[2], lab[1])) % 360)
