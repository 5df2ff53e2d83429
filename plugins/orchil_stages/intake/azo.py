"""Azo dyes that could by reductive cleavage give a listed aromatic amine (EU REACH, Annex XVII, entry 43).

The 22 amines of Appendix 8 are given from memory. The cleavage is formal: every set of azo (or hydrazone
N-N) bonds is cut and hydrogens are filled in. A caution defers to rules and practice; where there is none,
nothing is cleared.
"""

from __future__ import annotations

from functools import lru_cache
from itertools import chain, combinations
from typing import TYPE_CHECKING

from rdkit import Chem
from rdkit.Chem import rdinchi

if TYPE_CHECKING:
    from rdkit.Chem import Mol

LISTED_AMINES = {
    "biphenyl-4-ylamine": "Nc1ccc(-c2ccccc2)cc1",
    "benzidine": "Nc1ccc(-c2ccc(N)cc2)cc1",
    "4-chloro-o-toluidine": "Cc1cc(Cl)ccc1N",
    "2-naphthylamine": "Nc1ccc2ccccc2c1",
    "o-aminoazotoluene": "Cc1ccccc1N=Nc1ccc(N)c(C)c1",
    "5-nitro-o-toluidine": "Cc1ccc([N+](=O)[O-])cc1N",
    "4-chloroaniline": "Nc1ccc(Cl)cc1",
    "4-methoxy-m-phenylenediamine": "COc1ccc(N)cc1N",
    "4,4'-methylenedianiline": "Nc1ccc(Cc2ccc(N)cc2)cc1",
    "3,3'-dichlorobenzidine": "Nc1ccc(-c2ccc(N)c(Cl)c2)cc1Cl",
    "3,3'-dimethoxybenzidine": "COc1cc(-c2ccc(N)c(OC)c2)ccc1N",
    "3,3'-dimethylbenzidine": "Cc1cc(-c2ccc(N)c(C)c2)ccc1N",
    "4,4'-methylenedi-o-toluidine": "Cc1cc(Cc2ccc(N)c(C)c2)ccc1N",
    "6-methoxy-m-toluidine": "COc1ccc(C)cc1N",
    "4,4'-methylenebis(2-chloroaniline)": "Nc1ccc(Cc2ccc(N)c(Cl)c2)cc1Cl",
    "4,4'-oxydianiline": "Nc1ccc(Oc2ccc(N)cc2)cc1",
    "4,4'-thiodianiline": "Nc1ccc(Sc2ccc(N)cc2)cc1",
    "o-toluidine": "Cc1ccccc1N",
    "4-methyl-m-phenylenediamine": "Cc1ccc(N)cc1N",
    "2,4,5-trimethylaniline": "Cc1cc(C)c(N)cc1C",
    "o-anisidine": "COc1ccccc1N",
    "4-aminoazobenzene": "Nc1ccc(N=Nc2ccccc2)cc1",
}
_DEFERENCE = (
    "an aromatic amine of EU REACH Annex XVII entry 43 (list from memory); this is a caution and never a "
    "clearance: follow the safety data sheet, local rules and licensed practice"
)
_MAX_BONDS = 5


def listed_amine_cautions(molecule: Mol) -> tuple[str, ...]:
    """A caution naming each listed amine that the species is, or could give by azo cleavage."""
    itself = _listed_among(molecule)
    freed = set[str]().union(*(_listed_among(_cut(molecule, some)) for some in _some_of(_cleavable_bonds(molecule))))
    seen = [f"this is {name}" for name in sorted(itself)]
    seen += [f"azo cleavage could free {name}" for name in sorted(freed - itself)]
    return tuple(f"{what}, {_DEFERENCE}" for what in seen)


def _cleavable_bonds(molecule: Mol) -> tuple[int, ...]:
    matches = chain.from_iterable(molecule.GetSubstructMatches(pattern) for pattern in _azo_patterns())
    return tuple(sorted({molecule.GetBondBetweenAtoms(match[1], match[2]).GetIdx() for match in matches}))


def _some_of(bonds: tuple[int, ...]) -> chain[tuple[int, ...]]:
    """Every non-empty subset; with very many azo bonds only single cuts and the cut of all."""
    sizes = range(1, len(bonds) + 1) if len(bonds) <= _MAX_BONDS else (1, len(bonds))
    return chain.from_iterable(combinations(bonds, size) for size in sizes)


def _cut(molecule: Mol, bonds: tuple[int, ...]) -> Mol:
    cut = Chem.RWMol(molecule)
    ends = [(b.GetBeginAtomIdx(), b.GetEndAtomIdx()) for b in map(molecule.GetBondWithIdx, bonds)]
    for begin, end in ends:
        cut.RemoveBond(begin, end)
    for index in chain.from_iterable(ends):
        cut.GetAtomWithIdx(index).SetNoImplicit(False)
        cut.GetAtomWithIdx(index).SetNumExplicitHs(0)
    Chem.SanitizeMol(cut)
    return cut


def _listed_among(molecule: Mol) -> set[str]:
    if molecule.GetNumHeavyAtoms() > _largest_listed() and len(Chem.GetMolFrags(molecule)) == 1:
        return set()
    parts = Chem.GetMolFrags(molecule, asMols=True)
    small = (part for part in parts if part.GetNumHeavyAtoms() <= _largest_listed())
    return {_listed_skeletons()[key] for key in map(_skeleton, small) if key in _listed_skeletons()}


def _skeleton(molecule: Mol) -> str:
    """First block of the InChIKey: stereo and added protons (amine salts) do not matter."""
    return str(rdinchi.MolToInchiKey(molecule))[:14]


@lru_cache(maxsize=1)
def _listed_skeletons() -> dict[str, str]:
    return {_skeleton(Chem.MolFromSmiles(smiles)): name for name, smiles in LISTED_AMINES.items()}


@lru_cache(maxsize=1)
def _largest_listed() -> int:
    return max(Chem.MolFromSmiles(smiles).GetNumHeavyAtoms() for smiles in LISTED_AMINES.values())


@lru_cache(maxsize=1)
def _azo_patterns() -> tuple[Mol, ...]:
    """Aryl azo, and its hydrazone form: aryl-NH-N=C."""
    texts = ("c[NX2;!R]=[NX2;!R]", "c[NX3;H1;!R]-[NX2;!R]=[#6]")
    return tuple(Chem.MolFromSmarts(text) for text in texts)
