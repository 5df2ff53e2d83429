"""Find a medium by name, alias, SMILES, or as ``film(eps=3.0, n=1.6)``."""

from __future__ import annotations

import difflib
import re
from functools import lru_cache

from orchil_schemas import BadInput, Medium

from .table import entries, medium_from_constants

_IGNORED = re.compile(r"[\s\-_\u2010-\u2015]+")
_FILM = re.compile(r"(?:film|host)\((?P<inside>.*)\)")
_FILM_FORM = "film(eps=3.0, n=1.6)"
_NUMBER = re.compile(r"(?P<key>eps|n)=(?P<value>\d+(?:\.\d*)?)")


@lru_cache(maxsize=1024)
def lookup(text: str) -> Medium:
    """The medium a text means; case, spaces and hyphens do not matter. BadInput names what comes nearest."""
    key = _fold(text)
    if key in _by_name():
        return _by_name()[key]
    film = _FILM.fullmatch("".join(text.split()).lower())
    if film:
        return _film(film["inside"], text)
    found = _by_smiles().get(text.strip()) or _by_smiles().get(_canonical(text))
    if found is None:
        raise BadInput(_unknown(text, key))
    return found


def known_media() -> tuple[Medium, ...]:
    """Every medium that has a name, the gas phase first."""
    return tuple(entry.medium for entry in entries())


def known_smiles() -> dict[str, Medium]:
    """The solvents by SMILES as written in the table."""
    return {entry.smiles: entry.medium for entry in entries() if entry.smiles}


def _fold(text: str) -> str:
    return _IGNORED.sub("", text).lower()


@lru_cache(maxsize=1)
def _by_name() -> dict[str, Medium]:
    return {_fold(name): entry.medium for entry in entries() for name in (entry.medium.name, *entry.aliases)}


@lru_cache(maxsize=1)
def _by_smiles() -> dict[str, Medium]:
    """By the SMILES of the table and its canonical form in this version of RDKit."""
    written = known_smiles()
    return written | {_canonical(smiles, keep_isotopes=True): medium for smiles, medium in written.items()}


def _canonical(text: str, *, keep_isotopes: bool = False) -> str:
    """Canonical SMILES, or empty; isotopes are dropped unless the table tells them apart."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(text.strip())
    if molecule is None or molecule.GetNumAtoms() == 0:
        return ""
    smiles = str(Chem.MolToSmiles(molecule))
    if keep_isotopes or smiles in known_smiles():
        return smiles
    for atom in molecule.GetAtoms():
        atom.SetIsotope(0)
    return str(Chem.MolToSmiles(Chem.RemoveHs(molecule)))


def _film(inside: str, text: str) -> Medium:
    pairs = [_NUMBER.fullmatch(part) for part in inside.split(",")]
    given = {pair["key"]: float(pair["value"]) for pair in pairs if pair}
    if None in pairs or len(pairs) != 2 or set(given) != {"eps", "n"}:
        raise BadInput(f"medium '{text}': a film or host is written {_FILM_FORM}")
    if min(given.values()) < 1:
        raise BadInput(f"medium '{text}': eps and n of a film are 1 or more, e.g. {_FILM_FORM}")
    return medium_from_constants(f"film(eps={given['eps']:g}, n={given['n']:g})", given["eps"], given["n"])


def _unknown(text: str, key: str) -> str:
    if not key:
        return f"no medium given; write a solvent's name, 'gas phase', or {_FILM_FORM}"
    near = difflib.get_close_matches(key, _by_name(), n=5, cutoff=0.6)
    names = list(dict.fromkeys(_by_name()[match].name for match in near))
    nearest = f"nearest: {', '.join(names)}" if names else "nothing known comes near"
    return f"unknown medium '{text}' ({nearest}); give a solvent's name or SMILES, 'gas phase', or {_FILM_FORM}"
