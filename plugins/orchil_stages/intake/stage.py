"""The stage `intake`: LibraryRow -> Identity, IntakeNotes, Medium."""

from __future__ import annotations

from collections.abc import Iterable

from orchil_schemas import (
    Availability,
    BadInput,
    Brief,
    Context,
    Frozen,
    Identity,
    Inputs,
    IntakeNotes,
    LibraryRow,
    Medium,
    Record,
)
from pydantic import Field

from orchil_stages.installed import availability
from orchil_stages.medium import lookup


class IntakeSettings(Frozen):
    """How large a species may be."""

    max_heavy_atoms: int = Field(default=120, ge=1, description="larger species are out of scope")


class Intake:
    """Reads, checks and names the species of a row. Changes no protonation state, tautomer or charge."""

    name = "intake"
    version = "1"
    needs: tuple[type[Record], ...] = (LibraryRow,)
    makes: tuple[type[Record], ...] = (Identity, IntakeNotes, Medium)
    Settings: type[Frozen] = IntakeSettings
    time_limit_seconds = 60.0

    def found(self) -> Availability:
        """Is RDKit installed?"""
        return availability("rdkit")

    def check_brief(self, brief: Brief) -> list[str]:
        """Problems of the brief that only chemistry can see: a medium that is not known."""
        problem = _medium_problem(brief.medium)
        return [f"medium: {problem}"] if problem else []

    def run(self, inputs: Inputs, settings: IntakeSettings, context: Context) -> Iterable[Record]:
        """Identity, notes and medium; BadInput: cannot be read, OutOfScope: is not handled."""
        from .reading import read_structure
        from .species import take_species

        row = inputs[LibraryRow]
        medium = lookup(row.medium or "gas phase")
        drawing = read_structure(row.structure, row.format)
        identity, notes = take_species(drawing, max_heavy_atoms=settings.max_heavy_atoms)
        if row.charge is not None and row.charge != identity.charge:
            raise BadInput(
                f"the charge column says {row.charge:+d}, the structure without its counter-ions has "
                f"{identity.charge:+d}; correct one of them or leave the charge out"
            )
        yield from (identity, notes, medium)


def _medium_problem(text: str) -> str:
    try:
        lookup(text)
    except BadInput as problem:
        return str(problem)
    return ""
