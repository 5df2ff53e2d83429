"""Settings of the stage `embed`."""

from __future__ import annotations

from orchil_schemas import Frozen
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
