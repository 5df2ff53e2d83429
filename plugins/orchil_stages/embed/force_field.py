"""Force-field cleaning of embedded structures: MMFF94s, else UFF, else none.

MMFF94s (Halgren, J. Comput. Chem. 20, 720, 1999) keeps conjugated nitrogen flat, as dyes have it; it knows
no B, Se, Te. UFF: Rappe, Casewit, Colwell, Goddard, Skiff, J. Am. Chem. Soc. 114, 10024 (1992).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from rdkit import Chem
from rdkit.Chem import rdForceFieldHelpers as helpers

from .azo import flat_torsions

SCREENING_DIELECTRIC = 80.0
AZO_FORCE = 100.0
"""Of the torsions that are held, kcal/mol per squared radian."""


def rank_by_force_field(molecule: Chem.Mol, steps: int) -> tuple[str, list[int]]:
    """Minimise every conformer in place; name of the force field, conformer ids from lowest energy."""
    ids = [conformer.GetId() for conformer in molecule.GetConformers()]
    name, make = _choose(molecule)
    if make is None:
        return name, ids
    energies = {i: _minimise(_with_flat_azo(molecule, i, name, make(molecule, i)), steps) for i in ids}
    return name, sorted(ids, key=energies.__getitem__)


def _choose(molecule: Chem.Mol) -> tuple[str, Callable[[Chem.Mol, int], Any] | None]:
    if helpers.MMFFHasAllMoleculeParams(molecule):
        return "MMFF94", _mmff
    if helpers.UFFHasAllMoleculeParams(molecule):
        return "UFF", _uff
    return "none", None


def _mmff(molecule: Chem.Mol, conformer: int) -> Any:
    """MMFF94s, charges screened: bare ones pull separated charges together, as no solvent would let them."""
    properties = helpers.MMFFGetMoleculeProperties(molecule, mmffVariant="MMFF94s")
    properties.SetMMFFDielectricConstant(SCREENING_DIELECTRIC)
    return helpers.MMFFGetMoleculeForceField(molecule, properties, confId=conformer)


def _uff(molecule: Chem.Mol, conformer: int) -> Any:
    return helpers.UFFGetMoleculeForceField(molecule, confId=conformer)


def _with_flat_azo(molecule: Chem.Mol, conformer: int, name: str, field: Any) -> Any:
    field.Initialize()
    hold = field.MMFFAddTorsionConstraint if name == "MMFF94" else field.UFFAddTorsionConstraint
    for atoms, low, high in flat_torsions(molecule, conformer):
        hold(*atoms, False, low, high, AZO_FORCE)
    return field


def _minimise(field: Any, steps: int) -> float:
    """Energy in kcal/mol after at most ``steps`` steps."""
    if steps:
        field.Minimize(maxIts=steps)
    return float(field.CalcEnergy())
