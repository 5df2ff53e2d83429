"""The written brief: what is wanted, how many to pick, and the settings of stages."""

from __future__ import annotations

from typing import Annotated, Any

from pydantic import Field, field_validator, model_validator
from typing_extensions import Self

from .base import Frozen

Positive = Annotated[float, Field(gt=0)]


class Want(Frozen):
    """One wish about one quantity: ``between``, ``at_least``, ``at_most``, or ``near`` with ``within``.

    ``must = true`` drops candidates whose probability of meeting it is below one half from the picks.
    """

    quantity: str
    between: tuple[float, float] | None = None
    at_least: float | None = None
    at_most: float | None = None
    near: float | None = None
    within: Positive | None = None
    unit: str | None = Field(default=None, description="optional check: must be the unit of the quantity")
    weight: Positive = 1.0
    must: bool = False

    @field_validator("between")
    @classmethod
    def _window_not_empty(cls, window: tuple[float, float] | None) -> tuple[float, float] | None:
        if window is not None and not window[0] < window[1]:
            raise ValueError(f"between = [{window[0]:g}, {window[1]:g}] is empty: write the smaller number first")
        return window

    @model_validator(mode="after")
    def _one_form(self) -> Self:
        forms = [name for name in ("between", "at_least", "at_most", "near") if getattr(self, name) is not None]
        if len(forms) != 1:
            said = " and ".join(forms) or "none"
            raise ValueError(f"give exactly one of between, at_least, at_most, near (found {said})")
        if (self.near is None) != (self.within is None):
            raise ValueError("near and within go together: near = 530, within = 15")
        return self

    @property
    def limits(self) -> tuple[float, float]:
        """The window as (low, high); an open side is infinite."""
        if self.between is not None:
            return self.between
        if self.near is not None and self.within is not None:
            return self.near - self.within, self.near + self.within
        low = self.at_least if self.at_least is not None else -float("inf")
        high = self.at_most if self.at_most is not None else float("inf")
        return low, high


class Pick(Frozen):
    """How many to pick and how different they must be (Tanimoto distance of structure fingerprints)."""

    count: int = Field(default=10, ge=1)
    spread: float = Field(default=0.35, ge=0, lt=1)


class Brief(Frozen):
    """One brief; ``stage`` holds settings by stage name, checked against each stage's own settings model."""

    title: str
    medium: str = "gas phase"
    note: str = ""
    want: tuple[Want, ...] = Field(min_length=1)
    pick: Pick = Pick()
    use: dict[str, str] = Field(default_factory=dict, description="record kind -> stage that shall make it")
    stage: dict[str, dict[str, Any]] = Field(default_factory=dict)
