"""Ring systems of a species, each as a molecule of its own.

The split into ring systems is that of G. W. Bemis, M. A. Murcko, J. Med. Chem. 39, 2887 (1996); atoms bound to a ring
by a double bond stay with it.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache
from importlib.resources import files
from typing import Any

from orchil_schemas import BadInput


def ring_systems(smiles: str) -> tuple[str, ...]:
    """Canonical SMILES of the ring systems, hydrogen where the rest was cut off; sorted, each once."""
    from rdkit import Chem

    molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise BadInput(f'"{smiles}" cannot be read as SMILES')
    border = [bond.GetIdx() for bond in molecule.GetBonds() if _leaves_a_ring(bond)]
    parts = Chem.GetMolFrags(Chem.FragmentOnBonds(molecule, border) if border else molecule, asMols=True)
    return tuple(sorted({_name(part) for part in parts if part.GetRingInfo().NumRings()}))


@lru_cache(maxsize=4)
def listed(text: str) -> frozenset[str]:
    """The list of what can be bought: one SMILES a line, anything after a space is a remark; BadInput names a line."""
    return frozenset(_lines(text))


def common_rings() -> str:
    """Ring systems that catalogues have in many substituted forms (common practice); an example to begin from."""
    return files(__package__).joinpath("common_rings.smi").read_text(encoding="utf-8")


def _lines(text: str) -> Iterator[str]:
    from rdkit import Chem, rdBase

    for number, line in enumerate(text.splitlines(), 1):
        words = line.split()
        if not words or words[0].startswith("#"):
            continue
        with rdBase.BlockLogs():
            molecule = Chem.MolFromSmiles(words[0])
        if molecule is None:
            raise BadInput(f'line {number} of the list: "{words[0]}" cannot be read as SMILES')
        yield from ring_systems(Chem.MolToSmiles(molecule))


def _leaves_a_ring(bond: Any) -> bool:
    """A single bond outside rings with a ring atom at one end at least."""
    ends = (bond.GetBeginAtom(), bond.GetEndAtom())
    return not bond.IsInRing() and bond.GetBondTypeAsDouble() == 1 and any(atom.IsInRing() for atom in ends)


def _name(part: Any) -> str:
    from rdkit import Chem

    editable = Chem.RWMol(part)
    for atom in editable.GetAtoms():
        if atom.GetAtomicNum() == 0:
            atom.SetAtomicNum(1)
            atom.SetIsotope(0)
    return str(Chem.MolToSmiles(Chem.RemoveHs(editable.GetMol()), isomericSmiles=False))
