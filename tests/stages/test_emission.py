"""The emission stage: rates, lifetimes and cross-sections against identities and worked examples."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Context, Emission, Inputs, OutOfScope
from orchil_stages.emission import EmissionSettings, Emit
from orchil_stages.emission.stage import by_wavelength, mirror_image
from orchil_stages.optics import strength, units
from scipy import constants
from scipy.integrate import trapezoid

from tests.light_records import CYCLOHEXANE, ONE_STATE, band, transitions

EXACT = 1e-10


def run(made, states=ONE_STATE, **settings) -> Emission:
    inputs = Inputs([CYCLOHEXANE, states, made])
    (found,) = Emit().run(inputs, EmissionSettings(**settings), Context(Path(), 1))
    return found


# ---- formulas ----


def test_einstein_a_over_b_is_planck():
    """A/B = 8 pi h nu^3/c^3 (Einstein 1917; Hilborn, Am. J. Phys. 50, 982, 1982): at 500 nm 1.3321e-13 J s/m^3."""
    energy = HC_EV_NM / 500
    ratio = 1e8 / strength.einstein_b(1e8, energy)
    assert ratio == pytest.approx(8 * np.pi * constants.h / (500e-9) ** 3, rel=1e-8)
    assert strength.einstein_b(1e8, energy, 1.5) == pytest.approx(strength.einstein_b(1e8, energy) / 1.5**3, rel=EXACT)


def test_cross_section_of_an_absorptivity():
    """3.8235e-21 cm^2 per M^-1 cm^-1 (1000 ln10/N_A, textbook)."""
    assert strength.absorption_cross_section(1.0) == pytest.approx(3.8235e-21, rel=2e-5)


def test_narrow_band_stimulates_as_it_absorbs():
    """Equal degeneracies (Einstein): without a Stokes shift the two cross-sections are one, at any index."""
    energy = np.linspace(2.49, 2.51, 2001)
    shape = np.exp(-4 * np.log(2) * ((energy - 2.5) / 0.002) ** 2)
    absorptivity = 40000 * shape
    rate = strength.strickler_berg(
        units.ev_to_cm1(energy), absorptivity, units.ev_to_cm1(energy), shape, refractive_index=1.4
    )
    wavelength, photons = by_wavelength(energy, shape / trapezoid(shape, energy))
    emitting = strength.stimulated_emission_cross_section(wavelength, photons, rate, 1.4)
    assert emitting.max() == pytest.approx(float(strength.absorption_cross_section(40000)), rel=2e-3)


def test_cross_section_of_rhodamine_6g():
    """About 4e-16 cm^2 at the emission maximum in ethanol (Peterson, Tuccio, Snavely, Appl. Phys. Lett. 17, 245, 1970,
    and later; from memory, medium): yield over lifetime 2.4e8 s^-1, 555 nm, some 1300 cm^-1 wide, n = 1.36.
    """
    energy, photons = mirror_image(HC_EV_NM / 555, float(units.cm1_to_ev(1300)))
    found = strength.stimulated_emission_cross_section(*by_wavelength(energy, photons), 2.4e8, 1.36)
    assert 2e-16 < found.max() < 6e-16


# ---- the stage ----


def test_emission_band_has_its_maximum_width_and_area():
    found = run(band())
    assert trapezoid(found.photons_per_nm, found.wavelength_nm) == pytest.approx(1, abs=2e-3)
    energy, photons = mirror_image(2.3, 0.3)
    assert trapezoid(photons, energy) == pytest.approx(1, rel=EXACT)
    assert np.interp([2.15, 2.3, 2.45], energy, photons / photons.max()) == pytest.approx([0.5, 1, 0.5], abs=2e-3)


def test_rate_is_strickler_berg_of_two_gaussians():
    """By hand: f = 0.5562, n^2 0.667 f nu_e^3/nu_a over 1 + 6 s^2/E^2, the mean of nu^-3, with s = width/2.355."""
    found = run(band())
    spread = (0.3 / 2.354820 / (HC_EV_NM / 550)) ** 2
    by_hand = 0.667025 * 1.4266**2 * 0.5562 * (1e7 / 550) ** 3 / (1e7 / 500) / (1 + 6 * spread)
    assert found.radiative_rate_per_s.value == pytest.approx(by_hand, rel=5e-3)
    assert found.radiative_lifetime_ns.value == pytest.approx(1e9 / found.radiative_rate_per_s.value, rel=EXACT)
    assert found.refractive_index == 1.4266


def test_a_learned_strength_and_the_band_give_the_rate_together():
    """0.667 f nu^2 n^2 (SI constants, Hilborn 1982) with f = 0.3 at 550 nm to the power 0.6, the band's to 0.4."""
    by_band = run(band(), refractive_index=1.4).radiative_rate_per_s.value
    made = band(emission_strength=0.3, emission_strength_low=0.2, emission_strength_high=0.6)
    rate = run(made, refractive_index=1.4).radiative_rate_per_s
    learned = 0.667025 * 0.3 * (1e7 / 550) ** 2 * 1.4**2
    assert rate.value == pytest.approx(learned**0.6 * by_band**0.4, rel=1e-5)
    assert (rate.low, rate.high) == (pytest.approx(rate.value / 1.5), pytest.approx(rate.value * 2))


def test_rate_grows_with_the_square_of_the_index():
    """Strickler and Berg, J. Chem. Phys. 37, 814 (1962): n^2."""
    one, two = (run(band(), refractive_index=n).radiative_rate_per_s.value for n in (1.0, 1.5))
    assert two / one == pytest.approx(2.25, rel=EXACT)


def test_dipole_rate_is_hilborns():
    """8 D at 550 nm: 3.136e-7 nu^3 mu^2 in vacuum (Hilborn 1982), times n."""
    found = run(band(), refractive_index=1.4)
    assert found.dipole_rate_per_s == pytest.approx(3.13619e-7 * (1e7 / 550) ** 3 * 64 * 1.4, rel=1e-5)


def test_intervals_follow_the_absorptivity():
    found = run(band(molar_absorptivity_low=25000.0, molar_absorptivity_high=100000.0))
    rate, lifetime = found.radiative_rate_per_s, found.radiative_lifetime_ns
    assert (rate.low, rate.high) == (pytest.approx(rate.value / 2), pytest.approx(rate.value * 2))
    assert (lifetime.low, lifetime.high) == (pytest.approx(lifetime.value / 2), pytest.approx(lifetime.value * 2))


def test_zero_zero_and_stokes_shift():
    found = run(band())
    assert found.zero_zero_ev == pytest.approx(HC_EV_NM * (1 / 500 + 1 / 550) / 2, rel=EXACT)
    assert found.stokes_shift_cm1 == pytest.approx(1e7 / 500 - 1e7 / 550, rel=1e-8)


def test_a_darker_state_below_is_told():
    states = transitions([2.0, HC_EV_NM / 500], [0.0, 1.0])
    found = run(band(state=1), states)
    assert found.dark_below_ev == pytest.approx(HC_EV_NM / 500 - 2.0)
    assert any("darker state" in text for text in found.cautions)
    assert run(band()).cautions == ()


def test_a_weak_band_is_told_and_no_emission_is_refused():
    weak = band(molar_absorptivity=500.0, molar_absorptivity_low=500.0, molar_absorptivity_high=500.0)
    assert any("weak" in text for text in run(weak).cautions)
    with pytest.raises(OutOfScope, match="no emission maximum"):
        run(band(emission_max_nm=None))


def test_a_broad_band_in_the_infrared_stays_above_zero_energy():
    found = run(band(absorption_max_nm=2400.0, emission_max_nm=2500.0, width_ev=0.5))
    assert np.all(found.wavelength_nm > 0)
    assert found.radiative_rate_per_s.value > 0


def test_every_quantity_is_offered_with_its_unit():
    made = run(band()).quantities()
    assert {(one.name, one.unit) for one in made} == {(info.name, info.unit) for info in Emission.offers}
