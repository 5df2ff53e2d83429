"""The parts of a row: which one is the dye, and which are counter-ions and solvates.

The dye is the part with the largest connected conjugated system, then the most conjugated atoms, then the
most heavy atoms: a big anion (tetraarylborate, dodecyl sulfate) must not win by size.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from orchil_schemas import OutOfScope
from rdkit import Chem

if TYPE_CHECKING:
    from rdkit.Chem import Atom, Mol

HANDLED = ("H", "B", "C", "N", "O", "F", "Si", "P", "S", "Cl", "Ge", "As", "Se", "Br", "Te", "I")
"""Elements a species may hold."""

_ALKALINE_EARTHS = frozenset({"Be", "Mg", "Ca", "Sr", "Ba"})
_BENIGN = _ALKALINE_EARTHS | {*HANDLED, "Li", "Na", "K", "Rb", "Cs", "He", "Ne", "Ar", "Kr", "Xe"}


@dataclass(frozen=True)
class Parts:
    """The chosen part and the others as SMILES."""

    chosen: Mol
    set_apart: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()


def choose_part(molecule: Mol) -> Parts:
    """Set counter-ions and solvates apart; OutOfScope for a metal among them that may be bound to the dye."""
    parts = Chem.GetMolFrags(molecule, asMols=True, sanitizeFrags=False)
    if len(parts) == 1:
        return Parts(parts[0])
    ranked = sorted(((conjugation(part), Chem.MolToSmiles(part), part) for part in parts), key=lambda r: r[:2])
    size, smiles, chosen = ranked.pop()
    for _, _, part in ranked:
        _check_set_apart(part, chosen)
    apart = tuple(other for _, other, _ in ranked)
    rivals = {other for other_size, other, _ in ranked if other_size[0] == size[0] > 0 and other != smiles}
    return Parts(chosen, apart, _choice_notes(smiles, apart, rivals))


def conjugation(part: Mol) -> tuple[int, int, int]:
    """(atoms of the largest connected conjugated system, conjugated atoms, heavy atoms)."""
    neighbours: dict[int, list[int]] = {}
    for bond in part.GetBonds():
        if bond.GetIsConjugated():
            begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
            neighbours.setdefault(begin, []).append(end)
            neighbours.setdefault(end, []).append(begin)
    return _largest_connected(neighbours), len(neighbours), part.GetNumHeavyAtoms()


def _largest_connected(neighbours: dict[int, list[int]]) -> int:
    unseen, largest = set(neighbours), 0
    while unseen:
        frontier, size = [unseen.pop()], 0
        while frontier:
            size += 1
            fresh = [other for other in neighbours[frontier.pop()] if other in unseen]
            unseen.difference_update(fresh)
            frontier.extend(fresh)
        largest = max(largest, size)
    return largest


def _choice_notes(smiles: str, apart: tuple[str, ...], rivals: set[str]) -> tuple[str, ...]:
    notes = [f"set apart: {', '.join(apart)}"]
    if smiles in apart:
        notes.append(f"the species occurs {apart.count(smiles) + 1} times in the row; one of them is computed")
    if rivals:
        notes.append(f"also conjugated over as many atoms: {', '.join(sorted(rivals))}; give it a row of its own")
    return tuple(notes)


def _check_set_apart(part: Mol, chosen: Mol) -> None:
    metals = sorted({a.GetSymbol() for a in part.GetAtoms() if a.GetSymbol() not in _BENIGN})
    if metals and not _is_inorganic_anion(part):
        raise OutOfScope(f"{', '.join(metals)} beside the dye may be bound to it; metal complexes are not handled")
    ligated = {a.GetSymbol() for a in part.GetAtoms()} & _ALKALINE_EARTHS
    if ligated and sum(map(_is_bare_nitrogen_anion, chosen.GetAtoms())) >= 2:
        raise OutOfScope(f"{', '.join(ligated)} with a dye that holds N-: a metal complex, which is not handled")


def _is_inorganic_anion(part: Mol) -> bool:
    """Zincate, hexafluoroantimonate and their like."""
    return Chem.GetFormalCharge(part) < 0 and all(a.GetSymbol() != "C" for a in part.GetAtoms())


def _is_bare_nitrogen_anion(atom: Atom) -> bool:
    return (
        atom.GetSymbol() == "N"
        and atom.GetFormalCharge() < 0
        and not any(other.GetFormalCharge() > 0 for other in atom.GetNeighbors())
    )
