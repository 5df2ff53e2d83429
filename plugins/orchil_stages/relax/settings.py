"""Settings of the stage `relax`."""

from __future__ import annotations

from orchil_schemas import Frozen
from pydantic import Field


class RelaxSettings(Frozen):
    """When a relaxation counts as done and what it may cost."""

    gradient_norm: float = Field(default=1.5e-3, gt=0, description="hartree/bohr, Euclidean norm over all coordinates")
    energy_left_hartree: float = Field(default=1e-5, gt=0, description="predicted energy still to be won")
    max_gradients: int = Field(default=150, ge=1, description="evaluations for one structure")
    accuracy: float = Field(
        default=10.0, gt=0, le=30, description="accuracy of the self-consistent field; small is tight"
    )
