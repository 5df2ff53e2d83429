"""Starting structures: known shapes, kept stereo and charge, and what happens when nothing fits."""

from __future__ import annotations

import re
import time
from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import BadInput, Conformers, Context, Identity, Inputs, NotConverged
from orchil_stages.embed import Embed, EmbedSettings
from orchil_stages.embed.ladder import LADDER, embed_structures
from pydantic import ValidationError
from rdkit import Chem
from rdkit.Chem import rdMolTransforms

PLAIN = EmbedSettings()

SIX_HELICENE = "c1ccc2c(c1)ccc1ccc3ccc4ccc5ccccc5c4c3c12"
BODIPY = "F[B-]1(F)n2cccc2C=C2C=CC=[N+]21"
IMPOSSIBLE = "CC1(C)[C@@H]2CC[C@]1(C)c1nc3ccccc3nc12"
POSSIBLE = IMPOSSIBLE.replace("[C@]1(C)", "[C@@]1(C)")


def molecule_of(smiles: str, conformers: Conformers, index: int = 0) -> Chem.Mol:
    """The embedded structure as an RDKit molecule."""
    molecule = Chem.AddHs(Chem.MolFromSmiles(smiles))
    conformer = Chem.Conformer(molecule.GetNumAtoms())
    for atom, place in enumerate(conformers.positions_angstrom[index]):
        conformer.SetAtomPosition(atom, place.tolist())
    molecule.AddConformer(conformer)
    return molecule


def length(smiles: str, pattern: str, conformers: Conformers) -> float:
    """First match of a two-atom pattern, angstrom."""
    molecule = molecule_of(smiles, conformers)
    first, second = molecule.GetSubstructMatch(Chem.MolFromSmarts(pattern))
    return float(rdMolTransforms.GetBondLength(molecule.GetConformer(), first, second))


def test_adamantane_has_tetrahedral_cage() -> None:
    # Electron diffraction: C-C 1.540 +- 0.002 angstrom (Hargittai, Hedberg, Chem. Commun. 1971, 1499;
    # from memory)
    smiles = "C1C2CC3CC1CC(C2)C3"
    made = embed_structures(smiles, PLAIN, seed=1)
    assert made.method == "ETKDGv3"
    assert made.force_field == "MMFF94"
    assert len(made.atomic_numbers) == 26
    assert length(smiles, "CC", made) == pytest.approx(1.540, abs=0.02)


def test_six_helicene_is_a_screw_without_clashes() -> None:
    # The inner rim cannot be flat: the mean planes of the end rings make 58.5 degrees in the crystal
    # (de Rango, Tsoucaris, Declercq, Germain, Putzeys, Cryst. Struct. Commun. 2, 189, 1973; from memory).
    made = embed_structures(SIX_HELICENE, PLAIN, seed=1)
    carbons = made.positions_angstrom[0][made.atomic_numbers == 6]
    thickness = np.linalg.svd(carbons - carbons.mean(axis=0), compute_uv=False)[-1] / np.sqrt(len(carbons))
    assert thickness > 0.5
    distances = np.linalg.norm(carbons[:, None] - carbons[None], axis=-1)[np.triu_indices(len(carbons), 1)]
    assert distances.min() > 1.3


def test_bodipy_goes_to_uff_and_keeps_a_tetrahedral_boron() -> None:
    # Crystal of the parent BODIPY: B-F 1.38-1.39, B-N 1.54-1.55 angstrom (Tram, Yan, Jenkins, Vassiliev,
    # Bruce, Dyes Pigm. 82, 392, 2009; from memory). A force field is held to 0.15 angstrom only.
    made = embed_structures(BODIPY, PLAIN, seed=1)
    assert made.force_field == "UFF"
    assert length(BODIPY, "[#5][F]", made) == pytest.approx(1.39, abs=0.15)
    assert length(BODIPY, "[#5]~[#7]", made) == pytest.approx(1.545, abs=0.15)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_rings_of_trans_azobenzene_lie_near_its_plane(seed: int) -> None:
    """Flat within some 20 degrees: Traetteberg, Hilmo, Hagen, J. Mol. Struct. 39, 231 (1977; from memory, medium)."""
    smiles = "c1ccc(/N=N/c2ccccc2)cc1"
    molecule = molecule_of(smiles, embed_structures(smiles, PLAIN, seed=seed))
    torsions = molecule.GetSubstructMatches(Chem.MolFromSmarts("cc-N=N"), uniquify=False)
    angles = [rdMolTransforms.GetDihedralDeg(molecule.GetConformer(), *atoms) for atoms in torsions]
    assert len(angles) == 4
    assert max(min(abs(angle), 180 - abs(angle)) for angle in angles) < 30.0


def test_the_rings_of_cis_azobenzene_are_left_to_the_force_field() -> None:
    """They cannot be flat: 53 degrees in the crystal (Mostad, Roemming, Acta Chem. Scand. 25, 3561, 1971; memory)."""
    smiles = "c1ccc(/N=N\\c2ccccc2)cc1"
    molecule = molecule_of(smiles, embed_structures(smiles, PLAIN, seed=1))
    torsions = molecule.GetSubstructMatches(Chem.MolFromSmarts("cc-N=N"), uniquify=False)
    angles = [rdMolTransforms.GetDihedralDeg(molecule.GetConformer(), *atoms) for atoms in torsions]
    assert min(min(abs(angle), 180 - abs(angle)) for angle in angles) > 30.0


def test_selenophene_has_no_force_field_and_still_a_structure() -> None:
    # Microwave structure: C-Se 1.855 angstrom (Brown, Burden, Godfrey, J. Mol. Spectrosc. 25, 415, 1968;
    # from memory)
    made = embed_structures("c1cc[se]c1", PLAIN, seed=1)
    assert made.force_field == "none"
    assert length("c1cc[se]c1", "[#6]~[Se]", made) == pytest.approx(1.855, abs=0.15)


@pytest.mark.parametrize("smiles", ["C/C=C/c1ccccc1", "C/C=C\\c1ccccc1", "C[C@H](N)C(=O)O", "C[C@@H](N)C(=O)O"])
def test_drawn_stereo_is_kept(smiles: str) -> None:
    made = embed_structures(smiles, PLAIN, seed=3)
    molecule = molecule_of(smiles, made)
    Chem.AssignStereochemistryFrom3D(molecule)
    assert Chem.MolToSmiles(Chem.RemoveHs(molecule)) == Chem.CanonSmiles(smiles)
    assert made.stereo_enforced


@pytest.mark.parametrize("seed", [1, 2, 3, 4])
def test_an_undrawn_double_bond_becomes_the_stable_isomer(seed: int) -> None:
    # trans-Stilbene lies some 19 kJ/mol below cis (Williams, J. Am. Chem. Soc. 64, 1395, 1942; from memory)
    smiles = "C(=Cc1ccccc1)c1ccccc1"
    molecule = molecule_of(smiles, embed_structures(smiles, PLAIN, seed=seed))
    Chem.AssignStereochemistryFrom3D(molecule)
    assert Chem.MolToSmiles(Chem.RemoveHs(molecule)) == Chem.CanonSmiles("c1ccccc1/C=C/c1ccccc1")


def test_impossible_stereo_is_given_up_and_said_so() -> None:
    # The bridge of a bicyclo[2.2.1] skeleton cannot span its two faces: camphor's bridgeheads are (1R,4R) or
    # (1S,4S) (its IUPAC names), so of the drawings with one bridgehead turned over one cannot exist.
    kept, given_up = (embed_structures(drawing, PLAIN, seed=1) for drawing in (POSSIBLE, IMPOSSIBLE))
    assert kept.stereo_enforced
    assert not given_up.stereo_enforced
    assert given_up.method in {rung.label for rung in LADDER[3:]}


def test_separated_charges_stay_apart() -> None:
    # Bare force-field charges would close a salt bridge of about 1.7 angstrom; a solvent would not.
    smiles = "[NH3+]CCCCCC(=O)[O-]"
    made = embed_structures(smiles, EmbedSettings(candidates=4), seed=1)
    molecule = molecule_of(smiles, made)
    places = made.positions_angstrom[0]
    (nitrogen,) = molecule.GetSubstructMatch(Chem.MolFromSmarts("[N+]"))
    (oxygen,) = molecule.GetSubstructMatch(Chem.MolFromSmarts("[O-]"))
    assert np.linalg.norm(places[nitrogen] - places[oxygen]) > 3.5


def test_same_seed_same_structure_and_best_first() -> None:
    settings = EmbedSettings(conformers=3, candidates=6)
    first = embed_structures("CCCCCO", settings, seed=5)
    assert first == embed_structures("CCCCCO", settings, seed=5)
    assert first != embed_structures("CCCCCO", settings, seed=6)
    assert first.positions_angstrom.shape == (3, 18, 3)


def test_bonds_and_numbers_are_those_of_the_molecule() -> None:
    made = embed_structures("C[N+](C)(C)C", PLAIN, seed=1)
    assert sorted(made.atomic_numbers.tolist()) == [1] * 12 + [6] * 4 + [7]
    assert len(made.bonds) == 16
    distance = np.linalg.norm(
        made.positions_angstrom[0][made.bonds[:, 0]] - made.positions_angstrom[0][made.bonds[:, 1]], axis=1
    )
    assert distance.min() > 0.9
    assert distance.max() < 1.7


def test_no_time_is_said_with_a_code() -> None:
    with pytest.raises(NotConverged, match="no time left") as caught:
        embed_structures("CC", PLAIN, seed=1, deadline=time.monotonic())
    assert caught.value.reason_code == "no_3d"
    assert caught.value.recoverable


def test_failure_names_every_rung_with_its_causes(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("orchil_stages.embed.ladder.LADDER", LADDER[1:2])
    with pytest.raises(NotConverged) as caught:
        embed_structures(IMPOSSIBLE, PLAIN, seed=1)
    assert caught.value.reason_code == "no_3d"
    message = str(caught.value)
    assert all(f"{rung.label}: " in message for rung in LADDER[1:2])
    assert re.search(r"[a-z]+ \d+", message)


def test_a_smiles_that_does_not_parse_is_bad_input() -> None:
    with pytest.raises(BadInput, match="not a valid SMILES"):
        embed_structures("C1CC", PLAIN, seed=1)


def test_fewer_candidates_than_conformers_is_refused() -> None:
    with pytest.raises(ValidationError, match="candidates = 1 is less than conformers = 3"):
        EmbedSettings(conformers=3, candidates=1)


def test_stage_runs_through_its_contract(tmp_path: Path) -> None:
    stage = Embed()
    identity = Identity(
        smiles="c1ccccc1",
        inchikey="UHOVQNZJYSORNB-UHFFFAOYSA-N",
        fixed_hydrogen_layer="",
        charge=0,
        formula="C6H6",
        heavy_atoms=6,
        atoms=12,
        molar_mass_g_mol=78.11,
        zwitterion=False,
    )
    (made,) = stage.run(Inputs([identity]), EmbedSettings(), Context(scratch=tmp_path, seed=2))
    assert isinstance(made, stage.makes[0])
    assert stage.found().ok
    assert "rdkit" in stage.found().versions
