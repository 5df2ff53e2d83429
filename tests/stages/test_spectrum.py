"""The spectrum stage: bands on the measured scale, layers and lights, intervals carried over."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Band, Context, Inputs, Spectrum
from orchil_stages.optics import layers
from orchil_stages.spectrum import MakeSpectrum, SpectrumSettings
from orchil_stages.spectrum.lights import line, sun_photons, sunlight
from orchil_stages.spectrum.lines import band_lines, lines_of
from orchil_stages.spectrum.rounding import rounded
from orchil_stages.spectrum.spread import possible, two_halves
from pydantic import ValidationError
from scipy.integrate import trapezoid

from tests.light_records import ONE_STATE, band, transitions

EXACT = 1e-10


def run(made: Band, states=ONE_STATE, **settings) -> Spectrum:
    inputs = Inputs([made, states])
    (found,) = MakeSpectrum().run(inputs, SpectrumSettings(**settings), Context(Path(), 1))
    return found


# ---- layers ----


def test_absorptance_of_absorbance():
    """IUPAC Gold Book A00028, A00035: A of 1, 2, 0.30103 absorbs 90, 99, 50 %; a trace absorbs A ln 10."""
    assert layers.absorptance([0, 1, 2, np.log10(2)]) == pytest.approx([0, 0.9, 0.99, 0.5], abs=EXACT)
    assert layers.absorptance(1e-12) == pytest.approx(1e-12 * np.log(10), rel=EXACT)
    assert layers.absorbance(50000, 2e-5, 0.5) == pytest.approx(0.5, rel=EXACT)
    assert layers.light_harvesting_efficiency(1.0) == pytest.approx(0.9, rel=EXACT)


def test_current_of_one_photon_flux():
    """1e21 electrons per m^2 and s are 16.02 mA/cm^2 (e exact by definition of the SI)."""
    assert layers.current_density(1e21) == pytest.approx(16.02176634, rel=EXACT)
    assert layers.photon_flux(500.0, 1.0) == pytest.approx(500e-9 / (6.62607015e-34 * 299792458), rel=EXACT)


def test_weighted_absorptance_of_a_step():
    """Half of the photons meet A = 1, half meet nothing: 45 %, with the one step between them halved."""
    wavelength = np.array([400.0, 500.0, 500.0001, 600.0])
    found = layers.weighted_absorptance(wavelength, [1.0, 1.0, 0.0, 0.0], np.full(4, 7.0))
    assert found == pytest.approx(0.45, rel=1e-6)


# ---- lights ----


def test_sunlight_has_its_published_power():
    """ASTM G173-03: AM1.5G carries 1000.37 W/m^2 in all, 589.12 from 300 to 800 nm, 429.83 from 400 to 700."""
    wavelength, irradiance = sunlight()
    assert trapezoid(irradiance, wavelength) == pytest.approx(1000.37, abs=0.01)
    for low, high, power in ((300, 800, 589.118), (400, 700, 429.831)):
        part = (wavelength >= low) & (wavelength <= high)
        assert trapezoid(irradiance[part], wavelength[part]) == pytest.approx(power, rel=1e-5)


@pytest.mark.parametrize(
    ("low", "high", "flux", "current"),
    [(280, 4000, 4.3056e21, 68.98), (300, 800, 1.7021e21, 27.27), (400, 700, 1.1911e21, 19.08)],
)
def test_sunlight_has_its_published_photons(low, high, flux, current):
    """Photon flux and the current it could give, worked out from the published table."""
    wavelength, photons = sun_photons(low, high)
    total = photons.sum() * (high - low) / len(wavelength)
    assert total == pytest.approx(flux, rel=1e-4)
    assert layers.current_density(total) == pytest.approx(current, rel=3e-4)


def test_a_led_has_its_width():
    wavelength, photons = line(450.0, 20.0)
    assert np.interp([440.0, 450.0, 460.0], wavelength, photons) == pytest.approx([0.5, 1.0, 0.5], abs=0.01)
    assert [part.tolist() for part in line(532.0, 0.0)] == [[532.0], [1.0]]


# ---- bands ----


def test_the_reported_band_is_the_calibrated_one():
    """Position, height and half-width come out of the drawn spectrum."""
    lines = band_lines(band(physics_absorption_max_nm=450.0), transitions([HC_EV_NM / 450, 4.5], [0.8, 0.1]))
    half = HC_EV_NM / (HC_EV_NM / 500 - 0.15)
    assert lines.at([500.0, half]) == pytest.approx([50000, 25000], rel=1e-6)


def test_other_states_move_along_and_keep_the_ratio_of_strengths():
    """A second state of half the strength has half the height, shifted in eV by the same correction."""
    physics = HC_EV_NM / 450
    lines = band_lines(band(width_ev=0.1), transitions([physics, physics + 1.0], [1.6, 0.8]))
    assert lines.energy_ev == pytest.approx([HC_EV_NM / 500, HC_EV_NM / 500 + 1.0], rel=EXACT)
    assert lines.height[1] / lines.height[0] == pytest.approx(0.5, rel=1e-6)


def test_a_weak_reported_band_does_not_blow_up_its_neighbours():
    """A calibrated area above the computed strength is not carried over: f of the neighbour stays as computed."""
    lines = band_lines(band(), transitions([HC_EV_NM / 500, 4.0], [0.001, 0.5]))
    width_cm1 = 0.3 * 8065.544
    assert lines.height[1] == pytest.approx(0.5 / (4.319e-9 * 1.064467 * width_cm1), rel=1e-4)


def test_degenerate_states_share_one_band():
    """Both partners of a degenerate pair are in the measured height: 50000, not twice that."""
    lines = band_lines(band(), transitions([HC_EV_NM / 500, HC_EV_NM / 500 + 1e-4], [0.5, 0.5]))
    assert lines.height == pytest.approx([25000, 25000], rel=EXACT)
    assert lines.at(500.0) == pytest.approx([50000], rel=1e-4)


def test_a_dark_reported_state_keeps_its_height():
    lines = band_lines(band(), transitions([HC_EV_NM / 500], [0.0]))
    assert lines.height.tolist() == [50000]


def test_the_stored_spectrum_gives_its_bands_back():
    found = run(band(), transitions([HC_EV_NM / 500, 3.5], [1.0, 0.3]))
    assert found.molar_absorptivity == pytest.approx(lines_of(found).at(found.wavelength_nm), rel=1e-4, abs=1e-2)
    assert found.wavelength_nm[[0, -1]].tolist() == [250.0, 900.0]


def test_rounding_keeps_five_digits_and_drops_far_tails():
    assert rounded(np.array([123456.7, 0.00012345678, 1e-5, 0.0])).tolist() == [123460.0, 0, 0, 0]
    assert rounded(np.array([1.2345678e-17])).tolist() == [1.2346e-17]
    assert rounded(np.zeros(2)).tolist() == [0, 0]


# ---- what is absorbed ----


def test_laser_line_at_the_maximum():
    """1e-5 M, 1 cm, 50000: A = 0.5, absorptance 68.377 % (1 - 10^-0.5)."""
    found = run(band(), line_nm=500.0)
    assert found.line_absorptivity.value == pytest.approx(50000, rel=EXACT)
    assert found.line_absorbance.value == pytest.approx(0.5, rel=EXACT)
    assert found.line_absorptance_percent.value == pytest.approx(100 * (1 - 10**-0.5), rel=EXACT)
    assert found.line_absorptance_percent.low == pytest.approx(found.line_absorptance_percent.high, rel=EXACT)


def test_sun_of_a_layer_that_absorbs_all():
    """A layer that is black from 300 to 800 nm takes every photon there: 27.27 mA/cm^2."""
    found = run(band(width_ev=20.0), concentration_m=1.0)
    assert found.sunlight_absorptance_percent.value == pytest.approx(100, rel=1e-9)
    assert found.sunlight_current_ma_cm2.value == pytest.approx(27.27, rel=3e-4)


def test_light_harvesting_efficiency_uses_the_calibrated_strength():
    """Height 50000 and width 0.3 eV: f = 4.319e-9 x 1.06447 x 50000 x 2419.7 = 0.5562, efficiency 0.7222."""
    found = run(band())
    assert found.band_strength == pytest.approx(0.5562, rel=2e-4)
    assert found.light_harvesting_efficiency.value == pytest.approx(1 - 10**-0.5562, rel=2e-4)


def test_every_quantity_is_offered_with_its_unit():
    made = run(band()).quantities()
    assert {(one.name, one.unit) for one in made} == {(info.name, info.unit) for info in Spectrum.offers}


# ---- intervals ----


def test_equally_probable_values_have_the_given_interval():
    """90 % between -0.2 and 0.1 about a median of 0."""
    values = two_halves(2001, -0.2, 0.1, 0.9)
    assert np.quantile(values, [0.05, 0.5, 0.95]) == pytest.approx([-0.2, 0.0, 0.1], abs=5e-4)


def test_the_interval_of_the_absorptivity_carries_over():
    """With a known position the line sees the absorptivity alone, 30000 to 80000 at 90 %."""
    made = band(molar_absorptivity_low=30000.0, molar_absorptivity_high=80000.0)
    found = run(made, line_nm=500.0).line_absorptivity
    assert found.value == pytest.approx(50000, rel=1e-6)
    assert (found.low, found.high) == (pytest.approx(30000, rel=0.1), pytest.approx(80000, rel=0.1))


def test_the_interval_of_the_position_carries_over():
    """On one side of the band more shift means more absorption: the interval spans both, the median lies between."""
    made = band(absorption_low_nm=480.0, absorption_high_nm=520.0)
    found = run(made, line_nm=560.0).line_absorptivity
    exactly = run(band(), line_nm=560.0).line_absorptivity.value
    assert found.low < 0.6 * exactly < exactly < 1.4 * exactly < found.high
    assert found.value == pytest.approx(exactly, rel=0.02)
    assert possible(made).shift_ev.shape == (21,)


@pytest.mark.parametrize(
    ("wrong", "says"),
    [
        ({"to_nm": 250.0}, "above from_nm"),
        ({"sun_from_nm": 800.0, "sun_to_nm": 700.0}, "above sun_from_nm"),
        ({"concentration_m": 0.0}, "greater than 0"),
    ],
)
def test_settings_are_checked(wrong, says):
    with pytest.raises(ValidationError, match=says):
        SpectrumSettings(**wrong)
