"""GFN2-xTB from two independent programs: libxtb and tblite must give the same numbers.

Tolerances: both converge their densities far below them at this accuracy; what is left between them is the
last digits of physical constants.
"""

from __future__ import annotations

import importlib.util

import numpy as np
import pytest
from orchil_schemas import BadResult, OutOfScope
from orchil_stages.ground_state import (
    HARTREE_EV,
    SOLVATION_SETS,
    Evaluation,
    GroundState,
    check_result,
    engine_names,
    open_ground_state,
)

from .molecules import SMILES, embedded

ENGINES = ("xtb", "tblite")
TIGHT = 0.01
ENERGY_HARTREE, GRADIENT, DIPOLE_E_BOHR, LEVEL_HARTREE, CHARGE_E = 2e-6, 1e-5, 1e-3, 1e-5, 1e-4
BOND_ORDER = 1e-3
STEP_BOHR, SLOPE = 1e-3, 1e-6


def _state(name: str, solvation: str | None, engine: str) -> tuple[GroundState, Evaluation]:
    if importlib.util.find_spec(engine) is None:
        pytest.skip(f"{engine} is not installed for this CPython")
    molecule = embedded(name)
    state = open_ground_state(molecule.numbers, molecule.charge, solvation, accuracy=TIGHT, engine=engine)
    return state, state.evaluate(molecule.positions)


@pytest.mark.parametrize("solvation", [None, "h2o", "toluene"])
@pytest.mark.parametrize("name", SMILES)
def test_two_programs_agree(name: str, solvation: str | None) -> None:
    (one, here), (other, there) = (_state(name, solvation, engine) for engine in ENGINES)
    assert here.energy == pytest.approx(there.energy, abs=ENERGY_HARTREE)
    assert here.gradient == pytest.approx(there.gradient, abs=GRADIENT)
    first, second = one.wavefunction(), other.wavefunction()
    assert first.dipole == pytest.approx(second.dipole, abs=DIPOLE_E_BOHR)
    assert first.energies == pytest.approx(second.energies, abs=LEVEL_HARTREE)
    assert first.occupations == pytest.approx(second.occupations, abs=1e-6)
    assert first.charges == pytest.approx(second.charges, abs=CHARGE_E)


@pytest.mark.parametrize("solvation", SOLVATION_SETS)
def test_two_programs_hold_the_same_solvents(solvation: str) -> None:
    (_, here), (_, there) = (_state("water", solvation, engine) for engine in ENGINES)
    _, gas = _state("water", None, ENGINES[0])
    assert here.energy == pytest.approx(there.energy, abs=ENERGY_HARTREE)
    assert here.energy < gas.energy - 1e-4


@pytest.mark.parametrize("engine", ENGINES)
@pytest.mark.parametrize(
    ("name", "solvation"),
    [("dimethyl sulfone", None), ("thiophene", "toluene"), ("iodoethene", None), ("4-nitrophenolate", "h2o")],
)
def test_gradient_is_the_slope_of_the_energy(name: str, solvation: str | None, engine: str) -> None:
    """Central difference along one direction in which every atom moves."""
    state, here = _state(name, solvation, engine)
    start = embedded(name).positions
    direction = np.random.default_rng(1).standard_normal(start.shape)
    direction /= np.linalg.norm(direction)
    up, down = (state.evaluate(start + step * direction).energy for step in (STEP_BOHR, -STEP_BOHR))
    assert (up - down) / (2 * STEP_BOHR) == pytest.approx(float((here.gradient * direction).sum()), abs=SLOPE)


@pytest.mark.parametrize("engine", engine_names())
def test_no_force_on_the_whole_molecule(engine: str) -> None:
    _, found = _state("thiophene", "h2o", engine)
    assert found.gradient.sum(axis=0) == pytest.approx(np.zeros(3), abs=1e-6)


@pytest.mark.parametrize("engine", engine_names())
def test_water_has_the_published_energy(engine: str) -> None:
    """Documentation of the xtb program, GFN2-xTB energy of relaxed water (from memory): -5.0705 hartree."""
    state, found = _state("water", None, engine)
    assert found.energy == pytest.approx(-5.0705, abs=2e-3)  # this structure is not quite relaxed
    homo = state.wavefunction().energies[3] * HARTREE_EV
    assert homo == pytest.approx(-12.1, abs=0.3)  # same source, same caveat


@pytest.mark.parametrize(("numbers", "charge"), [([7, 8], 0), ([8, 1, 1], 1), ([6, 1, 1, 1], 0)])
def test_open_shells_are_refused(numbers: list[int], charge: int) -> None:
    """NO, the water radical cation, methyl: the programs themselves would go on with half-filled orbitals."""
    with pytest.raises(OutOfScope, match="odd number of electrons"):
        open_ground_state(np.array(numbers), charge, None)


def test_unknown_solvents_are_refused_by_name() -> None:
    with pytest.raises(OutOfScope, match=r"'treacle'.*toluene"):
        open_ground_state(np.array([8, 1, 1]), 0, "treacle")


@pytest.mark.parametrize("engine", engine_names())
def test_results_before_an_evaluation_are_refused(engine: str) -> None:
    state = open_ground_state(np.array([8, 1, 1]), 0, None, engine=engine)
    with pytest.raises(RuntimeError, match="evaluate a geometry first"):
        state.wavefunction()


@pytest.mark.parametrize(
    ("energy", "charges", "what"),
    [
        (np.nan, [0.0, 0.0], "not a number"),
        (-5.0, [0.5, 0.0], "impossible"),
        (-5.0, [4.0, -4.0], "impossible"),
    ],
)
def test_impossible_numbers_are_refused(energy: float, charges: list[float], what: str) -> None:
    with pytest.raises(BadResult, match=what):
        check_result(Evaluation(energy, np.zeros((2, 3))), np.array(charges), 0)
