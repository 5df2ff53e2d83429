"""The cheapest way to put a molecule together from what can be bought.

A molecule is cut at the bonds of the BRICS rules (J. Degen, C. Wegscheid-Gerlach, A. Zaliani, M. Rarey, ChemMedChem 3,
1503, 2008); each cut is one step of synthesis. Every connected group of pieces is an intermediate: it is bought where
it is on the list, or made from two smaller ones.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Any

from orchil_schemas import BadInput, OutOfScope

MOST_CUTS = 12
HANDLES = "[Cl,Br,I;D1]-[#6]"
BORONIC = "[B;D3](-[OX2])(-[OX2])-[#6]"


@dataclass(frozen=True)
class Route:
    """What one mol costs, in how many steps of the longest line, from which bought pieces."""

    cost_per_mol: float
    steps: int
    bought: tuple[str, ...]


@dataclass(frozen=True)
class Rates:
    """What is lost and spent in every step: yield (0 to 1) and price per mol of product."""

    step_yield: float
    step_cost: float


@dataclass(frozen=True)
class Answer:
    """The cheapest route and the molar mass of the product; without a route, the pieces that are not on the list."""

    route: Route | None
    molar_mass: float
    missing: tuple[str, ...]


def cheapest(smiles: str, prices: Mapping[str, float], rates: Rates) -> Answer:
    """The route for a species; ``prices`` per mol, by :func:`key`. OutOfScope when there are too many places to cut."""
    from rdkit import Chem
    from rdkit.Chem import BRICS

    molecule = Chem.MolFromSmiles(smiles)
    bonds = sorted({tuple(sorted(ends)) for ends, _ in BRICS.FindBRICSBonds(molecule)})  # type: ignore[no-untyped-call]
    cuts = [molecule.GetBondBetweenAtoms(*ends).GetIdx() for ends in bonds]
    if len(cuts) > MOST_CUTS:
        raise OutOfScope(f"{len(cuts)} places to cut: routes are searched up to {MOST_CUTS}")
    pieces = _Pieces(molecule, cuts)
    route = _search(pieces, prices, rates)
    whole = tuple(key(pieces.smiles(frozenset([one]))) for one in range(pieces.count))
    missing = () if route else tuple(sorted({one for one in whole if one not in prices}))
    return Answer(route, molar_mass(molecule), missing)


@lru_cache(maxsize=4096)
def key(smiles: str) -> str:
    """Canonical SMILES with the usual handles (Cl, Br, I, boronic acids and esters on carbon) taken for hydrogen."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise BadInput(f'"{smiles}" cannot be read as SMILES')
    for pattern in (BORONIC, HANDLES):
        molecule = _without(molecule, Chem.MolFromSmarts(pattern))
    return str(Chem.MolToSmiles(molecule))


def molar_mass(molecule: Any) -> float:
    """g/mol, hydrogens counted."""
    from rdkit.Chem import GetPeriodicTable

    table = GetPeriodicTable()
    hydrogen = table.GetAtomicWeight(1)
    return sum(float(atom.GetMass()) + hydrogen * int(atom.GetTotalNumHs()) for atom in molecule.GetAtoms())


def _without(molecule: Any, pattern: Any) -> Any:
    """The molecule without the handles that match; the last atom of the pattern stays."""
    from rdkit import Chem

    matches = molecule.GetSubstructMatches(pattern)
    bonds = [molecule.GetBondBetweenAtoms(match[0], match[-1]).GetIdx() for match in matches]
    if not bonds:
        return molecule
    parts = Chem.GetMolFrags(Chem.FragmentOnBonds(molecule, bonds), asMols=True)
    kept = max(parts, key=lambda part: (part.GetNumHeavyAtoms(), Chem.MolToSmiles(part)))
    return _capped(kept)


class _Pieces:
    """A molecule in pieces that hang together by ``cuts``."""

    def __init__(self, molecule: Any, cuts: list[int]) -> None:
        from rdkit import Chem

        self._molecule, self._cuts = molecule, cuts
        apart = Chem.FragmentOnBonds(molecule, cuts, addDummies=False) if cuts else molecule
        self._atoms = Chem.GetMolFrags(apart)
        self.count = len(self._atoms)
        owner = {atom: at for at, atoms in enumerate(self._atoms) for atom in atoms}
        ends = [
            (molecule.GetBondWithIdx(cut).GetBeginAtomIdx(), molecule.GetBondWithIdx(cut).GetEndAtomIdx())
            for cut in cuts
        ]
        self.joints = [(owner[a], owner[b]) for a, b in ends]

    def smiles(self, group: frozenset[int]) -> str:
        """The group as a molecule of its own, hydrogen where it was cut."""
        from rdkit import Chem

        border = [cut for cut, (a, b) in zip(self._cuts, self.joints, strict=True) if (a in group) != (b in group)]
        if not border:
            return str(Chem.MolToSmiles(self._molecule))
        wanted = self._atoms[min(group)][0]
        apart = Chem.FragmentOnBonds(self._molecule, border)
        indices: list[tuple[int, ...]] = []
        parts = Chem.GetMolFrags(apart, asMols=True, fragsMolAtomMapping=indices)
        return str(Chem.MolToSmiles(_capped(parts[next(at for at, atoms in enumerate(indices) if wanted in atoms)])))

    def halves(self, group: frozenset[int]) -> list[tuple[frozenset[int], frozenset[int]]]:
        """Every way to take the group apart at one joint."""
        inside = [joint for joint in self.joints if set(joint) <= group]
        halves = []
        for joint in inside:
            first = _connected(joint[0], [other for other in inside if other != joint])
            if joint[1] not in first:
                halves.append((first, group - first))
        return halves


def _connected(start: int, joints: list[tuple[int, int]]) -> frozenset[int]:
    reached, front = {start}, {start}
    while front:
        front = {b if a in front else a for a, b in joints if (a in front) != (b in front)} - reached
        reached |= front
    return frozenset(reached)


def _capped(part: Any) -> Any:
    """Hydrogen in place of the marks that cutting leaves."""
    from rdkit import Chem

    editable = Chem.RWMol(part)
    for atom in editable.GetAtoms():
        if atom.GetAtomicNum() == 0:
            atom.SetAtomicNum(1)
            atom.SetIsotope(0)
    return Chem.RemoveHs(editable.GetMol())


def _search(pieces: _Pieces, prices: Mapping[str, float], rates: Rates) -> Route | None:
    @cache
    def best(group: frozenset[int]) -> Route | None:
        name = key(pieces.smiles(group))
        ways = [Route(prices[name], 0, (name,))] if name in prices else []
        for first, second in pieces.halves(group):
            one, other = best(first), best(second)
            if one is not None and other is not None:
                ways.append(_joined(one, other, rates))
        return min(ways, key=lambda way: (way.cost_per_mol, way.steps), default=None)

    return best(frozenset(range(pieces.count)))


def _joined(one: Route, other: Route, rates: Rates) -> Route:
    spent = (one.cost_per_mol + other.cost_per_mol + rates.step_cost) / rates.step_yield
    return Route(spent, max(one.steps, other.steps) + 1, tuple(sorted((*one.bought, *other.bought))))
