"""The vibronic stage: modes, slopes, and the progression of displaced oscillators against exact results."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import Context, Geometry, Inputs, OutOfScope, Progression
from orchil_stages.ground_state import open_ground_state
from orchil_stages.vibronic import AddVibrations, VibronicSettings
from orchil_stages.vibronic.displacements import followed, slopes
from orchil_stages.vibronic.modes import ELECTRON_MASSES, hessian, modes_of_hessian, normal_modes
from orchil_stages.vibronic.progression import huang_rhys, profile
from scipy.integrate import trapezoid

from tests.light_records import CYCLOHEXANE, band, transitions
from tests.prediction import Predictor


def moments(energy, shape):
    mean = trapezoid(energy * shape, energy)
    return trapezoid(shape, energy), mean, trapezoid((energy - mean) ** 2 * shape, energy)


# ---- progression ----


@pytest.mark.parametrize("factor", [0.3, 1.0, 2.5])
def test_lines_follow_poisson(factor):
    """At 0 K the lines of one mode are S^n e^-S/n! (Huang, Rhys 1950)."""
    energy, shape = profile(np.array([factor]), np.array([0.17]), 0.02, 0.0)
    heights = np.interp(0.17 * np.arange(4), energy, shape)
    assert heights / heights[0] == pytest.approx([1, factor, factor**2 / 2, factor**3 / 6], rel=2e-3)
    assert trapezoid(shape, energy) == pytest.approx(1, rel=1e-6)


def test_mean_and_variance_of_the_profile():
    """Sum rules (Lax 1952): mean sum S h nu at any temperature, variance sum S (h nu)^2 (2 n + 1) and the line's."""
    factors, quantum = np.array([0.8, 0.3]), np.array([0.17, 0.05])
    occupied = 1 / np.expm1(quantum / (8.617333e-5 * 300))
    energy, shape = profile(factors, quantum, 0.05, 300.0)
    area, mean, variance = moments(energy, shape)
    assert (area, mean) == (pytest.approx(1, rel=1e-6), pytest.approx(factors @ quantum, rel=1e-5))
    line = 0.05**2 / (8 * np.log(2))
    assert variance == pytest.approx(factors @ (quantum**2 * (2 * occupied + 1)) + line, rel=1e-4)


def test_no_displacement_is_one_line():
    energy, shape = profile(np.zeros(3), np.array([0.1, 0.15, 0.2]), 0.06, 300.0)
    assert shape.max() == pytest.approx(1 / (0.06 * 1.064467), rel=1e-5)
    assert abs(energy[np.argmax(shape)]) < 1e-3


def test_factor_of_a_slope():
    """A shift of Delta in dimensionless units has S = Delta^2/2 and slope h nu Delta."""
    assert huang_rhys(np.array([0.17 * 1.4]), np.array([0.17])) == pytest.approx([1.4**2 / 2], rel=1e-12)


# ---- modes ----


def test_diatomic_on_a_spring():
    """omega = sqrt(k/mu): carbon monoxide's masses and a spring of 1.2 hartree/bohr^2, along z."""
    spring, masses = 1.2, np.array([12.011, 15.999])
    second = np.zeros((6, 6))
    second[np.ix_([2, 5], [2, 5])] = spring * np.array([[1, -1], [-1, 1]])
    found = modes_of_hessian(second, np.array([[0, 0, 0], [0, 0, 2.1]]), masses)
    reduced = masses.prod() / masses.sum() * ELECTRON_MASSES
    assert found.wavenumber_cm1 == pytest.approx([np.sqrt(spring / reduced) * 219474.631], rel=1e-7)
    stretch = found.path_bohr[0, 1, 2] - found.path_bohr[0, 0, 2]
    assert abs(stretch) == pytest.approx((reduced * spring) ** -0.25, rel=1e-7)


def test_hessian_of_a_quadratic_form():
    random = np.random.default_rng(2).normal(size=(6, 6))
    form = random + random.T
    found = hessian(lambda at: (form @ at.ravel()).reshape(2, 3), np.zeros((2, 3)))
    assert found == pytest.approx(form, abs=1e-9)


def test_water_vibrates_where_it_is_measured():
    """3657, 1595, 3756 cm^-1 (NIST; from memory, high); GFN2-xTB is within 8 %."""
    from scipy.optimize import minimize

    numbers, masses = np.array([8, 1, 1]), np.array([15.999, 1.008, 1.008])
    ground = open_ground_state(numbers, 0, None)
    start = np.array([[0, 0, 0.0], [0, 1.43, 1.1], [0, -1.43, 1.1]])

    def energy(flat):
        found = ground.evaluate(flat.reshape(3, 3))
        return found.energy, found.gradient.ravel()

    relaxed = minimize(energy, start.ravel(), jac=True, method="BFGS", options={"gtol": 1e-5}).x.reshape(3, 3)
    found = normal_modes(lambda at: ground.evaluate(at).gradient, relaxed, masses)
    assert found.wavenumber_cm1 == pytest.approx([1595, 3657, 3756], rel=0.08)


# ---- slopes ----


def test_slope_of_a_state_that_crosses_another():
    """The state is followed by its dipole where two cross: slope 0.3 eV of the one along x, not -0.5 of the other."""
    along, across = [8.0, 0, 0], [0, 8.0, 0]
    here = transitions([2.5, 2.51], [1.0, 1.0], [along, across])

    def states_at(displacement):
        q = displacement[0, 0]
        one, other = 2.5 + 0.3 * q, 2.51 - 0.5 * q
        if one < other:
            return transitions([one, other], [1, 1], [along, across])
        return transitions([other, one], [1, 1], [across, along])

    path = np.array([[[1.0, 0, 0]]])
    assert slopes(states_at, here, 0, path) == pytest.approx([0.3], abs=1e-9)
    assert slopes(states_at, here, 1, path) == pytest.approx([-0.5], abs=1e-9)


def test_the_sign_of_a_dipole_does_not_matter():
    here = transitions([2.5], [1.0], [[8.0, 0, 0]])
    assert followed(here, 0, transitions([2.4, 2.6], [1, 1], [[0, 8, 0], [-8, 0, 0]])) == 2.6


# ---- stage ----


def test_large_molecules_are_refused_before_anything_is_computed():
    geometry = Geometry(
        atomic_numbers=[6] * 90, positions_angstrom=np.zeros((90, 3)), charge=0, energy_hartree=0.0,
        gradient_norm=0.0, gradients_used=1, solvation=None, engine="made up",
    )  # fmt: skip
    inputs = Inputs([geometry, CYCLOHEXANE, transitions([2.5], [1.0]), band()])
    with pytest.raises(OutOfScope, match="90 atoms"):
        list(AddVibrations().run(inputs, VibronicSettings(), Context(Path(), 1)))


def test_runs_on_request_only():
    assert AddVibrations.on_request


def test_butadiene_stretches_its_double_bonds(predictor: Predictor, tmp_path: Path):
    """Its first band couples to the C=C stretch above all, near 1640 cm^-1 (resonance Raman of 1,3-butadiene, Chadwick,
    Zgierski, Hudson, J. Chem. Phys. 95, 7204, 1991; from memory, medium).
    """
    found = predictor("C=CC=C", "gas phase")
    inputs = Inputs([found.geometry, found.medium, found.transitions, found.band])
    (made,) = AddVibrations().run(inputs, VibronicSettings(), Context(tmp_path, 1))
    assert isinstance(made, Progression)
    assert 1550 < made.wavenumber_cm1[0] < 1800
    assert made.reorganisation_ev == pytest.approx(made.huang_rhys @ made.wavenumber_cm1 / 8065.544, rel=1e-6)
    top = made.wavelength_nm[np.argmax(made.molar_absorptivity)]
    assert top == pytest.approx(found.band.absorption_max_nm, abs=2)
    assert made.zero_zero_nm >= top - 2
    area = trapezoid(made.molar_absorptivity[::-1], 1239.842 / made.wavelength_nm[::-1])
    assert area == pytest.approx(found.band.molar_absorptivity * found.band.width_ev * 1.064467, rel=0.02)
    assert {(one.name, one.unit) for one in made.quantities()} == {(i.name, i.unit) for i in Progression.offers}
