"""Functions for questions: substructures, likeness, scaffolds. A SMILES that cannot be read gives NULL."""

from __future__ import annotations

from orchil_schemas.panel import SqlFunction

from .structures import fingerprint, molecule, pattern


def has_substructure(smiles: object, smarts: object) -> int | None:
    """1 where the pattern is in the structure, else 0."""
    found = molecule(smiles)
    return None if found is None else int(found.HasSubstructMatch(pattern(str(smarts))))


def count_substructure(smiles: object, smarts: object) -> int | None:
    """How many times the pattern is in the structure, on different sets of atoms."""
    found = molecule(smiles)
    return None if found is None else len(found.GetSubstructMatches(pattern(str(smarts)), maxMatches=10_000))


def similarity(smiles: object, other: object) -> float | None:
    """Tanimoto coefficient, 0 to 1; ``ValueError`` where the second SMILES cannot be read."""
    from rdkit.DataStructs import TanimotoSimilarity

    theirs = fingerprint(str(other))
    if theirs is None:
        raise ValueError(f'"{other}" is no SMILES; benzene, for example, is c1ccccc1')
    ours = fingerprint(smiles) if isinstance(smiles, str) else None
    return None if ours is None else float(TanimotoSimilarity(ours, theirs))


def scaffold(smiles: object) -> str | None:
    """Rings and the chains between them (Bemis, Murcko, J. Med. Chem. 39, 2887, 1996); "" for an open chain."""
    from rdkit import Chem
    from rdkit.Chem.Scaffolds import MurckoScaffold

    found = molecule(smiles)
    if found is None:
        return None
    framework: Chem.Mol = MurckoScaffold.GetScaffoldForMol(found)  # type: ignore[no-untyped-call]
    return str(Chem.MolToSmiles(framework))


SQL_FUNCTIONS = (
    SqlFunction("has_substructure", 2, has_substructure, "has_substructure(smiles, smarts): 1 or 0"),
    SqlFunction("count_substructure", 2, count_substructure, "count_substructure(smiles, smarts): how many times"),
    SqlFunction("similarity", 2, similarity, "similarity(smiles, smiles): Tanimoto coefficient, 0 to 1"),
    SqlFunction("scaffold", 1, scaffold, "scaffold(smiles): rings and the chains between them, as SMILES"),
)
