"""A filter: are all ring systems of a candidate on a list of what can be bought?"""

from __future__ import annotations

from collections.abc import Iterable
from importlib.util import find_spec
from typing import ClassVar

import pluggy
from orchil_schemas import Availability, Context, Frozen, Identity, Inputs, OutOfScope, Quantity, QuantityInfo, Record
from orchil_schemas.files import InputFile
from pydantic import Field

ORCHIL_API = "1.0"
hookimpl = pluggy.HookimplMarker("orchil")

INFO = QuantityInfo(
    name="unlisted_fragments", unit="1", meaning="ring systems that are not on the list of what can be bought"
)


class Fragments(Record):
    """The ring systems of the species, and those among them that are not on the list."""

    kind = "fragments"
    ring_systems: tuple[str, ...]
    unlisted: tuple[str, ...]
    offers: ClassVar[tuple[QuantityInfo, ...]] = (INFO,)

    def quantities(self) -> tuple[Quantity, ...]:
        """How many are not on the list."""
        return (Quantity(name=INFO.name, value=len(self.unlisted), unit=INFO.unit),)


class FragmentSettings(Frozen):
    """The list, and how strict the filter is."""

    bought: InputFile | None = Field(
        default=None, description="file with one SMILES a line; left out: common ring systems"
    )
    refuse: bool = Field(default=False, description="candidates with a ring system off the list fail")


class FragmentRule:
    """Identity to Fragments."""

    name = "fragments"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity,)
    makes: tuple[type[Record], ...] = (Fragments,)
    Settings: type[Frozen] = FragmentSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs RDKit."""
        return Availability(find_spec("rdkit") is not None, hint="pip install rdkit")

    def run(self, inputs: Inputs, settings: FragmentSettings, context: Context) -> Iterable[Record]:
        """One Fragments; OutOfScope names what is not on the list where the brief says ``refuse = true``."""
        from .rule import common_rings, listed, ring_systems

        known = listed(common_rings() if settings.bought is None else settings.bought.read_text())
        found = ring_systems(inputs[Identity].smiles)
        unlisted = tuple(one for one in found if one not in known)
        if unlisted and settings.refuse:
            raise OutOfScope(f"not on the list of what can be bought: {', '.join(unlisted)}")
        yield Fragments(ring_systems=found, unlisted=unlisted)


@hookimpl
def orchil_stages() -> list[FragmentRule]:
    """The stage of this plugin."""
    return [FragmentRule()]
