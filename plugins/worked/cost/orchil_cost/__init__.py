"""What the starting materials of a candidate cost, by the user's own price list."""

from __future__ import annotations

from collections.abc import Iterable
from importlib.util import find_spec
from typing import ClassVar

import pluggy
from orchil_schemas import Availability, Context, Frozen, Identity, Inputs, Quantity, QuantityInfo, Record
from orchil_schemas.files import InputFile
from pydantic import Field

ORCHIL_API = "1.0"
hookimpl = pluggy.HookimplMarker("orchil")

COST = QuantityInfo(
    name="material_cost_per_gram", unit="price/g", meaning="starting materials for one gram, by your list"
)
STEPS = QuantityInfo(name="synthesis_steps", unit="1", meaning="steps of the longest line of the cheapest route")


class SyntheticCost(Record):
    """The cheapest route that the price list allows; without one, what is missing from the list."""

    kind = "synthetic_cost"
    cost_per_gram: float | None = None
    steps: int | None = None
    bought: tuple[str, ...] = Field(default=(), description="starting materials as SMILES, handles taken for hydrogen")
    missing: tuple[str, ...] = Field(default=(), description="pieces that are not on the list")
    offers: ClassVar[tuple[QuantityInfo, ...]] = (COST, STEPS)

    def quantities(self) -> tuple[Quantity, ...]:
        """Cost and steps; nothing where there is no route."""
        if self.cost_per_gram is None or self.steps is None:
            return ()
        return (
            Quantity(name=COST.name, value=self.cost_per_gram, unit=COST.unit),
            Quantity(name=STEPS.name, value=self.steps, unit=STEPS.unit),
        )


class CostSettings(Frozen):
    """The price list, and what a step of synthesis loses and costs."""

    price_list: InputFile | None = Field(
        default=None, description="CSV with smiles and price_per_gram; left out: the invented list of the package"
    )
    step_yield: float = Field(default=0.7, gt=0, le=1, description="yield of one step")
    step_cost: float = Field(default=0.0, ge=0, description="reagents and work of one step, price for one mol")


class Cost:
    """Identity to SyntheticCost."""

    name = "cost"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity,)
    makes: tuple[type[Record], ...] = (SyntheticCost,)
    Settings: type[Frozen] = CostSettings
    time_limit_seconds = 60.0

    def found(self) -> Availability:
        """Needs RDKit."""
        return Availability(find_spec("rdkit") is not None, hint="pip install rdkit")

    def run(self, inputs: Inputs, settings: CostSettings, context: Context) -> Iterable[Record]:
        """One SyntheticCost; BadInput names the line of the list that cannot be used."""
        from .prices import example, prices_per_mol
        from .routes import Rates, cheapest

        text = example() if settings.price_list is None else settings.price_list.read_text()
        rates = Rates(settings.step_yield, settings.step_cost)
        answer = cheapest(inputs[Identity].smiles, prices_per_mol(text), rates)
        if answer.route is None:
            yield SyntheticCost(missing=answer.missing)
        else:
            yield SyntheticCost(
                cost_per_gram=answer.route.cost_per_mol / answer.molar_mass,
                steps=answer.route.steps,
                bought=answer.route.bought,
            )


@hookimpl
def orchil_stages() -> list[Cost]:
    """The stage of this plugin."""
    return [Cost()]
