"""Families of dyes for the error table: the first pattern that matches names the family."""

from __future__ import annotations

from functools import cache
from typing import Any

_PATTERNS = (
    ("BODIPY and relatives", "[#7]~[#5](~[#9])~[#7]"),
    ("other boron chelates", "[#5](~[#9])~[#9]"),
    ("porphyrins and other dipyrrins", "[#7]1~[#6]~[#6]~[#6]~[#6]~1~[#6,#7]~[#6]1~[#6]~[#6]~[#6]~[#7]~1"),
    ("azo dyes", "[#6;a]N=N[#6;a]"),
    ("xanthenes, rhodamines, fluoresceins", "c1ccc2c(c1)~[#6]~c1ccccc1~[#8]~2"),
    ("polymethines", "[#7+]=,:[#6]~[#6]=,:[#6]~[#6]=,:[#6]~[#7]"),
    ("coumarins", "O=c1ccc2ccccc2o1"),
    ("naphthalimides and rylene imides", "O=C1~[#7]~C(=O)~c2cccc3cccc1c23"),
    ("anthraquinones", "O=C1c2ccccc2C(=O)c2ccccc12"),
    ("carbazoles", "c1ccc2c(c1)[nX3]c1ccccc12"),
    ("triarylamines", "c[NX3](c)c"),
    ("tetraarylethenes", "c/C(c)=C(/c)c"),
    ("condensed hydrocarbons of three rings or more", "c1ccc2c(c1)ccc1ccccc12"),
    ("acenes", "c1ccc2cc3ccccc3cc2c1"),
    ("stilbenes and styryls", "cC=Cc"),
)
OTHERS = "others"


@cache
def family(smiles: str) -> str:
    """Name of the family of a dye."""
    from rdkit import Chem

    molecule = Chem.MolFromSmiles(smiles)
    for name, pattern in _queries():
        if molecule.HasSubstructMatch(pattern):
            return name
    return OTHERS


@cache
def _queries() -> tuple[tuple[str, Any], ...]:
    from rdkit import Chem

    return tuple((name, Chem.MolFromSmarts(smarts)) for name, smarts in _PATTERNS)
