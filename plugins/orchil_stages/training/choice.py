"""Which dyes and media training uses, and in which order they are relaxed."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Mapping

from .dataset import SCOPE_HEAVY_ATOMS, Measurement, scaffold

_ROWS_PER_DYE = 3


def dyes_in_order(by_dye: Mapping[str, list[Measurement]]) -> list[tuple[str, str]]:
    """(smiles, medium) to relax: first one dye of every scaffold, then the others; shuffled by hash."""
    seen: set[str] = set()
    first: list[tuple[str, str]] = []
    rest: list[tuple[str, str]] = []
    for smiles in sorted(by_dye, key=lambda text: hashlib.sha256(text.encode()).hexdigest()):
        if heavy_atoms(smiles) > SCOPE_HEAVY_ATOMS:
            continue
        core = scaffold(smiles)
        group = rest if core in seen else first
        seen.add(core)
        group.append((smiles, by_dye[smiles][0].medium))
    return first + rest


def heavy_atoms(smiles: str) -> int:
    """Number of atoms other than hydrogen; 0 when unreadable."""
    from rdkit import Chem

    molecule = Chem.MolFromSmiles(smiles)
    return 0 if molecule is None else int(molecule.GetNumHeavyAtoms())


def rows_for_training(group: list[Measurement]) -> list[Measurement]:
    """The main medium and the two media with the extreme maxima, so that solvent shifts are seen."""
    main, others = group[0], group[1:]
    extremes = sorted(others, key=lambda row: row.absorption_nm or 0.0)
    chosen = [main, *extremes[:1], *extremes[1:][-1:]]
    return _unlike(chosen)[:_ROWS_PER_DYE]


def _unlike(rows: Iterable[Measurement]) -> list[Measurement]:
    kept: list[Measurement] = []
    for row in rows:
        if row not in kept:
            kept.append(row)
    return kept
