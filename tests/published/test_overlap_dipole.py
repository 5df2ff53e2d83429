"""The basis rebuilt for libcint is the one inside libxtb and tblite: overlap and dipole over s, p and d."""

from __future__ import annotations

import importlib.util
from dataclasses import replace

import numpy as np
import pytest
from orchil_schemas import BadResult
from orchil_stages.excite.window import check_integrals, molecular_dipole, valence_charges
from orchil_stages.ground_state import Wavefunction, open_ground_state
from orchil_stages.ground_state.basis import basis_map, integrals

from .molecules import SMILES, WITH_D_SHELLS, Embedded, embedded

OVERLAP, DIPOLE_E_BOHR = 1e-6, 1e-5


def _wave(molecule: Embedded, engine: str | None = None) -> Wavefunction:
    if engine is not None and importlib.util.find_spec(engine) is None:
        pytest.skip(f"{engine} is not installed for this CPython")
    state = open_ground_state(molecule.numbers, molecule.charge, None, accuracy=0.01, engine=engine)
    state.evaluate(molecule.positions)
    return state.wavefunction()


@pytest.mark.parametrize("engine", ["xtb", "tblite"])
@pytest.mark.parametrize("name", SMILES)
def test_orbitals_are_orthonormal_and_give_the_dipole(name: str, engine: str) -> None:
    """The engine's own dipole is the outside value."""
    molecule = embedded(name)
    wave = _wave(molecule, engine)
    ints = integrals(molecule.numbers, molecule.positions)
    product = wave.coefficients.T @ ints.overlap @ wave.coefficients
    assert product == pytest.approx(np.eye(len(product)), abs=OVERLAP)
    dipole = molecular_dipole(molecule.numbers, molecule.positions, wave, ints)
    assert dipole == pytest.approx(wave.dipole, abs=DIPOLE_E_BOHR)
    found = check_integrals(molecule.numbers, molecule.positions, wave, ints)
    assert found.overlap_error < OVERLAP
    assert found.dipole_error < DIPOLE_E_BOHR


@pytest.mark.parametrize("name", WITH_D_SHELLS)
@pytest.mark.parametrize("swap", [(0, 1), (2, 4), (1, 3)])
def test_a_wrong_order_of_d_functions_is_caught(name: str, swap: tuple[int, int]) -> None:
    molecule = embedded(name)
    wave = _wave(molecule)
    first = int(np.flatnonzero(basis_map(molecule.numbers).momentum == 2)[0])
    rows = [first + place for place in swap]
    coefficients = wave.coefficients.copy()
    coefficients[rows] = coefficients[rows[::-1]]
    ints = integrals(molecule.numbers, molecule.positions)
    with pytest.raises(BadResult, match="not orthonormal"):
        check_integrals(molecule.numbers, molecule.positions, replace(wave, coefficients=coefficients), ints)


@pytest.mark.parametrize("place", range(5))
def test_a_wrong_sign_of_a_d_function_is_caught(place: int) -> None:
    molecule = embedded("dimethyl sulfone")
    wave = _wave(molecule)
    row = int(np.flatnonzero(basis_map(molecule.numbers).momentum == 2)[0]) + place
    coefficients = wave.coefficients.copy()
    coefficients[row] *= -1
    ints = integrals(molecule.numbers, molecule.positions)
    with pytest.raises(BadResult, match="not orthonormal"):
        check_integrals(molecule.numbers, molecule.positions, replace(wave, coefficients=coefficients), ints)


def test_a_dipole_of_another_density_is_caught() -> None:
    molecule = embedded("water")
    wave = _wave(molecule)
    ints = integrals(molecule.numbers, molecule.positions)
    with pytest.raises(BadResult, match="dipole differs"):
        check_integrals(molecule.numbers, molecule.positions, replace(wave, dipole=wave.dipole + 0.01), ints)


def test_a_missing_basis_function_is_caught() -> None:
    molecule = embedded("water")
    wave = _wave(molecule)
    ints = integrals(molecule.numbers, molecule.positions)
    with pytest.raises(BadResult, match="basis functions rebuilt"):
        check_integrals(molecule.numbers, molecule.positions, replace(wave, coefficients=wave.coefficients[:-1]), ints)


def test_valence_charges_are_those_of_the_main_groups() -> None:
    """Periodic table: electrons outside the noble-gas core and its filled d shell."""
    numbers = np.array([1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 32, 33, 34, 35, 52, 53])
    assert valence_charges(numbers).tolist() == [1, 3, 4, 5, 6, 7, 4, 5, 6, 7, 4, 5, 6, 7, 6, 7]
