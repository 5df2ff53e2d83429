"""The solvatochromism stage: dipoles of both states in a sphere to slopes and shifts."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    BadInput,
    Band,
    Brief,
    Context,
    Frozen,
    Identity,
    Inputs,
    Medium,
    Orbitals,
    Record,
    Solvatochromism,
    Transitions,
)
from pydantic import Field

from orchil_stages.installed import availability


class SolvatochromismSettings(Frozen):
    """Two media to compare, and the size of the sphere."""

    from_medium: str = Field(default="n-hexane", description="name, alias, SMILES or film(eps=..., n=...)")
    to_medium: str = Field(default="acetonitrile", description="the shift is counted from the first to this")
    radius_angstrom: float | None = Field(
        default=None, gt=0.5, le=30, description="of Onsager's sphere; left out: from the volume of the dye"
    )


class Solvate:
    """Lippert-Mataga slopes and the McRae shift of one dye."""

    name = "solvatochromism"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity, Medium, Orbitals, Transitions, Band)
    makes: tuple[type[Record], ...] = (Solvatochromism,)
    Settings: type[Frozen] = SolvatochromismSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy and RDKit."""
        return availability("numpy", "rdkit")

    def check_brief(self, brief: Brief) -> list[str]:
        """Are both media known?"""
        given = brief.stage.get(self.name, {})
        return [text for key in ("from_medium", "to_medium") if (text := _problem(key, given.get(key)))]

    def run(self, inputs: Inputs, settings: SolvatochromismSettings, context: Context) -> Iterable[Record]:
        """One Solvatochromism."""
        yield solvatochromism(inputs, settings)


def _problem(key: str, text: object) -> str | None:
    from orchil_stages.medium import lookup

    if not isinstance(text, str):
        return None
    try:
        lookup(text)
    except BadInput as error:
        return f"[stage.solvatochromism] {key}: {error}"
    return None


def solvatochromism(inputs: Inputs, settings: SolvatochromismSettings) -> Solvatochromism:
    """Slopes and shift of the reported band, with the change of dipole that solvent shifts show."""
    from orchil_stages.medium import lookup
    from orchil_stages.optics import solvatochromism as optics
    from orchil_stages.optics.units import ev_to_cm1

    from .cavity import onsager_radius, volume
    from .dipoles import effective

    band, ground, numbers = inputs[Band], inputs[Orbitals].dipole_debye, effective()
    size = volume(inputs[Identity].smiles)
    change = numbers.change(inputs[Transitions].dipole_change_debye[band.state], size)
    radius = settings.radius_angstrom or onsager_radius(size)
    media = [lookup(name) for name in (settings.from_medium, settings.to_medium)]
    eps, index = [m.dielectric_constant for m in media], [m.refractive_index for m in media]
    before, after = (numbers.absorption * optics.mcrae_shift(ground, change, radius, eps, index)).tolist()
    absorption = numbers.absorption * float(optics.absorption_slope(ground, change, radius))
    length = float(np.linalg.norm(change))
    stokes = float(optics.lippert_mataga_slope(length, radius))
    centre = float(ev_to_cm1(HC_EV_NM / band.absorption_max_nm))
    moved = max(centre + after - before, centre / 4)
    return Solvatochromism(
        radius_angstrom=radius,
        ground_dipole_debye=float(np.linalg.norm(ground)),
        excited_dipole_debye=float(np.linalg.norm(ground + change)),
        dipole_change_debye=length,
        absorption_slope_cm1=absorption,
        emission_slope_cm1=absorption - stokes,
        stokes_slope_cm1=stokes,
        stokes_slope_etn_cm1=float(optics.stokes_slope_etn(length, radius)),
        from_medium=media[0].name,
        to_medium=media[1].name,
        solvent_shift_cm1=after - before,
        solvent_shift_nm=1e7 / moved - 1e7 / centre,
        cautions=tuple(_cautions(inputs[Identity], media)),
    )


def _cautions(identity: Identity, media: list[Medium]) -> Iterator[str]:
    if identity.charge:
        yield "the dipole of an ion depends on the origin: slopes and shift mean little"
    if any(medium.hydrogen_bond_donor for medium in media):
        yield "hydrogen bonds are not in the shift: a donor solvent can move the band further, and the other way"
