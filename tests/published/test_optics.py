"""Formulas of light and matter against published constants, limits and worked examples.

"exact" marks arithmetic from the definition; tolerances follow the digits of the printed value.
"""

from __future__ import annotations

import numpy as np
import pytest
from orchil_stages.optics import polarised, solvatochromism, strength, transfer, units
from scipy import constants
from scipy.integrate import trapezoid

EXACT = 1e-10


# ---- constants (CODATA 2018) ----


@pytest.mark.parametrize(
    ("ours", "published", "digits"),
    [
        # "often 4.32e-9", as used in Molecules 17, 3259 (2012), Table 3; 4.319e-9 in textbooks
        (strength.STRENGTH_PER_AREA, 4.319e-9, 1e-4),
        # Hilborn, Am. J. Phys. 50, 982 (1982): f = 4.702e-7 nu mu^2 (cm^-1, debye)
        (strength.STRENGTH_PER_CM1_DEBYE2, 4.702e-7, 1e-4),
        (strength.DIPOLE2_PER_AREA, 9.186e-3, 1e-4),
        # Hilborn 1982, eq. 33: A = 0.667 nu^2 f, "tau = 1.5/(f nu^2)"
        (strength.EINSTEIN_A_PER_CM2, 0.66702, 1e-5),
        (1 / strength.EINSTEIN_A_PER_CM2, 1.49919, 1e-5),
        (strength.EINSTEIN_A_PER_CM2 * strength.STRENGTH_PER_CM1_DEBYE2, 3.136e-7, 1e-4),
        # Strickler and Berg, J. Chem. Phys. 37, 814 (1962): 2.880e-9
        (strength.STRICKLER_BERG, 2.880e-9, 4e-4),
        # IUPAC Gold Book FT07381 (Foerster): 2.108e-2 nm; prefactor 8.79e-25 from memory, high
        (transfer.RADIUS_NM, 2.108e-2, 3e-4),
        (transfer.RADIUS6_CM6, 8.79e-25, 1e-3),
        # 1 e a0 = 2.541746 D (CODATA)
        (units.EA0_DEBYE, 2.541746, 3e-7),
        # 28591 kcal nm/mol: Reichardt, Chem. Rev. 94, 2319 (1994)
        (solvatochromism.ET30_KCAL_NM, 28591, 2e-5),
    ],
)
def test_constant_has_its_published_value(ours: float, published: float, digits: float) -> None:
    assert ours == pytest.approx(published, rel=digits)


def test_constants_agree_with_scipy() -> None:
    """SciPy may carry CODATA 2022 already: the adjusted constants moved by less than 1e-9."""
    assert constants.h == units.PLANCK_J_S
    assert constants.c == units.LIGHT_M_S
    assert constants.e == units.ELEMENTARY_CHARGE_C
    assert constants.N_A == units.AVOGADRO_PER_MOL
    assert constants.m_e == pytest.approx(units.ELECTRON_MASS_KG, rel=1e-8)
    assert constants.epsilon_0 == pytest.approx(units.VACUUM_PERMITTIVITY_F_M, rel=1e-8)
    assert constants.value("Hartree energy in eV") == pytest.approx(units.HARTREE_EV, rel=1e-10)
    assert constants.value("Bohr radius") * 1e10 == pytest.approx(units.BOHR_ANGSTROM, rel=1e-9)


def test_identity_links_strickler_berg_to_einstein_a() -> None:
    """Exact: 0.667025 x 4.31900e-9 = 2.88088e-9, whatever the electron mass."""
    product = strength.EINSTEIN_A_PER_CM2 * strength.STRENGTH_PER_AREA
    assert product == pytest.approx(strength.STRICKLER_BERG, rel=EXACT)


def test_atomic_units_give_two_thirds() -> None:
    """Exact: f = (2/3) E mu^2 is 2/3 for one hartree and one e a0 (textbook)."""
    assert strength.oscillator_strength(units.HARTREE_EV, units.EA0_DEBYE) == pytest.approx(2 / 3, rel=1e-9)


def test_conversions_come_back() -> None:
    energy = np.array([1.2, 2.5, 6.0])
    assert units.nm_to_ev(units.ev_to_nm(energy)) == pytest.approx(energy, rel=EXACT)
    assert units.cm1_to_ev(units.ev_to_cm1(energy)) == pytest.approx(energy, rel=EXACT)
    assert units.debye_to_ea0(units.ea0_to_debye(energy)) == pytest.approx(energy, rel=EXACT)
    assert units.nm_to_cm1(units.ev_to_nm(energy)) == pytest.approx(units.ev_to_cm1(energy), rel=1e-9)
    assert units.ev_to_cm1(1.0) == pytest.approx(8065.544, rel=1e-7)  # CODATA: 1 eV is 8065.544 cm^-1
    assert units.width_nm_to_cm1(20.0, 500.0) == pytest.approx(1e7 / 490 - 1e7 / 510, rel=EXACT)


@pytest.mark.parametrize("wavelength", [0.0, -500.0, float("nan")])
def test_a_wavelength_must_be_above_zero(wavelength: float) -> None:
    with pytest.raises(ValueError, match="wavelength_nm must be above zero"):
        units.nm_to_ev(wavelength)


# ---- strength ----


def test_lyman_alpha() -> None:
    """A(2p-1s) = 6.265e8 s^-1 from 82259.2 cm^-1, f = 0.4164, degeneracies 2 and 6 (accepted value; from
    memory).
    """
    rate = strength.einstein_a(units.cm1_to_ev(82259.2), 0.4164) * 2 / 6
    assert rate == pytest.approx(6.265e8, rel=2e-4)


@pytest.mark.parametrize(
    ("height", "width", "centre", "area", "f", "dipole", "rate", "lifetime"),
    [
        (1e5, 1500, 20000, 1.59670e8, 0.68961, 8.5636, 1.83996e8, 5.435),
        (5e4, 3500, 25000, 1.86282e8, 0.80455, 8.2733, 3.35410e8, 2.981),
    ],
)
def test_gaussian_band_by_hand(
    height: float,
    width: float,
    centre: float,
    area: float,
    f: float,
    dipole: float,
    rate: float,
    lifetime: float,
) -> None:
    """Worked by hand: area 1.064467 x height x width, then f, dipole, rate and lifetime in vacuum."""
    energy = units.cm1_to_ev(centre)
    assert strength.gaussian_area(height, width) == pytest.approx(area, rel=5e-6)
    assert strength.strength_from_area(area) == pytest.approx(f, rel=1e-5)
    assert strength.absorptivity_max(f, width) == pytest.approx(height, rel=1e-5)
    assert strength.dipole_length(energy, f) == pytest.approx(dipole, rel=1e-5)
    assert strength.einstein_a(energy, f) == pytest.approx(rate, rel=1e-5)
    assert strength.radiative_lifetime_ns(rate) == pytest.approx(lifetime, rel=2e-4)


@pytest.mark.parametrize(
    ("dipole", "energy", "f", "rate", "lifetime", "digits"),
    [
        (5, 3.0, 0.28442, 1.11073e8, 9.003, 2e-5),
        (10, 2.0, 0.75844, 1.31642e8, 7.596, 2e-5),
        # QUEST database, doi 10.1021/acs.jctc.5c00975: BODIPY, trans-azobenzene, streptocyanine C5,
        # anthracene La
        (7.062, 2.771, 0.524, 1.746e8, 5.73, 1e-3),
        (6.731, 4.231, 0.727, 5.647e8, 1.77, 1e-3),
        (9.283, 3.617, 1.182, 6.710e8, 1.49, 1e-3),
        (2.279, 3.757, 0.074, 4.532e7, 22.1, 1.5e-3),
    ],
)
def test_dipole_to_strength_to_rate(
    dipole: float, energy: float, f: float, rate: float, lifetime: float, digits: float
) -> None:
    assert strength.oscillator_strength(energy, dipole) == pytest.approx(f, rel=digits)
    assert strength.einstein_a_from_dipole(energy, dipole) == pytest.approx(rate, rel=2 * digits)
    assert 1e9 / strength.einstein_a_from_dipole(energy, dipole) == pytest.approx(lifetime, rel=4e-3)


def test_bodipy_dipole_lies_within_the_measured_one() -> None:
    """QUEST S1 of BODIPY against pyrromethene 546, 7.1 +/- 1.1 D from lifetimes (doi
    10.1088/2050-6120/4/4/045001).
    """
    assert strength.dipole_length(2.771, 0.524) == pytest.approx(7.1, abs=1.1)


def test_radiative_rate_of_diphenoxy_bodipys() -> None:
    """k = (1.5 +/- 0.1)e8 s^-1 from yields and lifetimes, doi 10.1039/b705921c."""
    rates = strength.radiative_rate([0.16, 0.40, 0.17, 0.44], [1.09, 2.51, 1.11, 2.78])
    assert rates == pytest.approx([1.47e8, 1.59e8, 1.53e8, 1.58e8], rel=4e-3)
    assert np.all(np.abs(rates - 1.5e8) <= 0.1e8)


def test_strength_and_dipole_come_back() -> None:
    energy, f = np.array([[1.5], [3.0]]), np.array([0.01, 0.5, 2.0])
    assert strength.oscillator_strength(energy, strength.dipole_length(energy, f)) == pytest.approx(
        np.broadcast_to(f, (2, 3)), rel=EXACT
    )


def test_integrated_band_returns_its_strength() -> None:
    """Exact: the integral of the drawn band, 4.319e-9 times, is the oscillator strength it was drawn with."""
    wavenumber = np.linspace(10000, 40000, 6001)
    band = strength.gaussian_band(units.cm1_to_ev(wavenumber), 3.1, 0.42, 0.35)
    assert strength.strength_from_area(trapezoid(band, wavenumber)) == pytest.approx(0.42, rel=1e-8)


def test_squared_dipole_of_a_narrow_spectrum() -> None:
    """A narrow band has one wavenumber: mu^2 from the spectrum is mu^2 from f."""
    wavenumber = np.linspace(19000, 21000, 4001)
    band = strength.gaussian_band(units.cm1_to_ev(wavenumber), units.cm1_to_ev(20000), 0.5, 0.01)
    expected = strength.dipole_length(units.cm1_to_ev(20000), 0.5) ** 2
    assert strength.squared_dipole_from_spectrum(wavenumber, band) == pytest.approx(expected, rel=1e-5)


def test_strickler_berg_of_a_narrow_band_is_einstein_a() -> None:
    """Without a Stokes shift, for narrow bands, Strickler-Berg is Einstein A with n^2 (Strickler and Berg
    1962).
    """
    wavenumber = np.linspace(19000, 21000, 4001)
    band = strength.gaussian_band(units.cm1_to_ev(wavenumber), units.cm1_to_ev(20000), 0.5, 0.01)
    rate = strength.strickler_berg(wavenumber, band, wavenumber, band, refractive_index=1.4)
    assert rate == pytest.approx(float(strength.einstein_a(units.cm1_to_ev(20000), 0.5, 1.4)), rel=1e-4)


def test_strickler_berg_takes_the_reciprocal_mean_of_inverse_cubes() -> None:
    """Emission lines of equal photons at 1 and 2 units: <nu^-3>^-1 is 16/9 of the lower cube, not 27/8."""
    absorption, band = np.array([30000.0, 30001.0]), np.array([1e4, 1e4])
    emission = np.array([9999.0, 10000.0, 10001.0, 19999.0, 20000.0, 20001.0])
    photons = np.array([0.0, 1.0, 0.0, 0.0, 1.0, 0.0])
    one = strength.strickler_berg(absorption, band, emission[:3], photons[:3])
    both = strength.strickler_berg(absorption, band, emission, photons)
    assert both / one == pytest.approx(16 / 9, rel=1e-6)


def test_no_rate_means_no_end() -> None:
    assert strength.radiative_lifetime_ns([0.0, 1e9]).tolist() == [np.inf, 1.0]


# ---- polarised light ----


def test_orientation_limits() -> None:
    """IUPAC Gold Book MT07422 and Thulstrup, Aspects of Linear and Magnetic Circular Dichroism: limits of K
    and S.
    """
    assert polarised.saupe([1.0, 1 / 3, 0.0, 0.5]) == pytest.approx([1, 0, -0.5, 0.25], abs=EXACT)
    assert polarised.orientation_factor(polarised.saupe(0.71)) == pytest.approx(0.71, rel=EXACT)
    rod, disc, isotropic = [0, 0, 1], [0.5, 0.5, 0], [1 / 3, 1 / 3, 1 / 3]
    assert polarised.transition_orientation_factor([0, 0, 2], rod) == pytest.approx(1, rel=EXACT)
    assert polarised.transition_orientation_factor([3, 4, 0], disc) == pytest.approx(0.5, rel=EXACT)
    assert polarised.transition_orientation_factor([1, -2, 3], isotropic) == pytest.approx(1 / 3, rel=EXACT)


@pytest.mark.parametrize("factors", [[0.5, 0.6, 0.1], [1.2, -0.2, 0.0], [0.5, 0.5]])
def test_orientation_factors_must_sum_to_one(factors: list[float]) -> None:
    with pytest.raises(ValueError, match="sum to 1"):
        polarised.transition_orientation_factor([0, 0, 1], factors)


def test_aligned_rod_in_stretched_polyethylene() -> None:
    """1,4-bis(phenylethynyl)benzene, K = 0.95 (Nguyen et al., Chem. Phys. 2012): S 0.925, ratio 38, LDr
    0.925.
    """
    parallel, perpendicular = polarised.film_absorption(0.95)
    assert polarised.saupe(0.95) == pytest.approx(0.925, rel=EXACT)
    assert polarised.dichroic_ratio(0.95) == pytest.approx(38.0, rel=EXACT)
    assert polarised.factor_from_dichroic_ratio(38.0) == pytest.approx(0.95, rel=EXACT)
    assert polarised.reduced_dichroism(parallel, perpendicular) == pytest.approx(0.925, rel=EXACT)
    assert polarised.reduced_dichroism_norden(0.925, 0.0) == pytest.approx(2.775, rel=EXACT)


@pytest.mark.parametrize(
    ("angle", "full", "half"),
    [
        (0, 3.0, 1.5),
        (30, 1.875, 0.9375),
        (polarised.MAGIC_ANGLE_DEG, 0, 0),
        (60, -0.375, -0.1875),
        (90, -1.5, -0.75),
    ],
)
def test_reduced_dichroism_in_both_conventions(angle: float, full: float, half: float) -> None:
    """Norden, Appl. Spectrosc. Rev. 14, 157 (1978), is three times the IUPAC definition (Gold Book
    LT07415).
    """
    assert polarised.reduced_dichroism_norden([1.0, 0.5], angle) == pytest.approx([full, half], abs=EXACT)
    factor = polarised.rod_orientation_factor([1.0, 0.5], angle)
    iupac = polarised.reduced_dichroism(*polarised.film_absorption(factor))
    assert 3 * iupac == pytest.approx([full, half], abs=EXACT)


def test_film_keeps_the_isotropic_absorbance() -> None:
    """A_iso = (A_Z + 2 A_Y)/3 (Gold Book LT07415)."""
    parallel, perpendicular = polarised.film_absorption(np.linspace(0, 1, 11))
    assert (parallel + 2 * perpendicular) / 3 == pytest.approx(np.ones(11), rel=EXACT)
    assert polarised.dichroic_ratio(1.0) == np.inf


@pytest.mark.parametrize(("angle", "r0"), [(0, 0.4), (30, 0.25), (45, 0.10), (60, -0.05), (90, -0.2)])
def test_fundamental_anisotropy(angle: float, r0: float) -> None:
    """IUPAC Gold Book ET07370: 2/5 for parallel, -1/5 for perpendicular dipoles."""
    assert polarised.fundamental_anisotropy(angle) == pytest.approx(r0, abs=EXACT)


def test_magic_angle_and_polarisation_limits() -> None:
    """54.7356 degrees; p between -1/3 and 1/2 goes to r between -1/5 and 2/5 (Gold Book ET07370)."""
    assert pytest.approx(54.7356, abs=5e-5) == polarised.MAGIC_ANGLE_DEG
    assert polarised.fundamental_anisotropy(polarised.MAGIC_ANGLE_DEG) == pytest.approx(0, abs=EXACT)
    assert polarised.anisotropy_from_polarisation([0.5, -1 / 3]) == pytest.approx([0.4, -0.2], abs=EXACT)
    assert polarised.polarisation([3, 1], [1, 2]) == pytest.approx([0.5, -1 / 3], abs=EXACT)
    assert polarised.anisotropy([3, 1], [1, 2]) == pytest.approx([0.4, -0.2], abs=EXACT)


def test_isotropic_average_of_cos_squared_is_one_third() -> None:
    """Exact: over the six directions of an octahedron the mean of cos^2 is that of the sphere."""
    octahedron = np.vstack([np.eye(3), -np.eye(3)])
    mean = polarised.share_absorbed([0.3, -1.1, 0.7], octahedron).mean()
    assert mean == pytest.approx(polarised.ISOTROPIC_SHARE, rel=EXACT)


def test_rigid_dye_follows_cos_squared_of_the_polariser() -> None:
    """Malus: light along z, dipole at 25 degrees from x in the host plane, tilted by 40 degrees out of it."""
    tilt, turn = np.radians(40), np.radians(25)
    dipole = [np.cos(tilt) * np.cos(turn), np.cos(tilt) * np.sin(turn), np.sin(tilt)]
    angles = np.array([25.0, 115.0, 70.0])
    share = polarised.rigid_absorption(dipole, np.eye(3), [0, 0, 1], [1, 0, 0], angles)
    assert share == pytest.approx([np.cos(tilt) ** 2, 0, np.cos(tilt) ** 2 / 2], abs=EXACT)


def test_turning_host_and_light_together_changes_nothing() -> None:
    turn = np.array([[0.0, -1.0, 0.0], [0.0, 0.0, -1.0], [1.0, 0.0, 0.0]])
    dipole, angles = np.array([0.2, 0.9, -0.4]), np.arange(0, 180, 15)
    still = polarised.rigid_absorption(dipole, np.eye(3), [0, 0, 1], [1, 0, 0], angles)
    turned = polarised.rigid_absorption(dipole, turn, turn @ [0, 0, 1], turn @ [1, 0, 0], angles)
    assert turned == pytest.approx(still, abs=EXACT)


def test_directions_must_have_a_length() -> None:
    with pytest.raises(ValueError, match="length zero"):
        polarised.share_absorbed([0, 0, 0], [1, 0, 0])
    with pytest.raises(ValueError, match="parallel to propagation"):
        polarised.polariser_fields([0, 0, 1], [0, 0, 3], 0.0)


# ---- transfer ----


def test_forster_radius_of_a_worked_example() -> None:
    """kappa^2 2/3, yield 0.8, n 1.4, J 1e15: 4.797 nm with the constant of Gold Book FT07381 (2.108e-2)."""
    assert transfer.forster_radius_nm(1e15, 0.8, 1.4) == pytest.approx(4.797, rel=3e-4)
    assert transfer.forster_radius_nm(1e15, 0.8, 1.4) == pytest.approx(4.798, abs=5e-4)


def test_overlap_behind_a_published_radius() -> None:
    """Red BODIPY, R0 = 67 +/- 1 angstrom (doi 10.1016/j.saa.2005.09.035) implies J of 5.9e15 for n 1.4,
    yield 1.
    """
    assert transfer.overlap_for_radius(6.7, 1.0, 1.4) == pytest.approx(5.9e15, rel=0.01)
    assert transfer.forster_radius_nm(transfer.overlap_for_radius(6.7, 1.0, 1.4), 1.0, 1.4) == pytest.approx(6.7)


def test_orientation_factor_limits() -> None:
    """IUPAC Gold Book FT07381: in line 4, side by side 1, crossed 0; 2/3 averaged over all directions."""
    x, y = [1, 0, 0], [0, 1, 0]
    assert transfer.kappa2(x, x, x) == pytest.approx(4, rel=EXACT)
    assert transfer.kappa2(x, x, y) == pytest.approx(1, rel=EXACT)
    assert transfer.kappa2(x, y, x) == pytest.approx(0, abs=EXACT)
    axes = np.eye(3)
    mean = transfer.kappa2(axes[:, None], axes[None, :], [0.3, -0.5, 0.8]).mean()
    assert mean == pytest.approx(transfer.KAPPA2_RANDOM, rel=EXACT)


def test_spectral_overlap_of_a_line() -> None:
    """Exact: a narrow emission at 500 nm sees eps lambda^4 there; its scale drops out."""
    wavelength = np.linspace(499, 501, 2001)
    emission = np.exp(-(((wavelength - 500) / 0.05) ** 2))
    overlap = transfer.spectral_overlap(wavelength, 7 * emission, np.full_like(wavelength, 4e4))
    assert overlap == pytest.approx(4e4 * 500**4, rel=1e-6)


def test_half_is_transferred_at_the_radius() -> None:
    assert transfer.transfer_efficiency([5.0, 10.0], 5.0) == pytest.approx([0.5, 1 / 65], rel=EXACT)


# ---- polarity of the medium ----


@pytest.mark.parametrize(("change", "radius", "slope"), [(10, 5, 8054.6), (8, 4, 10068), (5, 3.5, 5870.7)])
def test_lippert_mataga_slope(change: float, radius: float, slope: float) -> None:
    """2 (change of dipole)^2/(h c a^3), worked by hand."""
    assert solvatochromism.lippert_mataga_slope(change, radius) == pytest.approx(slope, rel=3e-5)


@pytest.mark.parametrize(
    ("dielectric", "index", "polarisability"),
    [
        # Minnesota Solvent Descriptor Database: water, acetonitrile, toluene, cyclohexane, n-hexane
        (78.355, 1.3328, 0.3200),
        (35.688, 1.3442, 0.3044),
        (2.3741, 1.4961, 0.0129),
        (2.0165, 1.4266, -0.0022),
        (1.8819, 1.3749, -0.0011),
    ],
)
def test_orientation_polarisability(dielectric: float, index: float, polarisability: float) -> None:
    found = solvatochromism.orientation_polarisability(dielectric, index)
    assert found == pytest.approx(polarisability, abs=6e-5)


def test_shift_between_acetonitrile_and_hexane() -> None:
    """Change of 8 D in a sphere of 4 angstrom: 3064.7 cm^-1 in acetonitrile, -11.2 in n-hexane (worked by
    hand).
    """
    slope = solvatochromism.lippert_mataga_slope(8, 4)
    polarity = solvatochromism.orientation_polarisability([35.688, 1.8819], [1.3442, 1.3749])
    assert slope * polarity == pytest.approx([3064.7, -11.2], abs=0.8)


@pytest.mark.parametrize(("betaine", "et30"), [(731.23, 39.10), (922.29, 31.00), (840.91, 34.00)])
def test_et30_of_betaine_maxima(betaine: float, et30: float) -> None:
    """Betaine-30 in chloroform, n-decane, 2,6-di-tert-butylpyridine (a public set of maxima)."""
    assert solvatochromism.et30(betaine) == pytest.approx(et30, abs=5e-3)


def test_normalised_polarity_scale_runs_to_one_in_water() -> None:
    """Reichardt, Chem. Rev. 94, 2319 (1994): water 63.1 is 1.000, acetonitrile 45.6 is 0.460."""
    assert solvatochromism.et_normalised([63.1, 45.6, 30.7]) == pytest.approx([1.0, 0.460, 0.0], abs=1e-3)
