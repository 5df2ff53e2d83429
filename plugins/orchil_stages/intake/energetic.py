"""Cautions for structures with groups that are known to decompose violently.

A caution says what was seen and defers; where there is none, nothing is cleared. The list of groups is
common practice of laboratory safety (Bretherick's Handbook of Reactive Chemical Hazards), from memory.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

from rdkit import Chem

if TYPE_CHECKING:
    from rdkit.Chem import Mol

_GROUPS = (
    ("acyl or sulfonyl azide", "[C,S](=O)[N]~[N+]~[#7]", 1),
    ("azide", "[$([NX1-]=[N+]=[#7]),$([NX1]#[N+]-[NX2-])]", 1),
    ("diazo group", "[#6]~[N+]~[N-;X1]", 1),
    ("diazonium group", "[#6]-[N+]#[NX1]", 1),
    ("peroxide or ozonide", "[OX2,OX1-]-[OX2]", 1),
    ("polynitro aromatic ring", "c[N+](=O)[O-]", 2),
    ("nitrate ester", "[#6]O[N+](=O)[O-]", 1),
    ("nitramine", "[#7][N+](=O)[O-]", 1),
    ("gem-dinitro group", "[CX4,CX3-]([N+](=O)[O-])[N+](=O)[O-]", 1),
    ("tetrazole or chain of four nitrogens", "[#7;!$([N+]=[N-])]~[#7]~[#7]~[#7;!X1]", 1),
    ("several triazole rings", "[#7;r5]:[#7;r5]:[#7;r5]", 3),
    ("triazene", "[#7;!R]-[NX2;!R]=[NX2;!R]", 1),
    ("perchlorate, chlorate or other halogen oxide", "[Cl,Br,I;X3,X4](~[OX1])(~[OX1])~[OX1]", 1),
    ("fulminate or nitrile oxide", "[#6]#[N+]-[O-]", 1),
    ("N-halogen bond", "[#7]-[Cl,Br,I;X1]", 1),
    ("hypohalite", "[OX2]-[Cl,Br,I;X1]", 1),
)
_DEFERENCE = (
    "can decompose violently when heated, dried, struck or scaled up; this is a caution and never a "
    "clearance: follow the safety data sheet, local rules and licensed practice"
)


def energetic_cautions(molecule: Mol) -> tuple[str, ...]:
    """One caution for every kind of energetic group in any part of the row, counter-ions included."""
    seen = [name for name, pattern, least in _patterns() if _occurs(molecule, pattern, least)]
    return tuple(f"{name} seen: such compounds {_DEFERENCE}" for name in seen)


@lru_cache(maxsize=1)
def _patterns() -> tuple[tuple[str, Mol, int], ...]:
    return tuple((name, Chem.MolFromSmarts(smarts), least) for name, smarts, least in _GROUPS)


def _occurs(molecule: Mol, pattern: Mol, least: int) -> bool:
    if least == 1:
        return bool(molecule.HasSubstructMatch(pattern))
    return len(molecule.GetSubstructMatches(pattern, maxMatches=1000)) >= least
