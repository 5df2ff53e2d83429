"""The stage `embed`: Identity -> Conformers."""

from __future__ import annotations

from collections.abc import Iterable
from importlib.metadata import PackageNotFoundError, version

from orchil_schemas import Availability, Conformers, Context, Frozen, Identity, Inputs, Record
from pydantic import Field, model_validator
from typing_extensions import Self


class EmbedSettings(Frozen):
    """How many structures are tried and handed on, and how long one rung of the ladder may take."""

    conformers: int = Field(default=1, ge=1, le=50, description="structures handed on, best first")
    candidates: int | None = Field(
        default=None,
        ge=1,
        le=200,
        description="structures embedded and ranked by the force field; None: as many as are handed on, "
        "six at least where a double bond has no drawn stereo",
    )
    rung_seconds: int = Field(default=15, ge=1, description="time limit of one rung of the embedding ladder")
    force_field_steps: int = Field(default=500, ge=0, description="most minimiser steps for one structure")

    @model_validator(mode="after")
    def _enough_candidates(self) -> Self:
        if self.candidates is not None and self.candidates < self.conformers:
            raise ValueError(f"candidates = {self.candidates} is less than conformers = {self.conformers}; raise it")
        return self


class Embed:
    """Makes three-dimensional starting structures from the canonical SMILES; see :mod:`.ladder`."""

    name = "embed"
    version = "2"
    needs: tuple[type[Record], ...] = (Identity,)
    makes: tuple[type[Record], ...] = (Conformers,)
    Settings: type[Frozen] = EmbedSettings
    time_limit_seconds = 120.0

    def found(self) -> Availability:
        """Is RDKit installed?"""
        try:
            return Availability(ok=True, versions={"rdkit": version("rdkit")})
        except PackageNotFoundError:
            return Availability(ok=False, hint="pip install rdkit")

    def run(self, inputs: Inputs, settings: EmbedSettings, context: Context) -> Iterable[Record]:
        """One Conformers record; NotConverged (code "no_3d") when every rung of the ladder fails."""
        from .ladder import embed_structures

        identity = inputs[Identity]
        yield embed_structures(identity.smiles, settings, seed=context.seed, deadline=context.deadline)
