"""The check by TD-DFT: published energies of small molecules, the medium, matching of states."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from ase.build import molecule
from orchil_schemas import (
    BadInput,
    Context,
    DftCheck,
    FloatArray,
    Geometry,
    Inputs,
    Medium,
    OutOfScope,
    StateAnalysis,
    Transitions,
)
from orchil_stages.dft import CheckByDft
from orchil_stages.dft.compute import DftStates, dft_states
from orchil_stages.dft.match import likeness, matched, remarks
from orchil_stages.dft.settings import DftSettings
from orchil_stages.dft.stage import dft_check
from orchil_stages.excite import Excite
from orchil_stages.excite.analysis import Populations
from orchil_stages.optics.units import EA0_DEBYE

GAS = Medium(name="gas phase", dielectric_constant=1.0, refractive_index=1.0)
WATER = Medium(name="water", dielectric_constant=78.4, refractive_index=1.333, solvation="h2o")
DENSE = Medium(name="dense", dielectric_constant=78.4, refractive_index=1.8)
SMALL = DftSettings(basis="sto-3g", functional="hf", roots=3)


def geometry_of(name: str) -> Geometry:
    atoms = molecule(name)
    return Geometry(
        atomic_numbers=atoms.numbers,
        positions_angstrom=atoms.positions,
        charge=0,
        energy_hartree=0.0,
        gradient_norm=0.0,
        gradients_used=0,
        solvation=None,
        engine="none",
    )


FORMALDEHYDE = geometry_of("H2CO")


@pytest.fixture(scope="module")
def excited(tmp_path_factory: pytest.TempPathFactory) -> Inputs:
    inputs = Inputs([FORMALDEHYDE, GAS])
    made = Excite().run(inputs, Excite.Settings(), Context(tmp_path_factory.mktemp("excite"), 1))
    return Inputs([FORMALDEHYDE, GAS, *made])


@pytest.fixture(scope="module")
def checked(excited: Inputs, tmp_path_factory: pytest.TempPathFactory) -> DftCheck:
    context = Context(tmp_path_factory.mktemp("dft"), 1)
    (made,) = CheckByDft().run(excited, DftSettings(roots=2), context)
    assert isinstance(made, DftCheck)
    return made


def test_n_to_pi_star_of_formaldehyde(checked: DftCheck) -> None:
    """1A2 at 3.966 eV, forbidden (QUEST database, doi 10.1021/acs.jctc.5c00975); wB97X-D is within 0.3 eV there."""
    assert checked.energy_ev[0] == pytest.approx(3.966, abs=0.25)
    assert checked.oscillator_strength[0] < 1e-4
    assert all(checked.converged)
    assert checked.optical_dielectric_constant is None


def test_it_is_matched_to_the_semi_empirical_n_to_pi_star_state(checked: DftCheck, excited: Inputs) -> None:
    state = int(checked.matched_state[0])
    analysis = excited[StateAnalysis]
    assert analysis.hole_pi_share[state] < 0.1
    assert analysis.electron_pi_share[state] > 0.9
    assert checked.match[0] > 0.7
    difference = checked.energy_ev[0] - excited[Transitions].energy_ev[state]
    assert checked.energy_difference_ev[0] == pytest.approx(difference)


def test_quantities_are_offered(checked: DftCheck) -> None:
    assert {quantity.name for quantity in checked.quantities()} == {info.name for info in checked.offers}


def test_amplitudes_are_normalised_and_the_allowed_state_lies_along_the_axis() -> None:
    """A1 and B2 of C2v lie along CO and across it in the plane (character table)."""
    found = dft_states(FORMALDEHYDE, GAS, SMALL)
    np.testing.assert_allclose(found.spread.hole.sum(axis=1), 1.0, atol=1e-6)
    np.testing.assert_allclose(found.spread.electron.sum(axis=1), 1.0, atol=1e-6)
    bright = found.dipoles[found.strengths > 0.05]
    assert len(bright)
    assert (np.sort(np.abs(bright), axis=1)[:, :2] < 1e-3).all()
    assert found.hole_pi[0] < 0.01
    assert found.electron_pi[0] > 0.99


def test_n_to_pi_star_moves_to_the_blue_in_water() -> None:
    """The usual negative solvatochromism of n-pi* bands of carbonyls (Reichardt, Solvents and Solvent Effects)."""
    gas, water = (dft_states(FORMALDEHYDE, medium, SMALL) for medium in (GAS, WATER))
    assert 0.02 < water.energies[0] - gas.energies[0] < 0.5
    assert water.optical == pytest.approx(1.333**2)


def test_the_fast_polarisation_is_that_of_the_medium_and_not_of_water() -> None:
    """Linear response lowers a bright state by its own reaction field, more so at larger n; dark ones stay."""
    settings = DftSettings(basis="sto-3g", functional="hf", roots=4)
    thin, dense = (dft_states(geometry_of("C2H4"), medium, settings) for medium in (WATER, DENSE))
    bright = int(np.argmax(thin.strengths))
    assert thin.strengths[bright] > 0.3
    assert dense.energies[int(np.argmax(dense.strengths))] < thin.energies[bright] - 0.02


@pytest.mark.parametrize(
    ("settings", "what"),
    [
        (DftSettings(functional="nonsense"), "functional 'nonsense'"),
        (DftSettings(basis="nonsense"), "basis 'nonsense'"),
    ],
)
def test_unknown_names_are_refused(settings: DftSettings, what: str) -> None:
    with pytest.raises(BadInput, match=what):
        dft_states(FORMALDEHYDE, GAS, settings)


def test_a_molecule_that_is_too_large_is_refused(excited: Inputs, tmp_path: Path) -> None:
    with pytest.raises(OutOfScope, match="4 atoms, and"):
        list(CheckByDft().run(excited, DftSettings(largest=3), Context(tmp_path, 1)))


def test_the_function_alone_gives_the_record_of_the_stage(excited: Inputs) -> None:
    made = dft_check(FORMALDEHYDE, GAS, excited[Transitions], excited[StateAnalysis], SMALL)
    assert len(made.energy_ev) == len(made.matched_state) == 3
    assert "hf/sto-3g" in made.method
    assert made.basis_functions == 12  # 5 + 5 + 1 + 1


def as_dft(excited: Inputs, order: list[int], turn: FloatArray) -> DftStates:
    """States of the semi-empirical model as if TD-DFT had found them, in another order and with turned dipoles."""
    transitions, analysis = excited[Transitions], excited[StateAnalysis]
    return DftStates(
        energies=transitions.energy_ev[order] + 0.1,
        strengths=transitions.oscillator_strength[order],
        dipoles=transitions.transition_dipole_debye[order] @ turn.T / EA0_DEBYE,
        spread=Populations(analysis.hole_by_atom[order], analysis.electron_by_atom[order]),
        hole_pi=analysis.hole_pi_share[order],
        electron_pi=analysis.electron_pi_share[order],
        converged=(True,) * len(order),
        basis_functions=1,
        optical=None,
    )


def test_equal_states_find_each_other_whatever_their_order(excited: Inputs) -> None:
    transitions, analysis = excited[Transitions], excited[StateAnalysis]
    order = [3, 0, 4, 5]
    dft = as_dft(excited, order, -np.eye(3))
    found = matched(dft, transitions, analysis)
    assert found.state.tolist() == order
    np.testing.assert_allclose(found.likeness, 1.0, atol=1e-3)
    np.testing.assert_allclose(found.difference, 0.1)
    assert found.angle.max() < 1e-3
    assert not any("counterpart" in line for line in remarks(dft, found, transitions))


def test_a_turned_dipole_is_reported_as_an_angle(excited: Inputs) -> None:
    transitions, analysis = excited[Transitions], excited[StateAnalysis]
    turn = np.array([[1, 0, 0], [0, np.cos(0.5), -np.sin(0.5)], [0, np.sin(0.5), np.cos(0.5)]])
    strong = int(np.argmax(transitions.oscillator_strength[:6]))
    dft = as_dft(excited, [strong], turn)
    found = matched(dft, transitions, analysis)
    assert found.angle[0] == pytest.approx(np.degrees(0.5), abs=1.0)
    assert any("turned by" in line for line in remarks(dft, found, transitions))
    assert likeness(dft, transitions, analysis).max() <= 1.0
