"""The record of anchoring: what the user's own measurements did to one candidate's numbers, and which ones.

A library that carries measured maxima corrects the predictions of its relatives; see the stage `anchor`.
"""

from __future__ import annotations

from pydantic import Field

from .base import Frozen, Record

MEASURED = "measured_"
"""Prefix of a column of the library, and of a column of the table, that holds measured values of a quantity."""
UNANCHORED = "unanchored_"
"""Prefix of a quantity as it was before measurements moved it."""


class AnchoringDye(Frozen):
    """One measured dye and what it does: ``weight`` times its residual is its share of the shift, in eV."""

    name: str
    medium: str
    measured_nm: float
    predicted_nm: float = Field(description="before anchoring")
    similarity: float = Field(
        ge=0, le=1, description="to the candidate: cosine of Morgan counts (square roots, radius 2)"
    )
    weight: float = Field(description="1 takes its residual over as it is, 0 takes nothing")
    shift_ev: float


class AnchoredQuantity(Frozen):
    """One quantity before and after, each with its central interval of probability ``coverage``, in nm."""

    quantity: str
    coverage: float
    before_nm: float
    before_low_nm: float
    before_high_nm: float
    after_nm: float
    after_low_nm: float
    after_high_nm: float
    shift_ev: float
    error_ratio: float = Field(gt=0, le=1, description="width of the interval in eV, after over before")
    anchors: tuple[AnchoringDye, ...] = Field(description="the measured dyes with the largest weights")
    further_anchors: int = Field(default=0, description="measured dyes with a part in it that are not listed")
    caution: str | None = None


class Anchor(Record):
    """What measured dyes changed for one candidate; there is none for a candidate that they leave as it was.

    The changed numbers stand in for those of the quantities they are named after, which nobody else offers twice.
    """

    kind = "anchor"
    changes: tuple[AnchoredQuantity, ...] = Field(min_length=1)
