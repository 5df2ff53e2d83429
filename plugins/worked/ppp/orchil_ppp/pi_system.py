"""The largest pi system of a species: its atoms, their kinds, its electrons, and how its bonds are twisted."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from orchil_schemas import BadInput, FloatArray, IntArray, OutOfScope

from .parameters import SITES, STAND_INS, array_of

KNOWN = ("C", "N", "O", "S", "F", "Cl", "Br", "I")
HALOGENS = ("F", "Cl", "Br", "I")
BENT_COSINE = 0.6
"""A double or aromatic bond that is twisted by more than 53 degrees belongs to no planar pi system."""


@dataclass(frozen=True)
class PiSystem:
    """n atoms: indices into the species, kinds, positions (n, 3) in angstrom, bonds (m, 2) with the cosine of
    their twist and their length in angstrom, and the number of electrons.
    """

    atoms: IntArray
    kinds: list[str]
    positions: FloatArray
    bonds: IntArray
    cosines: FloatArray
    lengths: FloatArray
    electrons: int
    stand_ins: tuple[str, ...] = ()

    @property
    def charges(self) -> FloatArray:
        """Charge of each atom without its pi electrons, e."""
        return array_of(self.kinds, "electrons")


def pi_system(smiles: str, numbers: IntArray | None, positions: FloatArray) -> PiSystem:
    """The pi system of ``smiles`` with hydrogens at ``positions`` (atoms, 3), heavy atoms first.

    :class:`OutOfScope` says what is not handled; :class:`BadInput` when atoms and positions do not go together.
    """
    molecule = _with_hydrogens(smiles)
    if molecule.GetNumAtoms() != len(positions) or (numbers is not None and list(numbers) != _numbers(molecule)):
        raise BadInput("the geometry has other atoms than the species, or the same in another order")
    if any(atom.GetNumRadicalElectrons() for atom in molecule.GetAtoms()):
        raise OutOfScope("unpaired electrons: only closed shells are handled")
    members = _largest(molecule, _members(molecule))
    symbols = [molecule.GetAtomWithIdx(at).GetSymbol() for at in members]
    kinds = [_kind(molecule.GetAtomWithIdx(at)) for at in members]
    place = {at: order for order, at in enumerate(members)}
    pairs = [(i, j) for i, j in _pairs(molecule) if i in place and j in place]
    normals = _normals(molecule, members, positions)
    cosines = np.array([_cosine(normals[i], normals[j], positions[j] - positions[i]) for i, j in pairs])
    _assert_planar(molecule, pairs, cosines)
    charge = sum(molecule.GetAtomWithIdx(at).GetFormalCharge() for at in members)
    electrons = sum(SITES[kind].electrons for kind in kinds) - charge
    if electrons % 2 or not 0 < electrons < 2 * len(members):
        raise OutOfScope(f"{electrons} pi electrons on {len(members)} atoms: only closed shells are handled")
    bonds = np.array([(place[i], place[j]) for i, j in pairs], dtype=np.int64)
    lengths = np.array([np.linalg.norm(positions[i] - positions[j]) for i, j in pairs])
    return PiSystem(
        np.array(members),
        kinds,
        positions[members],
        bonds,
        cosines,
        lengths,
        electrons,
        tuple(sorted(set(symbols) & set(STAND_INS))),
    )


def _with_hydrogens(smiles: str) -> Any:
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise BadInput(f'"{smiles}" cannot be read as SMILES')
    molecule = Chem.AddHs(molecule)
    Chem.Kekulize(molecule, clearAromaticFlags=True)
    return molecule


def _numbers(molecule: Any) -> list[int]:
    return [atom.GetAtomicNum() for atom in molecule.GetAtoms()]


def _pairs(molecule: Any) -> Iterator[tuple[int, int]]:
    for bond in molecule.GetBonds():
        yield bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()


def _members(molecule: Any) -> set[int]:
    """Unsaturated atoms, and those beside them that lend a pair of electrons or an empty orbital."""
    core = {atom.GetIdx() for atom in molecule.GetAtoms() if _unsaturated(atom)}
    beside = {atom.GetIdx() for atom in molecule.GetAtoms() if _lends(atom) and _touches(atom, core)}
    return core | beside


def _unsaturated(atom: Any) -> bool:
    """Has a double or triple bond that a p orbital of a second-row atom takes part in."""
    multiple = [bond for bond in atom.GetBonds() if bond.GetBondTypeAsDouble() > 1]
    if not multiple or _hypervalent(atom):
        return False
    if len(multiple) > 1:
        raise OutOfScope("cumulated double bonds, which have two pi systems at right angles")
    return not _hypervalent(multiple[0].GetOtherAtom(atom))


def _hypervalent(atom: Any) -> bool:
    """Sulfur or phosphorus with more bonds than a pi system gives it, as in a sulfone."""
    number = int(atom.GetAtomicNum())
    return number > 10 and int(atom.GetTotalValence()) > (3 if number == 15 else 2)


def _lends(atom: Any) -> bool:
    """A donor with a lone pair, or carbon or boron with an empty or a filled p orbital."""
    symbol, degree, charge = str(atom.GetSymbol()), int(atom.GetTotalDegree()), int(atom.GetFormalCharge())
    if symbol == "C":
        return charge != 0 and degree == 3
    if symbol == "B":
        return degree == 3
    if symbol in HALOGENS:
        return degree == 1
    limit = {"N": 3, "P": 3, "O": 2, "S": 2, "Se": 2, "Te": 2}.get(symbol, 0)
    return degree <= limit and not _hypervalent(atom)


def _touches(atom: Any, core: set[int]) -> bool:
    return any(neighbour.GetIdx() in core for neighbour in atom.GetNeighbors())


def _largest(molecule: Any, members: set[int]) -> list[int]:
    """The largest connected part; the last one where several are equal."""
    parts: list[set[int]] = []
    waiting = set(members)
    while waiting:
        part, front = set(), {min(waiting)}
        while front:
            part |= front
            near = {n.GetIdx() for at in front for n in molecule.GetAtomWithIdx(at).GetNeighbors()}
            front = (near & waiting) - part
        parts.append(part)
        waiting -= part
    largest: set[int] = sorted(parts, key=len)[-1] if parts else set()
    if len(largest) < 2:
        raise OutOfScope("no pi system: the pi-electron method handles conjugated species only")
    return sorted(largest)


def _kind(atom: Any) -> str:
    """Key into the table of sites: the element, and whether it brings one electron or two."""
    symbol = str(atom.GetSymbol())
    if symbol not in KNOWN:
        raise OutOfScope(f"{symbol} in the pi system: the published parameters cover {', '.join(KNOWN)}")
    if symbol == "C":
        return symbol
    if symbol in HALOGENS:
        return STAND_INS.get(symbol, symbol)
    sigma_bonds = atom.GetTotalDegree()
    return f"{symbol}{2 if sigma_bonds == (3 if symbol == 'N' else 2) else 1}"


def _normals(molecule: Any, members: Sequence[int], positions: FloatArray) -> dict[int, FloatArray]:
    """Unit vector across the plane of each atom; an end of a chain takes the one beside it."""
    normals: dict[int, FloatArray] = {}
    ends = []
    for at in members:
        around = [n.GetIdx() for n in molecule.GetAtomWithIdx(at).GetNeighbors()]
        normal = _normal(positions[at], positions[around])
        if normal is None:
            ends.append(at)
        else:
            normals[at] = normal
    for _ in range(len(ends)):
        for at in [end for end in ends if end not in normals]:
            beside = [n.GetIdx() for n in molecule.GetAtomWithIdx(at).GetNeighbors() if n.GetIdx() in normals]
            if beside:
                normals[at] = normals[beside[0]]
    straight = np.array([0.0, 0.0, 1.0])  # no plane anywhere, as in butadiyne: any axis will do
    return {at: normals.get(at, straight) for at in members}


def _normal(centre: FloatArray, around: FloatArray) -> FloatArray | None:
    if len(around) < 2:
        return None
    arms = around - centre
    arms /= np.linalg.norm(arms, axis=1)[:, None]
    across = np.cross(arms[0], arms[1]) if len(arms) == 2 else np.cross(arms[1] - arms[0], arms[2] - arms[0])
    length = float(np.linalg.norm(across))
    return None if length < 0.2 else across / length


def _cosine(first: FloatArray, second: FloatArray, along: FloatArray) -> float:
    """Cosine of the twist between two p orbitals about their bond, 0 to 1."""
    axis = along / np.linalg.norm(along)
    first, second = (normal - (normal @ axis) * axis for normal in (first, second))
    norms = float(np.linalg.norm(first) * np.linalg.norm(second))
    return 0.0 if norms < 1e-6 else min(abs(float(first @ second)) / norms, 1.0)


def _assert_planar(molecule: Any, pairs: Iterable[tuple[int, int]], cosines: FloatArray) -> None:
    for (i, j), cosine in zip(pairs, cosines, strict=True):
        double = molecule.GetBondBetweenAtoms(i, j).GetBondTypeAsDouble() == 2
        if double and cosine < BENT_COSINE:
            angle = float(np.degrees(np.arccos(cosine)))
            raise OutOfScope(f"a double bond is twisted by {angle:.0f} degrees: only planar pi systems are handled")
