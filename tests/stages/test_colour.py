"""The colour stage against published tristimulus values and colour-science's own integration."""

from __future__ import annotations

import warnings
from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Colour, Context, Inputs
from orchil_stages.colour import ColourSettings, MakeColour
from orchil_stages.colour.perception import WAVELENGTH_NM, hexadecimal, library, viewer
from orchil_stages.spectrum import MakeSpectrum, SpectrumSettings

from tests.light_records import band, transitions

HALF_A_UNIT = 0.5


def gaussian(centre_nm: float, fwhm_nm: float = 60.0):
    """Transmittance of one Gaussian band of absorbance 1."""
    return 10.0 ** -np.exp(-4 * np.log(2) * ((WAVELENGTH_NM - centre_nm) / fwhm_nm) ** 2)


def run(made, states, spectrum_settings=None, **settings) -> Colour:
    (spectrum,) = MakeSpectrum().run(
        Inputs([made, states]), SpectrumSettings(**(spectrum_settings or {})), Context(Path(), 1)
    )
    (found,) = MakeColour().run(Inputs([made, spectrum]), ColourSettings(**settings), Context(Path(), 1))
    return found


@pytest.mark.parametrize(
    ("observer", "white"),
    [("2 degree", (95.047, 100, 108.883)), ("10 degree", (94.811, 100, 107.304))],
)
def test_white_of_d65(observer, white):
    """CIE 15 (ASTM E308): white points of D65."""
    assert viewer("D65", observer).white == pytest.approx(white, abs=0.03)
    assert viewer("D65", observer).lab(np.ones(len(WAVELENGTH_NM))) == pytest.approx([100, 0, 0], abs=0.02)


@pytest.mark.parametrize(
    ("centre", "lab"),
    [
        (430, (98.97, -19.97, 58.09)),
        (480, (92.01, 11.56, 43.95)),
        (530, (74.40, 71.29, -36.01)),
        (580, (74.32, 2.23, -43.88)),
        (620, (88.21, -42.57, -20.28)),
        (680, (98.67, -9.47, -2.28)),
    ],
)
def test_colour_of_one_band(centre, lab):
    """Absorbance 1, 60 nm wide, D65, 2 degrees: worked out at 1 nm from the CIE tables."""
    found = viewer("D65", "2 degree").lab(gaussian(centre))
    assert np.linalg.norm(found - lab) < HALF_A_UNIT


@pytest.mark.parametrize("illuminant", ["A", "D65", "FL2"])
def test_tristimulus_values_are_those_of_the_library(illuminant):
    """colour-science's own ASTM E308 integration of the same transmittance."""
    colour = library()
    transmittance = colour.SpectralDistribution(dict(zip(WAVELENGTH_NM, gaussian(550.0), strict=True)))
    with warnings.catch_warnings():  # it tells that it brings the tables to one step
        warnings.simplefilter("ignore")
        theirs = colour.sd_to_XYZ(transmittance, illuminant=colour.SDS_ILLUMINANTS[illuminant])
    ours = viewer(illuminant, "2 degree").xyz(gaussian(550.0))
    assert ours == pytest.approx(theirs, rel=5e-3)


def test_hexadecimal_colour_holds_to_the_gamut():
    assert hexadecimal(np.array([1.0, 0.5, 0.0])) == ("#ff8000", True)
    assert hexadecimal(np.array([1.2, 0.5, -0.1])) == ("#ff8000", False)


def test_a_green_absorber_looks_magenta_and_a_red_one_blue():
    """Complementary colours (common practice): 530 nm gives magenta, 620 nm blue-green, 430 nm yellow."""
    hues = {}
    for position in (430.0, 530.0, 620.0):
        made = band(absorption_max_nm=position, absorption_low_nm=position, absorption_high_nm=position)
        found = run(made, transitions([HC_EV_NM / position], [1.0]), {"concentration_m": 2e-5})
        assert found.chroma > 20
        hues[position] = found.hue_deg
    assert 60 < hues[430.0] < 125
    assert 300 < hues[530.0] < 360
    assert 180 < hues[620.0] < 250


def test_no_dye_is_no_colour():
    found = run(band(), transitions([HC_EV_NM / 500], [1.0]), {"concentration_m": 1e-12})
    assert found.lightness.value == pytest.approx(100, abs=1e-3)
    assert found.srgb == "#ffffff"


def test_the_interval_holds_the_exact_colour_and_grows_with_the_doubt():
    exactly = run(band(), transitions([HC_EV_NM / 500], [1.0]))
    doubtful = run(band(absorption_low_nm=470.0, absorption_high_nm=535.0), transitions([HC_EV_NM / 500], [1.0]))
    for name in ("lightness", "a", "b"):
        spread, exact = getattr(doubtful, name), getattr(exactly, name)
        assert exact.low == pytest.approx(exact.high, abs=1e-9)
        assert spread.low < exact.value < spread.high
    assert {(one.name, one.unit) for one in exactly.quantities()} == {(i.name, i.unit) for i in Colour.offers}
