"""Light species first: molar mass per heavy atom, for a ranking that nothing else would give."""

from __future__ import annotations

from collections.abc import Iterable
from typing import ClassVar

import pluggy
from orchil_schemas import Availability, Context, Frozen, Identity, Inputs, NoSettings, Quantity, QuantityInfo, Record

ORCHIL_API = "1.0"
hookimpl = pluggy.HookimplMarker("orchil")
INFO = QuantityInfo(name="mass_per_heavy_atom", unit="g/mol", meaning="molar mass for each atom other than hydrogen")


class Lightness(Record):
    """Molar mass per heavy atom."""

    kind = "lightness"
    mass_per_heavy_atom_g_mol: float
    offers: ClassVar[tuple[QuantityInfo, ...]] = (INFO,)

    def quantities(self) -> tuple[Quantity, ...]:
        """The number as briefs see it."""
        return (Quantity(name=INFO.name, value=self.mass_per_heavy_atom_g_mol, unit=INFO.unit),)


class Weigh:
    """Identity to Lightness."""

    name = "lightness"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity,)
    makes: tuple[type[Record], ...] = (Lightness,)
    Settings: type[Frozen] = NoSettings
    time_limit_seconds = 10.0

    def found(self) -> Availability:
        """Needs nothing."""
        return Availability(True)

    def run(self, inputs: Inputs, settings: NoSettings, context: Context) -> Iterable[Record]:
        """One Lightness."""
        identity = inputs[Identity]
        yield Lightness(mass_per_heavy_atom_g_mol=identity.molar_mass_g_mol / identity.heavy_atoms)


@hookimpl
def orchil_stages() -> list[Weigh]:
    """The stage of this plugin."""
    return [Weigh()]
