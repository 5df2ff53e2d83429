"""The polarisation stage: limits of orientation that hold exactly, conventions, settings."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Context, Inputs, Orientation
from orchil_stages.optics import polarised
from orchil_stages.polarisation import PolarisationSettings, Polarise
from orchil_stages.polarisation.frame import factors_from_order, factors_from_shape, inertial_axes, undefined_axes
from orchil_stages.polarisation.settings import rotation
from pydantic import ValidationError
from scipy.spatial.transform import Rotation

from tests.light_records import band, rod, transitions

EXACT = 1e-10
E500 = HC_EV_NM / 500


def run(dipoles, energies=(E500,), strengths=(1.0,), geometry=None, **settings) -> Orientation:
    states = transitions(list(energies), list(strengths), dipoles)
    inputs = Inputs([geometry or rod(), states, band()])
    (found,) = Polarise().run(inputs, PolarisationSettings(**settings), Context(Path(), 1))
    return found


def tilted(angle_deg: float) -> list[float]:
    """A dipole of 8 debye in the plane at an angle to the long axis x of the rod."""
    turn = np.radians(angle_deg)
    return [8 * np.cos(turn), 8 * np.sin(turn), 0.0]


# ---- the molecule ----


def test_axes_of_a_flat_rod():
    found = run([tilted(0)])
    assert np.abs(found.axes) == pytest.approx(np.eye(3), abs=EXACT)
    assert np.linalg.det(found.axes) == pytest.approx(1, abs=EXACT)
    # 4 steps of 1.4 angstrom, 1.4 across, 1.7 (Bondi) beyond the carbon centres on every side
    assert found.half_lengths_angstrom == pytest.approx([2.8 + 1.7, 0.7 + 1.7, 1.7], abs=0.01)


def test_angles_of_transitions_to_axes_and_to_each_other():
    found = run([tilted(0), tilted(30), [0, 0, 5]], (E500, 3, 4), (1, 1, 1))
    assert found.transition_axes_deg == pytest.approx(np.array([[0, 90, 90], [30, 60, 90], [90, 90, 0]]), abs=1e-6)
    assert found.to_reported_deg == pytest.approx([0, 30, 90], abs=1e-6)
    assert run([[0, 4, 3]]).plane_angle_deg == pytest.approx(np.degrees(np.arcsin(0.6)), rel=1e-9)


def test_open_axes_are_named():
    """A benzene-like top has no long axis (degenerate moments), a ball none at all."""
    assert undefined_axes(np.array([1.0, 1.0, 2.0])) == "long and short axis"
    assert undefined_axes(np.array([0.0, 1.0, 1.0])) == "short axis and normal"
    assert undefined_axes(np.ones(3)) == "long, short and normal axis"
    assert undefined_axes(np.array([1.0, 2.0, 3.0])) is None


def test_moments_of_inertia_rise():
    masses, positions = np.array([1.0, 2.0, 1.0]), np.array([[0, 0, 0], [3.0, 0, 0], [0, 1.0, 0]])
    moments = inertial_axes(masses, positions)[1]
    centred = positions - masses @ positions / 4
    assert moments.sum() == pytest.approx(2 * masses @ (centred**2).sum(axis=1), rel=EXACT)
    assert np.all(np.diff(moments) >= 0)


# ---- film ----


@pytest.mark.parametrize(
    ("s", "angle", "norden"), [(0.925, 0, 2.775), (0.5, 0, 1.5), (0.5, 90, -0.75), (0.5, 60, -0.1875)]
)
def test_film_of_rods_in_both_conventions(s, angle, norden):
    """Norden, Appl. Spectrosc. Rev. 14, 157 (1978); the IUPAC value (Gold Book LT07415) is a third of it."""
    found = run([tilted(angle)], order_parameter=s)
    assert found.reduced_linear_dichroism_norden == pytest.approx(norden, abs=1e-9)
    assert found.reduced_linear_dichroism == pytest.approx(norden / 3, abs=1e-9)
    assert found.order_parameter == pytest.approx(s, rel=EXACT)
    assert found.order_from == "settings"


def test_dichroic_ratio_of_a_published_rod():
    """1,4-bis(phenylethynyl)benzene, K = 0.95 (Nguyen et al., Chem. Phys. 2012), long-axis transition: ratio 38."""
    found = run([tilted(0)], order_parameter=0.925)
    assert found.orientation_factor == pytest.approx(0.95, rel=EXACT)
    assert found.dichroic_ratio == pytest.approx(38.0, rel=EXACT)
    assert found.state_dichroic_ratio == pytest.approx([38.0], rel=EXACT)


def test_at_the_magic_angle_a_film_shows_nothing():
    found = run([tilted(polarised.MAGIC_ANGLE_DEG)], order_parameter=0.9)
    assert found.reduced_linear_dichroism == pytest.approx(0, abs=EXACT)
    assert found.dichroic_ratio == pytest.approx(1, rel=EXACT)


def test_overlapping_bands_of_crossed_dipoles_weaken_the_dichroism():
    """Equal bands along x and y at one place: K is the mean of both, (0.95 + 0.025)/2."""
    both = run([tilted(0), tilted(90)], (E500, E500), (0.5, 0.5), order_parameter=0.925)
    assert both.orientation_factor == pytest.approx((0.95 + 0.025) / 2, rel=1e-9)
    assert both.state_dichroic_ratio[1] < 1 < both.state_dichroic_ratio[0]


def test_a_disc_in_the_film():
    """K of 1/2 for both axes in the plane, 0 for the normal (Thulstrup): S of 1/4 twice."""
    assert factors_from_order(0.25, 0.25) == pytest.approx([0.5, 0.5, 0], abs=EXACT)
    assert factors_from_order(0.0, None) == pytest.approx([1 / 3] * 3, abs=EXACT)
    with pytest.raises(ValueError, match="not sum to more than 1/2"):
        factors_from_order(0.9, 0.3)


def test_order_from_the_shape_is_flagged_and_grows_with_the_length():
    short, long = (run([tilted(0)], geometry=rod(n)) for n in (3, 9))
    assert 0 < short.order_parameter < long.order_parameter < 1
    assert short.order_from == "shape"
    assert any("estimated from the shape" in text for text in short.cautions)
    assert not run([tilted(0)], order_parameter=0.5).cautions
    assert factors_from_shape(np.ones(3)) == pytest.approx([1 / 3] * 3)


# ---- rigid molecule ----


def test_a_flat_molecule_follows_malus():
    """cos^2 of the polariser angle, three times that of the isotropic solution at the top, nothing across."""
    found = run([tilted(30)])
    assert found.polariser_absorption == pytest.approx(3 * np.cos(np.radians(found.polariser_deg - 30)) ** 2, abs=1e-9)
    assert found.polariser_max_deg == pytest.approx(30, abs=1e-9)
    assert found.polariser_contrast == pytest.approx(1, abs=EXACT)


def test_light_along_the_dipole_sees_nothing_else_than_the_rest():
    """Along z a dipole in z does not absorb; a small one across does with full contrast."""
    along = run([[0, 0, 8]], long_axis=(0, 0, 1), normal=(1, 0, 0), propagation=(1, 0, 0), polariser_zero=(0, 0, 1))
    assert along.polariser_contrast == pytest.approx(0, abs=EXACT)


def test_two_ways_to_turn_agree():
    """Euler angles and reference axes of the same rotation."""
    turn = Rotation.from_euler("ZYX", (40, 25, -10), degrees=True).as_matrix()
    by_axes = PolarisationSettings(long_axis=tuple(turn[:, 0]), normal=tuple(turn[:, 2]))
    assert rotation(by_axes) == pytest.approx(turn, abs=1e-9)
    assert rotation(PolarisationSettings(euler_deg=(40, 25, -10))) == pytest.approx(turn, abs=1e-9)
    lit = {"propagation": (0.3, -0.2, 1.0), "polariser_zero": (1, 0.5, 0)}
    one = run([tilted(20)], euler_deg=(40, 25, -10), **lit)
    two = run([tilted(20)], long_axis=tuple(turn[:, 0]), normal=tuple(turn[:, 2]), **lit)
    assert one.polariser_absorption == pytest.approx(two.polariser_absorption, abs=1e-9)


def test_turning_about_the_normal_turns_the_polariser():
    assert run([tilted(0)], euler_deg=(50, 0, 0)).polariser_max_deg == pytest.approx(50, abs=1e-9)


def test_equal_crossed_transitions_have_no_contrast():
    found = run([tilted(0), tilted(90)], (E500, E500), (0.5, 0.5))
    assert found.polariser_contrast == pytest.approx(0, abs=1e-9)
    assert found.polariser_absorption == pytest.approx(np.full(13, 1.5), abs=1e-9)


def test_mean_over_all_directions_is_the_isotropic_one():
    """The trace of the absorption tensor is one: over the three axes the mean of 3 e^T T e is 1."""
    tensor = run([tilted(10), [1, 2, 3]], (E500, 2.6), (1, 0.5)).absorption_tensor
    assert np.mean([3 * e @ tensor @ e for e in np.eye(3)]) == pytest.approx(1, rel=EXACT)


# ---- photoselection ----


@pytest.mark.parametrize(("angle", "r0"), [(0, 0.4), (30, 0.25), (45, 0.1), (polarised.MAGIC_ANGLE_DEG, 0), (90, -0.2)])
def test_anisotropy_when_exciting_a_second_band(angle, r0):
    """IUPAC Gold Book ET07370: r0 = (3 cos^2 - 1)/5 between the absorbing and the emitting dipole."""
    found = run([tilted(0), tilted(angle)], (E500, 6.0), (1.0, 1.0), excitation_nm=HC_EV_NM / 6.0)
    assert found.fundamental_anisotropy == pytest.approx(r0, abs=1e-9)
    assert found.excitation_nm == pytest.approx(HC_EV_NM / 6.0)


def test_a_light_that_nothing_absorbs_is_taken_at_the_reported_band():
    assert run([tilted(0)], excitation_nm=3000.0, at_nm=3000.0).fundamental_anisotropy == pytest.approx(0.4, abs=EXACT)


def test_a_transition_without_dipole_has_no_direction():
    found = run([[0, 0, 0]], strengths=(0.0,))
    assert found.dichroic_ratio == pytest.approx(1, rel=1e-9)
    assert found.fundamental_anisotropy == 0
    assert any("not defined" in text for text in found.cautions)


@pytest.mark.parametrize(
    ("wrong", "says"),
    [
        ({"order_parameter_short": 0.1}, "needs order_parameter"),
        ({"order_parameter": 0.9, "order_parameter_short": 0.3}, "not sum to more than 1/2"),
        ({"long_axis": (1, 0, 0)}, "give both"),
        ({"long_axis": (1, 0, 0), "normal": (2, 0, 0)}, "must not be parallel"),
        ({"euler_deg": (0, 0, 0), "long_axis": (1, 0, 0), "normal": (0, 0, 1)}, "not both"),
        ({"propagation": (1, 0, 0)}, "parallel to propagation"),
        ({"order_parameter": 1.0}, "less than or equal to 0.999"),
    ],
)
def test_settings_are_checked(wrong, says):
    with pytest.raises(ValidationError, match=says):
        PolarisationSettings(**wrong)


def test_every_quantity_is_offered_with_its_unit():
    made = run([tilted(0)]).quantities()
    assert {(one.name, one.unit) for one in made} == {(info.name, info.unit) for info in Orientation.offers}
