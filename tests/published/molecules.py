"""Small molecules with s, p and d shells from every row of the periodic table that the stages handle."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from orchil_schemas import FloatArray, IntArray
from orchil_stages.ground_state import BOHR_ANGSTROM
from rdkit import Chem, rdBase
from rdkit.Chem import rdDistGeom

SMILES = {
    "water": "O",
    "thiophene": "c1ccsc1",
    "dimethyl sulfone": "CS(C)(=O)=O",
    "methylsilane": "C[SiH3]",
    "trimethylphosphine": "CP(C)C",
    "chloroethene": "C=CCl",
    "bromoethene": "C=CBr",
    "iodoethene": "C=CI",
    "selenophene": "c1cc[se]c1",
    "tellurophene": "c1cc[te]c1",
    "germane": "C[GeH3]",
    "trimethylarsine": "C[As](C)C",
    "boron difluoride chelate": "F[B-]1(F)OC=CC=[O+]1",
    "streptocyanine cation": "CN(C)C=CC=[N+](C)C",
    "4-nitrophenolate": "[O-]c1ccc([N+](=O)[O-])cc1",
}
WITH_D_SHELLS = ("thiophene", "dimethyl sulfone", "methylsilane", "trimethylphosphine", "chloroethene")


@dataclass(frozen=True)
class Embedded:
    """Elements, positions in bohr (not relaxed: any geometry serves to compare two programs) and charge."""

    numbers: IntArray
    positions: FloatArray
    charge: int


@cache
def embedded(name: str) -> Embedded:
    """A reproducible structure by distance geometry."""
    molecule = Chem.AddHs(Chem.MolFromSmiles(SMILES[name]))
    with rdBase.BlockLogs():
        assert rdDistGeom.EmbedMolecule(molecule, randomSeed=7) == 0
    return Embedded(
        np.array([atom.GetAtomicNum() for atom in molecule.GetAtoms()]),
        np.array(molecule.GetConformer().GetPositions()) / BOHR_ANGSTROM,
        Chem.GetFormalCharge(molecule),
    )
