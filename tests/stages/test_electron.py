"""Where the electron goes: fragments, populations, natural transition orbitals and their files."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest
from ase.build import molecule
from orchil_schemas import BadInput, FloatArray, Geometry, Medium, StateAnalysis
from orchil_stages.electron import write_cube, write_molden
from orchil_stages.electron.character import character, pi_populations
from orchil_stages.electron.fragments import fragments
from orchil_stages.electron.orbitals import transition_orbitals
from orchil_stages.electron.report import state_analysis
from orchil_stages.excite.analysis import populations
from orchil_stages.excite.model import open_states, solve_states
from orchil_stages.excite.parameters import trained_parameters
from orchil_stages.excite.response import States, prepare
from orchil_stages.excite.stage import ExciteSettings
from orchil_stages.excite.window import Window
from orchil_stages.ground_state import BOHR_ANGSTROM
from pyscf.tools import molden
from rdkit import Chem, rdBase
from rdkit.Chem import rdDistGeom, rdForceFieldHelpers, rdMolTransforms

GAS = Medium(name="gas phase", dielectric_constant=1.0, refractive_index=1.0)
# dimethylamino to nitro across two rings: the dihedral between the rings is turned
DONOR_ACCEPTOR = "CN(C)c1ccc(cc1)-c1ccc([N+](=O)[O-])cc1"


def built(smiles: str, twist: float | None = None) -> Geometry:
    """A force-field structure; ``twist`` sets the angle between the two rings."""
    drawn = Chem.AddHs(Chem.MolFromSmiles(smiles))
    with rdBase.BlockLogs():
        assert rdDistGeom.EmbedMolecule(drawn, randomSeed=11) == 0
        rdForceFieldHelpers.MMFFOptimizeMolecule(drawn)
    if twist is not None:
        (match,) = drawn.GetSubstructMatches(Chem.MolFromSmarts("cc-!@cc"), maxMatches=1)
        begin, one, other, end = match
        rdMolTransforms.SetDihedralDeg(drawn.GetConformer(), begin, one, other, end, twist)
    return as_geometry([atom.GetAtomicNum() for atom in drawn.GetAtoms()], drawn.GetConformer().GetPositions())


def as_geometry(numbers: Sequence[int], positions: FloatArray) -> Geometry:
    return Geometry(
        atomic_numbers=numbers,
        positions_angstrom=positions,
        charge=0,
        energy_hartree=0.0,
        gradient_norm=0.0,
        gradients_used=0,
        solvation=None,
        engine="none",
    )


def solved(geometry: Geometry) -> tuple[States, Window]:
    opened = open_states(geometry, GAS, 16, 16)
    states, _ = solve_states(prepare(opened.window), trained_parameters(), GAS, opened.wave.dipole, 12)
    return states, opened.window


@pytest.fixture(scope="module")
def formaldehyde() -> Geometry:
    atoms = molecule("H2CO")
    return as_geometry(atoms.numbers, atoms.positions)


@pytest.fixture(scope="module")
def twisted() -> dict[float, StateAnalysis]:
    return {angle: state_analysis(*solved(built(DONOR_ACCEPTOR, angle))) for angle in (0.0, 90.0)}


@pytest.mark.parametrize(
    ("smiles", "names"),
    [
        (DONOR_ACCEPTOR, ["C2H6N", "C6H4", "C6H4", "NO2"]),
        ("c1ccc(/N=N/c2ccccc2)cc1", ["C6H5", "C6H5", "N2"]),
        ("c1ccc2ccccc2c1", ["C10H8"]),
        ("O=C1c2ccccc2C(=O)c2ccccc21", ["C14H8O2"]),
        ("C=CC=C", ["C4H6"]),
    ],
)
def test_fragments_are_ring_systems_and_what_hangs_on_them(smiles: str, names: list[str]) -> None:
    geometry = built(smiles)
    made = fragments(np.asarray(geometry.atomic_numbers), np.asarray(geometry.positions_angstrom) / BOHR_ANGSTROM)
    assert sorted(made.names) == sorted(names)
    assert made.summed(np.ones(len(geometry.atomic_numbers))).sum() == len(geometry.atomic_numbers)


def test_the_electron_goes_from_the_donor_to_the_acceptor(twisted: dict[float, StateAnalysis]) -> None:
    """Common practice: dimethylamino gives, nitro takes; the first band of such a dye is a charge-transfer band."""
    found = twisted[0.0]
    state = found.reported_state
    donor, acceptor = found.fragment_names.index("C2H6N"), found.fragment_names.index("NO2")
    moved = found.electron_by_fragment[state] - found.hole_by_fragment[state]
    assert moved[acceptor] > 0.2
    assert moved[donor] < -0.1
    assert found.fragment_transfer_share[state] > 0.4
    assert found.dipole_change_debye[state] > 5


def test_a_twist_between_donor_and_acceptor_takes_overlap_and_strength(twisted: dict[float, StateAnalysis]) -> None:
    """Twisted intramolecular charge transfer (Grabowski, Rotkiewicz, Rettig, Chem. Rev. 103, 3899, 2003): at 90 degrees
    the charge-transfer state is nearly decoupled, so its transition is dark.
    """
    flat, square = twisted[0.0], twisted[90.0]
    pi = (square.hole_pi_share > 0.8) & (square.electron_pi_share > 0.8)
    transfer = np.flatnonzero(pi & (square.fragment_transfer_share > 0.8))
    assert transfer.size
    state = int(transfer[0])
    assert square.reason[state] in {"overlap", "forbidden"}
    assert square.hole_electron_overlap[state] < 0.5 * flat.hole_electron_overlap[flat.reported_state]
    assert flat.reason[flat.reported_state] == ""


def test_populations_add_up_and_split_by_plane(formaldehyde: Geometry) -> None:
    states, window = solved(formaldehyde)
    total, pi = populations(states, window), pi_populations(states, window)
    assert (pi.hole <= total.hole + 1e-9).all()
    is_like = character(total, pi)
    # n-pi*: the hole is the lone pair of oxygen in the plane, the electron the pi* orbital
    assert is_like.hole_pi[0] < 0.01
    assert is_like.electron_pi[0] > 0.99
    assert is_like.overlap[0] < 0.05
    assert total.hole[0, formaldehyde.atomic_numbers == 8].sum() > 0.6
    found = state_analysis(states, window)
    np.testing.assert_allclose(found.hole_by_atom.sum(axis=1), 1.0, atol=1e-3)
    np.testing.assert_allclose(found.electron_by_fragment.sum(axis=1), 1.0, atol=1e-3)


def test_quantities_are_those_of_the_reported_state(twisted: dict[float, StateAnalysis]) -> None:
    found = twisted[0.0]
    values = {quantity.name: quantity.value for quantity in found.quantities()}
    assert values.keys() == {info.name for info in found.offers}
    assert values["charge_transfer_share"] == found.charge_transfer_share[found.reported_state]
    assert values["dark_states_below"] == found.reported_state


def test_natural_transition_orbitals_rebuild_the_amplitudes() -> None:
    """Martin 2003: weights sum to 1 and the pairs give the transition density back."""
    amplitudes = np.random.default_rng(2).normal(size=(5, 7))
    amplitudes /= np.linalg.norm(amplitudes)
    made = transition_orbitals(amplitudes)
    assert made.weights.sum() == pytest.approx(1.0)
    assert (np.diff(made.weights) <= 0).all()
    rebuilt = np.einsum("p,pi,pa->ia", np.sqrt(made.weights), made.hole, made.electron)
    np.testing.assert_allclose(rebuilt, amplitudes, atol=1e-12)


def test_molden_file_reads_back(formaldehyde: Geometry, tmp_path: Path) -> None:
    """PySCF reads the file again: orthonormal orbitals, the hole of n-pi* is odd under the mirror across the plane."""
    path = tmp_path / "state.molden"
    write_molden(formaldehyde, GAS, 0, path)
    read, _, vectors, weights, names, _ = molden.load(str(path))
    found = [str(name).lower() for name in names]
    assert {"1h", "1e"} <= set(found)
    assert weights[0] > 0.9
    gram = vectors.T @ read.intor("int1e_ovlp") @ vectors
    np.testing.assert_allclose(gram, np.eye(len(gram)), atol=1e-3)
    moments = np.einsum("xij,ik,jl->xkl", read.intor("int1e_r"), vectors, vectors)
    np.testing.assert_allclose(moments[:, 0, found.index("1e")], 0.0, atol=1e-3)


def test_cube_files_hold_normalised_orbitals(formaldehyde: Geometry, tmp_path: Path) -> None:
    hole, electron = write_cube(formaldehyde, GAS, 0, tmp_path, ExciteSettings(states=2), points=40)
    for path in (hole, electron):
        lines = path.read_text(encoding="utf-8").split("\n")
        assert int(lines[2].split()[0]) == 4
        steps = np.array([[float(word) for word in line.split()[1:]] for line in lines[3:6]])
        values = np.array(" ".join(lines[10:]).split(), dtype=float)
        assert (values**2).sum() * np.linalg.det(steps) == pytest.approx(1.0, abs=0.05)


def test_a_state_that_is_not_there_is_refused(formaldehyde: Geometry, tmp_path: Path) -> None:
    with pytest.raises(BadInput, match="numbered 0 to 11"):
        write_molden(formaldehyde, GAS, 12, tmp_path / "none.molden")
