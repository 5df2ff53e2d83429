"""Settings of the check by TD-DFT."""

from __future__ import annotations

from orchil_schemas import Frozen
from pydantic import Field


class DftSettings(Frozen):
    """Functional, basis and size; the defaults are the fastest that keep order and polarisation of the first bands."""

    functional: str = Field(default="camb3lyp", description="density functional by its name in PySCF")
    basis: str = Field(default="def2-svp", description="basis set by its name in PySCF")
    roots: int = Field(default=4, ge=1, le=20, description="singlets computed")
    largest: int = Field(default=70, ge=2, le=300, description="more atoms than this are refused")
