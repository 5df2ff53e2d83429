"""Triplets from the Hamiltonian of the singlets: what the spin changes, and the record."""

from __future__ import annotations

import numpy as np
import pytest
from ase.build import molecule
from orchil_schemas import Geometry, Medium
from orchil_stages.electron.report import triplets_record
from orchil_stages.electron.triplets import (
    TripletNumbers,
    triplet_hamiltonian,
    triplet_numbers,
    triplet_states,
)
from orchil_stages.excite.model import Opened, open_states, solve_states
from orchil_stages.excite.parameters import start_parameters, trained_parameters
from orchil_stages.excite.report import transitions_record
from orchil_stages.excite.response import Prepared, hamiltonian, prepare

GAS = Medium(name="gas phase", dielectric_constant=1.0, refractive_index=1.0)
WATER = Medium(name="water", dielectric_constant=78.4, refractive_index=1.333, solvation="h2o")
NONE = TripletNumbers(transition=0.0, attraction=0.0, constant=0.0)


@pytest.fixture(scope="module")
def opened() -> Opened:
    atoms = molecule("C6H6")
    geometry = Geometry(
        atomic_numbers=atoms.numbers,
        positions_angstrom=atoms.positions,
        charge=0,
        energy_hartree=0.0,
        gradient_norm=0.0,
        gradients_used=0,
        solvation=None,
        engine="none",
    )
    return open_states(geometry, GAS, 12, 12)


@pytest.fixture(scope="module")
def prepared(opened: Opened) -> Prepared:
    return prepare(opened.window)


def test_without_extra_terms_singlet_and_triplet_differ_by_twice_the_exchange(prepared: Prepared) -> None:
    """A_S - A_T = 2 K, positive semidefinite where K is an interaction of charges with a positive kernel (Szabo,
    Ostlund, Modern Quantum Chemistry, section on CIS, from memory).
    """
    parameters = start_parameters()
    twice = hamiltonian(prepared, parameters) - triplet_hamiltonian(prepared, parameters, NONE)
    assert np.linalg.norm(twice) > 1.0
    assert np.linalg.eigvalsh(twice).min() > -1e-8


def test_the_lowest_triplet_lies_below_the_lowest_singlet(opened: Opened, prepared: Prepared) -> None:
    """Hund's rule for one configuration; benzene 4.16 and 5.05 eV (QUEST)."""
    for parameters, numbers in ((start_parameters(), NONE), (trained_parameters(), triplet_numbers())):
        triplets = triplet_states(prepared, parameters, numbers, GAS, opened.wave.dipole)
        singlets, _ = solve_states(prepared, parameters, GAS, opened.wave.dipole, 4)
        assert triplets.energies[0] < singlets.energies[0]
        assert (np.diff(triplets.energies) >= 0).all()


def test_lowest_triplet_of_benzene_is_one_state_and_the_next_are_a_pair(opened: Opened, prepared: Prepared) -> None:
    """3B1u, then 3E1u: Cotton, and QUEST 4.16 and 4.85 eV (from memory)."""
    energies = triplet_states(prepared, trained_parameters(), triplet_numbers(), GAS, opened.wave.dipole).energies
    assert energies[1] - energies[0] > 0.1
    assert energies[2] - energies[1] < 1e-2


def test_medium_terms_do_not_reach_triplets_through_a_transition_dipole(opened: Opened, prepared: Prepared) -> None:
    """Spin-forbidden: the red shift of a strong band by its own dipole has no counterpart."""
    shifts = []
    for medium in (GAS, WATER):
        found = triplet_states(prepared, trained_parameters(), triplet_numbers(), medium, np.zeros(3))
        assert not found.dipoles.any()
        shifts.append(found.energies)
    np.testing.assert_allclose(np.diff(shifts[1] - shifts[0]), 0.0, atol=1e-6)


def test_record_and_quantities(opened: Opened, prepared: Prepared) -> None:
    states, _ = solve_states(prepared, trained_parameters(), GAS, opened.wave.dipole, 4)
    singlets = transitions_record(states, opened.window)
    made = triplets_record(singlets, prepared, trained_parameters(), GAS, opened.wave.dipole)
    by_name = {quantity.name: quantity for quantity in made.quantities()}
    assert by_name.keys() == {info.name for info in made.offers}
    assert made.triplet_low_ev < by_name["triplet_ev"].value < made.triplet_high_ev
    assert made.singlet_triplet_gap_ev == pytest.approx(states.energies[0] - made.energy_ev[0], abs=0.02)
    assert made.triplet_ev < made.energy_ev[0]  # the measured one is relaxed
