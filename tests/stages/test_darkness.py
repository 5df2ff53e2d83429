"""Point groups, representations and reasons against character tables and group theory.

Tables: Cotton, Chemical Applications of Group Theory, 3rd ed., Wiley 1990 (from memory, high). Structures: the G2 set
as ASE carries it, and rings made by hand.
"""

from __future__ import annotations

import numpy as np
import pytest
from ase import Atoms
from ase.build import molecule
from orchil_schemas import FloatArray
from orchil_stages.darkness.irreps import Irreps, irreps
from orchil_stages.darkness.operations import TOLERANCE_ANGSTROM, symmetry_group
from orchil_stages.darkness.reason import contributions, reasons, symmetry
from orchil_stages.darkness.representation import turned
from orchil_stages.excite.parameters import trained_parameters
from orchil_stages.excite.response import States, hamiltonian, prepare, solve
from orchil_stages.excite.window import Window, open_window
from orchil_stages.ground_state import BOHR_ANGSTROM, open_ground_state
from orchil_stages.ground_state.basis import basis_map, integrals
from scipy.spatial.transform import Rotation

TIGHT = 0.05


def ring(count: int, height: float = 0.0, turn: float = 0.0, element: str = "C", radius: float = 1.4) -> Atoms:
    angles = 2 * np.pi * np.arange(count) / count + turn
    places = np.stack([radius * np.cos(angles), radius * np.sin(angles), np.full(count, height)], axis=1)
    return Atoms([element] * count, places)


def found(atoms: Atoms, tolerance: float = TIGHT) -> Irreps:
    numbers, positions = np.asarray(atoms.numbers), np.asarray(atoms.positions)
    return irreps(symmetry_group(numbers, positions, tolerance), numbers, positions)


# name of the group, its representations, those of x, y, z: Cotton's tables
TABLES = {
    "C1": (Atoms("CNOF", [(0, 0, 0), (1.2, 0, 0), (0, 1.3, 0), (0.2, 0.3, 1.4)]), "A", "A"),
    "Cs": (molecule("CH3CH2OH"), "A' A''", "A' A''"),
    "C2v": (molecule("H2O"), "A1 A2 B1 B2", "A1 B1 B2"),
    "C3v": (molecule("NH3"), "A1 A2 E", "A1 E"),
    "Td": (molecule("CH4"), "A1 A2 E T1 T2", "T2"),
    "D2h": (molecule("C2H4"), "Ag Au B1g B1u B2g B2u B3g B3u", "B1u B2u B3u"),
    "D3d": (molecule("C2H6"), "A1g A1u A2g A2u Eg Eu", "A2u Eu"),
    "D2d": (molecule("C3H4_D2d"), "A1 A2 B1 B2 E", "B2 E"),
    "D6h": (molecule("C6H6"), "A1g A1u A2g A2u B1g B1u B2g B2u E1g E1u E2g E2u", "A2u E1u"),
    "D5h": (ring(5), "A1' A1'' A2' A2'' E1' E1'' E2' E2''", "A2'' E1'"),
    "D4h": (ring(4), "A1g A1u A2g A2u B1g B1u B2g B2u Eg Eu", "A2u Eu"),
    "D3h": (ring(3), "A1' A1'' A2' A2'' E' E''", "A2'' E'"),
    "D5d": (ring(5, 1) + ring(5, -1, np.pi / 5), "A1g A1u A2g A2u E1g E1u E2g E2u", "A2u E1u"),
    "D4d": (ring(4, 1) + ring(4, -1, np.pi / 4), "A1 A2 B1 B2 E1 E2 E3", "B2 E1"),
    "C4v": (ring(4) + Atoms("N", [(0, 0, 1)]), "A1 A2 B1 B2 E", "A1 E"),
    "C5v": (ring(5) + Atoms("N", [(0, 0, 1)]), "A1 A2 E1 E2", "A1 E1"),
    "D3": (ring(3, 1) + ring(3, -1, 0.3), "A1 A2 E", "A2 E"),
    "D2": (ring(2, 1) + ring(2, -1, 0.4), "A B1 B2 B3", "B1 B2 B3"),
    "C3": (ring(3, 1) + ring(3, -1, 0.3, "N"), "A E", "A E"),
    "C3h": (ring(3) + ring(3, 0, 0.3, "N", 2.5), "A' A'' E' E''", "A'' E'"),
    "C4h": (ring(4) + ring(4, 0, 0.3, "N", 2.5), "Ag Au Bg Bu Eg Eu", "Au Eu"),
    "C2h": (ring(2) + ring(2, 0, 0.9, "N", 2.5), "Ag Au Bg Bu", "Au Bu"),
    "S4": (
        ring(2, 1) + ring(2, -1, np.pi / 2) + ring(2, 1.7, 0.4, "N", 2) + ring(2, -1.7, np.pi / 2 + 0.4, "N", 2),
        "A B E",
        "B E",
    ),
    "Oh": (
        Atoms("C6", 2.0 * np.vstack([np.eye(3), -np.eye(3)])),
        "A1g A1u A2g A2u Eg Eu T1g T1u T2g T2u",
        "T1u",
    ),
}


@pytest.mark.parametrize("name", TABLES)
def test_representations_of_a_group(name: str) -> None:
    atoms, labels, allowed = TABLES[name]
    table = found(atoms)
    assert table.point_group == name
    assert set(table.labels) == set(labels.split())
    assert {label for label, may in zip(table.labels, table.allowed, strict=True) if may} == set(allowed.split())


@pytest.mark.parametrize("name", ["C2v", "C3v", "D2h", "D6h", "Td", "Oh", "D4d"])
def test_characters_are_orthogonal_and_dimensions_fill_the_group(name: str) -> None:
    """The great orthogonality theorem: sum over g of chi chi' is h delta, and squares of dimensions sum to h."""
    characters = found(TABLES[name][0]).characters
    order = characters.shape[1]
    np.testing.assert_allclose(characters @ characters.T, order * np.eye(len(characters)), atol=1e-6)
    assert (characters[:, 0] ** 2).sum() == pytest.approx(order)


def test_linear_molecules_are_treated_in_their_largest_common_subgroup() -> None:
    assert found(molecule("C2H2")).point_group == "D2h"
    assert found(molecule("HCN")).point_group == "C2v"


@pytest.mark.parametrize("name", ["H2O", "C6H6", "C4H4NH", "C2H6", "C3H4_D2d"])
def test_labels_do_not_depend_on_orientation_and_order(name: str) -> None:
    atoms = molecule(name)
    turn = Rotation.from_euler("xyz", [0.3, 1.1, -0.7]).as_matrix()
    order = np.random.default_rng(3).permutation(len(atoms))
    moved = Atoms(atoms.numbers[order], (atoms.positions @ turn.T + 5.0)[order])
    assert found(moved).labels == found(atoms).labels
    assert found(moved).point_group == found(atoms).point_group


def test_a_structure_that_is_nearly_symmetric_is_taken_as_symmetric_and_its_error_reported() -> None:
    atoms = molecule("C6H6")
    shaken = np.random.default_rng(5).uniform(-0.005, 0.005, atoms.positions.shape)
    shaken[:, 2] *= 20  # a shallow ripple out of the plane: 0.1 angstrom
    positions = atoms.positions + shaken
    group = symmetry_group(np.asarray(atoms.numbers), positions, TOLERANCE_ANGSTROM)
    assert group.order == 24
    assert 0.05 < group.miss < TOLERANCE_ANGSTROM
    assert symmetry_group(np.asarray(atoms.numbers), positions, 0.01).order < 24


def test_alternating_bonds_are_seen_within_a_loose_tolerance() -> None:
    """Kekule benzene, bonds of 1.34 and 1.46 angstrom: D3h, although no atom misses D6h by more than 0.1 angstrom."""
    angles = np.radians([-28.6, 28.6, 91.4, 148.6, 211.4, 268.6])
    atoms = Atoms("C6", np.stack([1.4 * np.cos(angles), 1.4 * np.sin(angles), 0 * angles], axis=1))
    assert found(atoms, TOLERANCE_ANGSTROM).point_group == "D3h"


@pytest.mark.parametrize("name", ["CH4", "C6H6", "SO2"])
def test_turned_functions_keep_the_overlap_matrix(name: str) -> None:
    """S between the atomic functions of a symmetric molecule is the same after any operation (s, p and d shells)."""
    atoms = molecule(name)
    numbers = np.asarray(atoms.numbers)
    overlap = integrals(numbers, np.asarray(atoms.positions) / BOHR_ANGSTROM).overlap
    group = symmetry_group(numbers, np.asarray(atoms.positions), TIGHT)
    assert group.order >= 4
    for operation in group.operations:
        matrix = turned(operation, np.eye(len(overlap)), basis_map(numbers))
        np.testing.assert_allclose(matrix.T @ overlap @ matrix, overlap, atol=1e-3)


@pytest.fixture(scope="module")
def window() -> Window:
    return window_of(molecule("C6H6"))


def window_of(atoms: Atoms) -> Window:
    numbers, positions = np.asarray(atoms.numbers), np.asarray(atoms.positions) / BOHR_ANGSTROM
    ground = open_ground_state(numbers, 0, None)
    ground.evaluate(positions)
    wave, ints = ground.wavefunction(), integrals(numbers, positions)
    return open_window(numbers, positions, wave, ints, occupied=12, virtual=12)


def states_of(window: Window) -> States:
    return solve(hamiltonian(prepare(window), trained_parameters()), window, 12)


def test_states_of_benzene_carry_their_textbook_representations(window: Window) -> None:
    """Pi-pi* of D6h: e1g to e2u gives B2u, B1u and E1u, and only E1u absorbs (Cotton)."""
    states = states_of(window)
    sym = symmetry(states, window)
    pi = [place for place in range(12) if sym.hole[place] == "E1g" and sym.electron[place] == "E2u"]
    assert {sym.labels[place] for place in pi} == {"B1u", "B2u", "E1u"}
    names = reasons(states, sym, contributions(states, window))
    for place in pi:
        assert (names[place] == "forbidden") == (sym.labels[place] != "E1u")
    np.testing.assert_allclose(sym.shares, 1.0, atol=0.02)


def test_states_without_allowed_part_have_no_dipole(window: Window) -> None:
    """The vanishing-integral rule, both ways, on a flat and a non-planar molecule."""
    for one in (window, window_of(molecule("C3H4_D2d")), window_of(molecule("H2CO"))):
        states = states_of(one)
        allowed = symmetry(states, one).allowed
        lengths = np.linalg.norm(states.dipoles, axis=1)
        assert lengths[allowed < 1e-4].max(initial=0.0) < 1e-2
        assert (allowed[lengths > 0.05] > 0.9).all()
        assert (allowed < 1e-4).any()


def test_contributions_add_up_to_the_transition_dipole(window: Window) -> None:
    states = states_of(window)
    made = contributions(states, window)
    lengths = np.linalg.norm(states.dipoles, axis=1)
    along: FloatArray = made.positive + made.negative
    assert (along <= lengths + 1e-9).all()
    strong = lengths > 1.0
    np.testing.assert_allclose(along[strong], lengths[strong], rtol=0.05)
    assert (made.positive >= 0).all()
    assert (made.negative <= 0).all()
