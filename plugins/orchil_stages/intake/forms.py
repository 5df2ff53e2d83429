"""One standard drawing form for one species: labels off, charge-separated groups drawn one way.

Only forms of the same electrons and the same atoms are exchanged: no proton moves, the charge stays, no
tautomer is chosen. A dye's tautomer is its colour.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from orchil_schemas import BadInput
from rdkit import Chem
from rdkit.Chem import rdqueries
from rdkit.Chem.MolStandardize import rdMolStandardize

if TYPE_CHECKING:
    from rdkit.Chem import Mol

_GROUP_FORMS = (
    ("sulfone", "[S+2;X4:1]([O-:2])[O-:3]>>[S+0:1](=[O+0:2])=[O+0:3]"),
    ("sulfoxide", "[S+1;X3:1]-[O-1;X1:2]>>[S+0:1]=[O+0:2]"),
    ("phosphine oxide", "[P+1;X4:1]-[O-1;X1:2]>>[P+0:1]=[O+0:2]"),
    ("azide", "[N-;X2:1]-[N+;X2:2]#[N;X1:3]>>[N+0:1]=[N+1:2]=[N-1:3]"),
    ("diazo", "[C-;X3:1]-[N+;X2:2]#[N;X1:3]>>[C+0:1]=[N+1:2]=[N-1:3]"),
)


@dataclass(frozen=True)
class CleanForm:
    """A species whose SMILES reads back to itself, with notes on what was changed in the drawing."""

    molecule: Mol
    smiles: str
    notes: tuple[str, ...] = ()


def clean_form(part: Mol) -> CleanForm:
    """Drop isotope labels and map numbers, standardise group forms, and settle on a canonical SMILES."""
    molecule = Chem.Mol(part)
    notes: list[str] = []
    if _drop_isotopes(molecule):
        notes.append("isotope labels were dropped: colour hardly depends on them")
        molecule = Chem.RemoveHs(molecule)
    for atom in molecule.GetAtomsMatchingQuery(rdqueries.HasPropQueryAtom("molAtomMapNumber")):
        atom.SetAtomMapNum(0)
    if any(molecule.HasSubstructMatch(pattern) for pattern in _unusual_forms()):
        molecule = _normalizer().normalize(molecule)
        notes.append("charge-separated groups were redrawn in their usual form")
    smiles, settled = _settle(molecule)
    return CleanForm(settled, smiles, tuple(notes))


def _drop_isotopes(molecule: Mol) -> bool:
    labelled = molecule.GetAtomsMatchingQuery(rdqueries.IsotopeGreaterQueryAtom(0))
    for atom in labelled:
        atom.SetIsotope(0)
    return len(labelled) > 0


@lru_cache(maxsize=1)
def _unusual_forms() -> tuple[Mol, ...]:
    return tuple(Chem.MolFromSmarts(change.split(">>")[0]) for _, change in _GROUP_FORMS)


@lru_cache(maxsize=1)
def _normalizer() -> rdMolStandardize.Normalizer:
    table = "\n".join(f"{name}\t{change}" for name, change in _GROUP_FORMS)
    return rdMolStandardize.NormalizerFromData(table, rdMolStandardize.CleanupParameters())


def _settle(molecule: Mol) -> tuple[str, Mol]:
    """Write and read until the SMILES repeats: RDKit's writer is not always idempotent in stereo."""
    smiles = Chem.MolToSmiles(molecule)
    for _ in range(4):
        molecule = Chem.MolFromSmiles(smiles)
        if molecule is None:
            raise BadInput(f"the structure does not survive being written as SMILES: {smiles}")
        again = Chem.MolToSmiles(molecule)
        if again == smiles:
            break
        smiles = again
    return smiles, molecule
