"""The table of media, read from ``media.csv`` once a process."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files

from orchil_schemas import Medium

from .solvation import parameter_set_for

GAS_PHASE = Medium(name="gas phase", dielectric_constant=1.0, refractive_index=1.0, solvation=None)


@dataclass(frozen=True)
class Entry:
    """One medium with the names it goes by; ``smiles`` is empty for hosts and the gas phase."""

    medium: Medium
    aliases: tuple[str, ...]
    smiles: str


@lru_cache(maxsize=1)
def entries() -> tuple[Entry, ...]:
    """All media, the gas phase first."""
    text = files(__package__).joinpath("media.csv").read_text(encoding="utf-8")
    lines = (line for line in text.splitlines() if not line.startswith("#"))
    gas = Entry(GAS_PHASE, ("gas", "vacuum", "none", "gasphase"), "")
    return (gas, *(_entry(row) for row in csv.DictReader(lines)))


def medium_from_constants(
    name: str,
    dielectric_constant: float,
    refractive_index: float,
    *,
    own_set: str | None = None,
    hydrogen_bond_donor: bool = False,
    et30_kcal_mol: float | None = None,
) -> Medium:
    """A medium with its own parameter set, or with a stand-in that is marked as one."""
    return Medium(
        name=name,
        dielectric_constant=dielectric_constant,
        refractive_index=refractive_index,
        solvation=own_set or parameter_set_for(dielectric_constant, hydrogen_bond_donor),
        solvation_stand_in=own_set is None,
        et30_kcal_mol=et30_kcal_mol,
        hydrogen_bond_donor=hydrogen_bond_donor,
    )


def _entry(row: dict[str, str]) -> Entry:
    medium = medium_from_constants(
        row["name"],
        float(row["eps"]),
        float(row["n"]),
        own_set=row["set"] or None,
        hydrogen_bond_donor=row["donor"] == "yes",
        et30_kcal_mol=float(row["et30"]) if row["et30"] else None,
    )
    return Entry(medium, tuple(row["aliases"].split("|")) if row["aliases"] else (), row["smiles"])
