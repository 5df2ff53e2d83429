"""From text to a sanitised molecule, or to a reason that says what is wrong and where."""

from __future__ import annotations

import logging
import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from orchil_schemas import BadInput
from rdkit import Chem, rdBase

if TYPE_CHECKING:
    from rdkit.Chem import Atom, Bond, Mol

_CLOCK = re.compile(r"^\[\d\d:\d\d:\d\d\] ")

_HINTS = {
    "B": "write four-bonded boron as [B-] and the nitrogen bound to it as [N+]",
    "N": "write four-bonded nitrogen as [N+]",
    "O": "write three-bonded oxygen as [O+]",
    "C": "a carbon has at most four bonds",
}


@dataclass(frozen=True)
class Drawing:
    """A sanitised molecule, all parts of the row, with notes on how it was read."""

    molecule: Mol
    notes: tuple[str, ...] = ()


def read_structure(text: str, form: str) -> Drawing:
    """Parse a SMILES or a mol block and sanitise it; BadInput says what RDKit found and at which atom."""
    parse = _parser(text, form)
    with rdBase.BlockLogs():
        molecule = parse(True)
        drawing = Drawing(molecule) if molecule is not None else _second_reading(parse)
    if drawing.molecule.GetNumHeavyAtoms() == 0:
        raise BadInput("the structure has no atoms other than hydrogen")
    return _free_alkali(drawing)


def _parser(text: str, form: str) -> Callable[[bool], Mol | None]:
    if not text.strip():
        raise BadInput("the structure is empty; give a SMILES or a mol block")
    if form == "smiles":
        return lambda sanitize: Chem.MolFromSmiles(text.strip(), sanitize=sanitize)
    if form == "molblock":
        return lambda sanitize: Chem.MolFromMolBlock(text, sanitize=sanitize)
    raise BadInput(f"format '{form}' is not known; it is 'smiles' or 'molblock'")


def _second_reading(parse: Callable[[bool], Mol | None]) -> Drawing:
    """Read what did not sanitise: mend four-bonded boron, or raise with the first problem."""
    molecule = parse(False)
    if molecule is None:
        raise BadInput(f"the structure cannot be read: {_what_rdkit_says(parse)}")
    mended = _split_boron_charges(molecule)
    problems = Chem.DetectChemistryProblems(molecule)
    if problems:
        raise BadInput(_describe(problems[0], molecule))
    Chem.SanitizeMol(molecule)
    Chem.AssignStereochemistry(molecule, cleanIt=True, force=True)
    return Drawing(molecule, ("four-bonded boron was read as B- bound to N+",) if mended else ())


def _describe(problem: Any, molecule: Mol) -> str:
    """The words for an RDKit sanitisation problem (its type stubs lack the methods)."""
    if not hasattr(problem, "GetAtomIdx"):
        return f"the rings cannot be given alternating double bonds: {problem.Message()}"
    index = problem.GetAtomIdx()
    symbol = molecule.GetAtomWithIdx(index).GetSymbol()
    hint = f"; {_HINTS[symbol]}" if symbol in _HINTS else ""
    return f"impossible valence at atom {index + 1} ({symbol}): {problem.Message()}{hint}"


def _split_boron_charges(molecule: Mol) -> bool:
    """Turn neutral four-bonded boron, dative or not, into B- and N+ (or O+) in place; was there any?"""
    mended = False
    for bond in molecule.GetBonds():
        boron, donor = sorted((bond.GetBeginAtom(), bond.GetEndAtom()), key=lambda atom: atom.GetAtomicNum())
        if _lacks_charges(bond, boron, donor):
            bond.SetBondType(Chem.BondType.SINGLE)
            boron.SetFormalCharge(-1)
            donor.SetFormalCharge(1)
            mended = True
    if mended:
        molecule.UpdatePropertyCache(strict=False)
    return mended


def _lacks_charges(bond: Bond, boron: Atom, donor: Atom) -> bool:
    """Is this a bond of neutral four-bonded boron to an atom with one bond too many for a neutral one?"""
    if (boron.GetSymbol(), boron.GetDegree(), boron.GetFormalCharge()) != ("B", 4, 0):
        return False
    full = {"N": 3, "O": 2}.get(donor.GetSymbol())
    if full is None or donor.GetFormalCharge() != 0:
        return False
    orders = sum(other.GetBondTypeAsDouble() for other in donor.GetBonds())
    return bond.GetBondType() == Chem.BondType.DATIVE or (orders > full and not donor.GetIsAromatic())


def _free_alkali(drawing: Drawing) -> Drawing:
    """Read O-Na and the like as a salt: an alkali metal is never bound to a dye."""
    bonds = drawing.molecule.GetSubstructMatches(_alkali_bond())
    if not bonds:
        return drawing
    salt = Chem.RWMol(drawing.molecule)
    for metal, anion in bonds:
        salt.RemoveBond(metal, anion)
        salt.GetAtomWithIdx(metal).SetFormalCharge(1)
        salt.GetAtomWithIdx(anion).SetFormalCharge(-1)
    Chem.SanitizeMol(salt)
    return Drawing(salt.GetMol(), (*drawing.notes, "alkali metals drawn with bonds were read as ions"))


@lru_cache(maxsize=1)
def _alkali_bond() -> Mol:
    return Chem.MolFromSmarts("[Li,Na,K,Rb,Cs;X1;+0]-[O,S,N;+0]")


def _what_rdkit_says(parse: Callable[[bool], Mol | None]) -> str:
    """Parse once more with RDKit's log in hand; its log goes to standard error again afterwards."""
    heard: list[str] = []
    listener = logging.Handler()
    listener.emit = lambda record: heard.append(record.getMessage())  # type: ignore[method-assign]
    logger = logging.getLogger("rdkit")
    before = logger.handlers[:], logger.propagate
    logger.handlers, logger.propagate = [listener], False
    rdBase.LogToPythonLogger()
    try:
        parse(False)
    finally:
        rdBase.LogToCppStreams()
        logger.handlers, logger.propagate = before
    return _first_sentence(heard)


def _first_sentence(heard: list[str]) -> str:
    lines = [_CLOCK.sub("", line.strip(" ~\t")) for text in heard for line in text.splitlines()]
    useful = [line for line in lines if line and not set(line) <= set("~^- ")]
    return useful[0] if useful else "neither a SMILES nor a mol block that RDKit understands"
