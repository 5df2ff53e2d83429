"""Choose the species of a drawing, bring its form to one standard, and name it."""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

from orchil_schemas import Identity, IntakeNotes, OutOfScope
from rdkit import Chem, rdBase
from rdkit.Chem import rdqueries

from .azo import listed_amine_cautions
from .energetic import energetic_cautions
from .forms import CleanForm, clean_form
from .naming import name_species
from .parts import HANDLED, Parts, choose_part
from .reading import Drawing

if TYPE_CHECKING:
    from rdkit.Chem import Mol, QueryAtom


def take_species(drawing: Drawing, *, max_heavy_atoms: int) -> tuple[Identity, IntakeNotes]:
    """The species and the notes of one drawing; OutOfScope for metals, open shells and species too large."""
    with rdBase.BlockLogs():
        parts = choose_part(drawing.molecule)
        _check_scope(parts.chosen, max_heavy_atoms)
        form = clean_form(parts.chosen)
        identity = name_species(form)
        return identity, _notes(drawing, parts, form)


def _notes(drawing: Drawing, parts: Parts, form: CleanForm) -> IntakeNotes:
    cautions = (*energetic_cautions(drawing.molecule), *listed_amine_cautions(form.molecule))
    notes = (*drawing.notes, *parts.notes, *form.notes, *_open_stereo(form.molecule))
    return IntakeNotes(set_apart=parts.set_apart, notes=notes, cautions=cautions)


def _check_scope(molecule: Mol, max_heavy_atoms: int) -> None:
    heavy = molecule.GetNumHeavyAtoms()
    if heavy > max_heavy_atoms:
        raise OutOfScope(
            f"{heavy} heavy atoms, the limit is {max_heavy_atoms}; raise max_heavy_atoms in [stage.intake] "
            "if the machine has the hours for it"
        )
    _check_elements(molecule)
    _check_closed_shell(molecule)


def _check_elements(molecule: Mol) -> None:
    strange = sorted({a.GetSymbol() for a in molecule.GetAtomsMatchingQuery(_strange_element())})
    if strange and not {"*", "R"}.isdisjoint(strange):
        raise OutOfScope("the structure has a placeholder atom (*, R); draw the whole molecule")
    if strange:
        raise OutOfScope(
            f"contains {', '.join(strange)}; handled are {' '.join(HANDLED)}, and simple metal ions as counter-ions"
        )


def _check_closed_shell(molecule: Mol) -> None:
    """RDKit gives every atom with unfilled valence its radical electrons, so an odd count shows there too."""
    radicals = molecule.GetAtomsMatchingQuery(_radical())
    for first in radicals:
        raise OutOfScope(
            f"open shell: {first.GetNumRadicalElectrons()} unpaired electron(s) at atom {first.GetIdx() + 1} "
            f"({first.GetSymbol()}); only closed-shell species are handled"
        )


@lru_cache(maxsize=1)
def _strange_element() -> QueryAtom:
    smarts = "[" + ";".join(f"!#{_atomic_number(symbol)}" for symbol in HANDLED) + "]"
    return Chem.AtomFromSmarts(smarts)


def _atomic_number(symbol: str) -> int:
    return int(Chem.GetPeriodicTable().GetAtomicNumber(symbol))


@lru_cache(maxsize=1)
def _radical() -> QueryAtom:
    return rdqueries.NumRadicalElectronsGreaterQueryAtom(0)


def _open_stereo(molecule: Mol) -> tuple[str, ...]:
    """Notes on stereo that the drawing leaves open; the embedding settles it."""
    open_places = [
        place.type for place in Chem.FindPotentialStereo(molecule) if place.specified != Chem.StereoSpecified.Specified
    ]
    bonds = open_places.count(Chem.StereoType.Bond_Double)
    centres = open_places.count(Chem.StereoType.Atom_Tetrahedral)
    said = [(bonds, "double bond(s)", "E or Z"), (centres, "centre(s)", "R or S")]
    return tuple(f"{count} {what} drawn without {which}; the embedding chooses" for count, what, which in said if count)
