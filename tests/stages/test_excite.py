"""The excitation model: contract, derivatives, smoothness, invariance, and what is said about a state.

All with the untrained numbers, so that nothing here depends on a training run.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from orchil_schemas import (
    BadResult,
    Context,
    FloatArray,
    Geometry,
    Inputs,
    Medium,
    Orbitals,
    Transitions,
)
from orchil_stages.excite import Excite
from orchil_stages.excite.analysis import (
    angle_to_axis,
    bonding_normals,
    fixed_sign,
    leading_pairs,
    long_axis,
    populations,
)
from orchil_stages.excite.bright import first_bright, strongest_state
from orchil_stages.excite.model import open_states, solve_states
from orchil_stages.excite.parameters import Parameters, index, load_parameters, names, start_parameters
from orchil_stages.excite.response import States, prepare
from orchil_stages.excite.solvation import SOLVENT_NAMES
from orchil_stages.ground_state import BOHR_ANGSTROM, GroundState, open_ground_state
from orchil_stages.medium import lookup
from orchil_stages.training.derivatives import energy_gradient
from rdkit import Chem, rdBase
from rdkit.Chem import rdDistGeom, rdMolTransforms
from scipy.spatial.transform import Rotation

from tests.prediction import Predictor

# CODATA 2018
DEBYE_PER_E_BOHR, DEBYE_PER_E_ANGSTROM, EV_PER_HARTREE = 2.541746473, 4.803204713, 27.211386245988
GAS, WATER = lookup("gas phase"), lookup("water")
NITROANILINE = "Nc1ccc([N+](=O)[O-])cc1"
NITROBIPHENYL = "Nc1ccc(cc1)-c1ccc([N+](=O)[O-])cc1"
NITRO_THIOPHENE = "Nc1ccc([N+](=O)[O-])s1"

Run = Callable[..., tuple[Orbitals, Transitions]]


@pytest.fixture
def run(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Run:
    """The stage with the untrained numbers."""
    monkeypatch.setattr("orchil_stages.excite.parameters.trained_parameters", start_parameters)
    stage = Excite()

    def call(geometry: Geometry, medium: Medium = GAS, **settings: int) -> tuple[Orbitals, Transitions]:
        made = list(stage.run(Inputs([geometry, medium]), stage.Settings(**settings), Context(tmp_path, 1)))
        orbitals, transitions, *_ = made
        assert isinstance(orbitals, Orbitals)
        assert isinstance(transitions, Transitions)
        return orbitals, transitions

    return call


def _embedded(smiles: str) -> Chem.Mol:
    molecule = Chem.AddHs(Chem.MolFromSmiles(smiles))
    with rdBase.BlockLogs():
        assert rdDistGeom.EmbedMolecule(molecule, randomSeed=7) == 0
    return molecule


def _geometry(molecule: Chem.Mol) -> Geometry:
    return _placed(
        np.array([atom.GetAtomicNum() for atom in molecule.GetAtoms()]),
        np.array(molecule.GetConformer().GetPositions()),
        Chem.GetFormalCharge(molecule),
    )


def _placed(numbers: FloatArray, positions: FloatArray, charge: int = 0) -> Geometry:
    return Geometry(
        atomic_numbers=numbers,
        positions_angstrom=positions,
        charge=charge,
        energy_hartree=0.0,
        gradient_norm=0.0,
        gradients_used=0,
        solvation=None,
        engine="none",
    )


# the contract


def test_records_are_whole_and_ordered(run: Run, predictor: Predictor) -> None:
    geometry = predictor(NITROANILINE, "gas phase").geometry
    orbitals, found = run(geometry)
    assert len(found.energy_ev) == Excite().Settings().states >= 10
    assert (np.diff(found.energy_ev) >= 0).all()
    assert (found.oscillator_strength >= 0).all()
    for share in (found.overlap, found.charge_transfer_share, found.pi_share, found.leading_weight):
        assert ((share >= 0) & (share <= 1)).all()
    assert ((found.long_axis_angle_deg >= 0) & (found.long_axis_angle_deg <= 90)).all()
    assert (orbitals.occupied_window, orbitals.virtual_window) == (16, 16)
    assert orbitals.gap_ev == pytest.approx(orbitals.lumo_ev - orbitals.homo_ev)
    assert orbitals.overlap_error < 1e-5
    assert orbitals.dipole_error_debye < 1e-3
    assert orbitals.partial_charges_e.sum() == pytest.approx(0, abs=1e-6)


def test_numbers_of_a_state_agree_with_each_other(run: Run, predictor: Predictor) -> None:
    """f = 2/3 E mu^2 in atomic units; one electron moved by one angstrom is 4.803 D."""
    _, found = run(predictor(NITROANILINE, "gas phase").geometry)
    squared = (found.transition_dipole_debye**2).sum(axis=1) / DEBYE_PER_E_BOHR**2
    expected = 2 / 3 * found.energy_ev / EV_PER_HARTREE * squared
    assert found.oscillator_strength == pytest.approx(expected, rel=1e-6, abs=1e-12)
    assert found.electron_shift_angstrom == pytest.approx(np.linalg.norm(found.shift_angstrom, axis=1))
    expected = -found.shift_angstrom * DEBYE_PER_E_ANGSTROM
    assert found.dipole_change_debye == pytest.approx(expected, rel=1e-6, abs=1e-9)


def test_the_same_work_gives_the_same_records(run: Run, predictor: Predictor) -> None:
    geometry = predictor(NITRO_THIOPHENE, "gas phase").geometry
    first, second = (tuple(record.digest for record in run(geometry, WATER)) for _ in range(2))
    assert first == second


def test_more_states_leave_the_lower_ones_alone(run: Run, predictor: Predictor) -> None:
    geometry = predictor(NITRO_THIOPHENE, "gas phase").geometry
    few, many = (run(geometry, WATER, states=count)[1].energy_ev for count in (5, 20))
    assert len(many) == 20
    assert few == pytest.approx(many[:5], abs=1e-9)


@pytest.mark.parametrize(("smiles", "occupied", "virtual", "states"), [("O", 4, 2, 8), ("C=O", 6, 4, 12)])
def test_small_molecules_have_small_windows(smiles: str, occupied: int, virtual: int, states: int, run: Run) -> None:
    """Water: 4 valence pairs in 6 functions, so 8 single excitations; formaldehyde: 6 pairs in 10."""
    orbitals, found = run(_geometry(_embedded(smiles)))
    assert (orbitals.occupied_window, orbitals.virtual_window) == (occupied, virtual)
    assert len(found.energy_ev) == states


def test_without_virtual_orbitals_nothing_is_excited(run: Run) -> None:
    """Fluoride in its valence basis is full."""
    with pytest.raises(BadResult, match="nothing can be excited"):
        run(_placed(np.array([9]), np.zeros((1, 3)), -1))


def test_a_negative_excitation_is_refused(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    low = start_parameters().vector
    low[index()["constant"]] = -20.0
    monkeypatch.setattr("orchil_stages.excite.parameters.trained_parameters", lambda: Parameters(low))
    with pytest.raises(BadResult, match="no sound closed-shell ground state"):
        run(_geometry(_embedded("C=O")))


# derivatives


@pytest.mark.parametrize(("medium", "state"), [(GAS, 0), (WATER, 0), (WATER, 2)])
def test_gradient_over_the_trained_numbers(medium: Medium, state: int, predictor: Predictor) -> None:
    """Hellmann-Feynman against central differences, exact as long as the solvent numbers are zero."""
    geometry = predictor(NITRO_THIOPHENE, "gas phase").geometry
    opened = open_states(geometry, medium, 8, 8)
    prepared, dipole = prepare(opened.window), opened.wave.dipole
    vector = _moved_off_the_start()

    def energy(at: FloatArray) -> float:
        return float(solve_states(prepared, Parameters(at), medium, dipole, 6)[0].energies[state])

    states, terms = solve_states(prepared, Parameters(vector), medium, dipole, 6)
    assert np.diff(states.energies).min() > 1e-3  # no crossing within the step
    found = energy_gradient(prepared, Parameters(vector), states.amplitudes[state], terms[state])
    step = 1e-5
    moves = step * np.eye(len(vector))
    expected = np.array([energy(vector + move) - energy(vector - move) for move in moves]) / (2 * step)
    assert found == pytest.approx(expected, rel=1e-4, abs=1e-6)
    assert np.count_nonzero(np.abs(found) > 1e-3) > 40


def _moved_off_the_start() -> FloatArray:
    vector = start_parameters().vector
    change = 0.05 * np.random.default_rng(5).standard_normal(len(vector))
    change[[index()[name] for name in SOLVENT_NAMES]] = 0.0
    return vector + change


def test_parameter_file_may_lack_names_but_not_invent_them() -> None:
    some = load_parameters('{"parameters": {"gap_scale": 1.5}}')
    assert some["gap_scale"] == 1.5
    assert some["coulomb_length"] == start_parameters()["coulomb_length"]
    with pytest.raises(ValueError, match="unknown parameters: gap_scales"):
        load_parameters('{"parameters": {"gap_scales": 1.5}}')
    assert len(set(names())) == len(names()) == len(start_parameters().vector)


# smoothness and invariance


def _twisted(smiles: str, angles: range) -> Iterator[Geometry]:
    """One embedded biaryl with its torsion set to each angle (degrees), all else kept."""
    molecule = _embedded(smiles)
    torsion = molecule.GetSubstructMatch(Chem.MolFromSmarts("c:c-!@c:c"))
    for angle in angles:
        rdMolTransforms.SetDihedralDeg(molecule.GetConformer(), *torsion, float(angle))
        yield _geometry(molecule)


def test_energies_are_smooth_along_a_torsion(run: Run) -> None:
    """Biphenyl in 8 steps to square: sorted energies are continuous, losing conjugation raises the first.

    Measured: planar fluorene at 302 nm, twisted biphenyl at 247 nm (from memory, high).
    """
    found = np.array([run(place)[1].energy_ev[:6] for place in _twisted("c1ccc(cc1)-c1ccccc1", range(20, 100, 10))])
    assert np.abs(np.diff(found, axis=0)).max() < 0.2
    assert (np.diff(found[:, 0]) > 0).all()


def test_first_bright_energy_has_no_jump_along_a_torsion(run: Run) -> None:
    """4-amino-4'-nitrobiphenyl: its charge-transfer state crosses dark states and keeps its course."""
    found = [run(place)[1] for place in _twisted(NITROBIPHENYL, range(10, 90, 10))]
    states = [first_bright(states.energy_ev, states.oscillator_strength) for states in found]
    energies = np.array([states.energy_ev[n] for states, n in zip(found, states, strict=True)])
    assert len(set(states)) > 1
    assert np.abs(np.diff(energies)).max() < 0.25
    assert np.abs(np.diff(energies, 2)).max() < 0.1


def test_turning_and_moving_the_molecule_changes_no_energy(
    run: Run, predictor: Predictor, monkeypatch: pytest.MonkeyPatch
) -> None:
    def tight(*species: Any, **settings: Any) -> GroundState:
        return open_ground_state(*species, **(settings | {"accuracy": 1e-4}))

    monkeypatch.setattr("orchil_stages.excite.model.open_ground_state", tight)
    geometry = predictor(NITROANILINE, "gas phase").geometry
    turn, turned = _turned(geometry)
    (_, here), (_, there) = run(geometry), run(turned)
    assert here.energy_ev == pytest.approx(there.energy_ev, abs=1e-6)
    assert here.oscillator_strength == pytest.approx(there.oscillator_strength, abs=1e-6)
    assert here.pi_share == pytest.approx(there.pi_share, abs=1e-5)
    assert here.long_axis_angle_deg[:4] == pytest.approx(there.long_axis_angle_deg[:4], abs=0.1)
    assert here.shift_angstrom @ turn.T == pytest.approx(there.shift_angstrom, abs=1e-4)
    dipoles = here.transition_dipole_debye @ turn.T
    signs = np.sign((dipoles * there.transition_dipole_debye).sum(axis=1))
    assert dipoles * signs[:, None] == pytest.approx(there.transition_dipole_debye, abs=1e-4)


def test_in_a_solvent_turning_changes_next_to_nothing(run: Run, predictor: Predictor) -> None:
    """The surface of the solvent cavity is summed over a grid with fixed directions."""
    geometry = predictor(NITROANILINE, "gas phase").geometry
    _, turned = _turned(geometry)
    energies = [run(place, WATER)[1].energy_ev for place in (geometry, turned)]
    assert energies[0] == pytest.approx(energies[1], abs=1e-3)


def _turned(geometry: Geometry) -> tuple[FloatArray, Geometry]:
    """A rotation matrix, and the geometry rotated by it and moved away."""
    turn = Rotation.random(rng=np.random.default_rng(11)).as_matrix()
    places = geometry.positions_angstrom @ turn.T + np.array([3.0, -2.0, 7.0])
    return turn, geometry.model_copy(update={"positions_angstrom": places})


# what a state is


def test_the_electron_of_nitroaniline_moves_to_the_nitro_group(run: Run, predictor: Predictor) -> None:
    """Push-pull chromophore: the dipole moment grows, from about 6 to 14 D or more (Liptay; from memory)."""
    geometry = predictor(NITROANILINE, "gas phase").geometry
    nitrogen = np.flatnonzero(geometry.atomic_numbers == 7)
    amino, nitro = geometry.positions_angstrom[nitrogen]
    towards = (nitro - amino) / np.linalg.norm(nitro - amino)
    orbitals, found = run(geometry)
    state = first_bright(found.energy_ev, found.oscillator_strength)
    assert found.shift_angstrom[state] @ towards > 0.5
    assert found.dipole_change_debye[state] @ orbitals.dipole_debye > 0
    assert found.long_axis_angle_deg[state] < 5
    assert found.pi_share[state] > 0.95


def test_first_state_of_formaldehyde_leaves_the_plane_on_one_side(run: Run, predictor: Predictor) -> None:
    """1A2, n-pi*: forbidden, HOMO to LUMO, one of its two orbitals is pi (textbook; QUEST)."""
    _, found = run(predictor("C=O", "gas phase").geometry)
    assert found.oscillator_strength[0] < 1e-4
    assert (found.leading_from[0], found.leading_to[0]) == (0, 0)
    assert found.pi_share[0] == pytest.approx(0.5, abs=0.05)


def test_populations_are_whole_particles(predictor: Predictor) -> None:
    opened = open_states(predictor(NITROANILINE, "gas phase").geometry, WATER, 16, 16)
    states, _ = solve_states(prepare(opened.window), start_parameters(), WATER, opened.wave.dipole, 12)
    found = populations(states, opened.window)
    assert found.hole.sum(axis=1) == pytest.approx(np.ones(12))
    assert found.electron.sum(axis=1) == pytest.approx(np.ones(12))
    assert (found.hole > -1e-12).all()
    assert (found.electron > -1e-12).all()
    assert (found.transferred <= 1).all()
    # Cauchy-Schwarz: full overlap only where nothing is transferred
    assert (found.overlap <= np.sqrt(1 - found.transferred**2) + 1e-9).all()


def test_angle_to_axis() -> None:
    vectors = np.array([[2.0, 0, 0], [-1, 1, 0], [0, 0, 3], [0, 0, 0], [1, np.sqrt(3), 0]])
    found = angle_to_axis(vectors, np.array([1.0, 0, 0]))
    assert found == pytest.approx([0, 45, 90, 90, 60])


def test_fixed_sign_makes_the_largest_component_positive() -> None:
    vectors = np.array([[0.1, -2.0, 1.0], [3.0, -1.0, 0.0], [0, 0, 0]])
    assert fixed_sign(vectors).tolist() == [[-0.1, 2.0, -1.0], [3.0, -1.0, 0.0], [0, 0, 0]]
    assert (fixed_sign(-vectors) == fixed_sign(vectors)).all()


def test_leading_pairs_are_counted_from_the_gap() -> None:
    amplitudes = np.zeros((2, 3, 2))
    amplitudes[0, 2, 0] = 1.0  # HOMO to LUMO
    amplitudes[1, 0, 1], amplitudes[1, 1, 0] = -np.sqrt(0.7), np.sqrt(0.3)
    found = leading_pairs(States(np.zeros(2), amplitudes, np.zeros((2, 3))))
    assert found.start.tolist() == [0, 2]
    assert found.end.tolist() == [0, 1]
    assert found.weight == pytest.approx([1.0, 0.7])


def test_long_axis_of_a_rod_is_its_own() -> None:
    positions = np.array([[0, 0, 0], [0, 2.0, 0], [0, 4.0, 0], [0.5, 2.0, 0]])
    axis = long_axis(np.ones(4), positions)
    assert np.abs(axis) == pytest.approx([0, 1, 0], abs=1e-9)


def test_normals_of_a_flat_molecule_are_parallel() -> None:
    geometry = _geometry(_embedded("c1ccsc1"))
    normals = bonding_normals(geometry.atomic_numbers, geometry.positions_angstrom / BOHR_ANGSTROM)
    assert np.linalg.norm(normals, axis=1) == pytest.approx(np.ones(len(normals)))
    assert np.abs(normals @ normals[0]) == pytest.approx(np.ones(len(normals)), abs=0.02)


@pytest.mark.parametrize(
    ("energies", "strengths", "first", "strongest"),
    [
        ([2.0, 3.0, 3.5], [0.001, 0.5, 0.6], 1, 2),  # a dark n-pi* state lies below
        ([2.0, 3.0, 3.9], [0.02, 0.3, 1.0], 1, 2),  # below a twentieth of the strongest
        ([3.0, 3.5, 6.0], [0.03, 0.02, 2.0], 0, 0),  # the far ultraviolet is out of reach
        ([3.0, 3.5], [0.001, 0.004], 1, 1),  # all dark: the least dark
    ],
)
def test_first_bright(energies: list[float], strengths: list[float], first: int, strongest: int) -> None:
    assert first_bright(np.array(energies), np.array(strengths)) == first
    assert strongest_state(np.array(energies), np.array(strengths)) == strongest
