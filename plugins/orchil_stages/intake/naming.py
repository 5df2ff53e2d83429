"""The name of a species: InChI in two strictnesses, charge, formula.

Standard InChI merges mobile hydrogens; the fixed-H InChI beside it tells tautomers and protonation states
apart (Heller et al., J. Cheminform. 7, 23, 2015).
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

from orchil_schemas import BadInput, Identity
from rdkit import Chem
from rdkit.Chem import rdinchi, rdMolDescriptors, rdqueries
from rdkit.Chem.Descriptors import MolWt  # type: ignore[attr-defined]  # set at run time

from .forms import CleanForm

if TYPE_CHECKING:
    from rdkit.Chem import Mol, QueryAtom


def name_species(form: CleanForm) -> Identity:
    """The Identity of a cleaned species; BadInput when InChI cannot name it."""
    molecule = form.molecule
    standard, fixed = (rdinchi.MolToInchi(molecule, options)[0] for options in ("", "/FixedH"))
    if not standard or not fixed:
        raise BadInput(f"the structure cannot be named by InChI: {form.smiles}")
    return Identity(
        smiles=form.smiles,
        inchikey=rdinchi.InchiToInchiKey(standard),
        fixed_hydrogen_layer=fixed,
        charge=Chem.GetFormalCharge(molecule),
        formula=rdMolDescriptors.CalcMolFormula(molecule),
        heavy_atoms=molecule.GetNumHeavyAtoms(),
        atoms=molecule.GetNumAtoms(onlyExplicit=False),
        molar_mass_g_mol=round(MolWt(molecule), 3),
        zwitterion=is_zwitterion(molecule),
    )


def is_zwitterion(molecule: Mol) -> bool:
    """Are there both + and - left when neighbouring pairs (nitro, N-oxide, azide, B-N+) cancel?"""
    positive, negative = (molecule.GetAtomsMatchingQuery(query) for query in _charged())
    plus = {atom.GetIdx(): atom.GetFormalCharge() for atom in positive}
    minus = {atom.GetIdx(): -atom.GetFormalCharge() for atom in negative}
    for atom in positive:
        for other in atom.GetNeighbors():
            cancelled = min(plus[atom.GetIdx()], minus.get(other.GetIdx(), 0))
            if cancelled:
                plus[atom.GetIdx()] -= cancelled
                minus[other.GetIdx()] -= cancelled
    return any(plus.values()) and any(minus.values())


@lru_cache(maxsize=1)
def _charged() -> tuple[QueryAtom, QueryAtom]:
    return rdqueries.FormalChargeGreaterQueryAtom(0), rdqueries.FormalChargeLessQueryAtom(0)
