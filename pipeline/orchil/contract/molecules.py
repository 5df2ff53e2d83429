"""What the contract kit runs stages on: small, quick, and unlike each other."""

from __future__ import annotations

from orchil_schemas import LibraryRow

MEDIUM = "toluene"

MOLECULES: dict[str, LibraryRow] = {
    name: LibraryRow(structure=smiles, medium=MEDIUM)
    for name, smiles in {
        "azobenzene": "c1ccc(/N=N/c2ccccc2)cc1",
        "a streptocyanine, a cation": "CN(C)/C=C/C=[N+](C)C",
        "4-nitrophenolate, an anion": "[O-]c1ccc(cc1)[N+](=O)[O-]",
        "5-bromo-2,2'-bithiophene": "c1csc(c1)-c1ccc(Br)s1",
        "hexane, no dye": "CCCCCC",
    }.items()
}
"""A stage must come to a record or a typed reason on each of them, and to a record on one at least."""

ODD: dict[str, LibraryRow] = {
    name: LibraryRow(structure=structure, medium=MEDIUM)
    for name, structure in {
        "nothing": "",
        "rubbish": "not a molecule (",
        "hydrogen": "[H][H]",
        "water": "O",
        "methane": "C",
        "a salt": "[Na+].[Cl-]",
        "a radical": "[CH3]",
        "a placeholder": "*c1ccccc1",
    }.items()
}
"""A stage may refuse them, but with a typed reason."""
