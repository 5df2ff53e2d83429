"""The transfer stage: the Foerster radius between a dye and itself, a given acceptor or a given donor."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    FloatArray,
    Frozen,
    Inputs,
    Medium,
    OutOfScope,
    Record,
    Transfer,
)
from pydantic import Field, model_validator
from typing_extensions import Self

from orchil_stages.installed import availability

KAPPA2_RANDOM = 0.6667


class TransferSettings(Frozen):
    """The partner of every dye of the library; without one, transfer goes to another molecule of the dye itself."""

    acceptor_max_nm: float | None = Field(default=None, ge=150, le=5000, description="its absorption maximum")
    acceptor_absorptivity: float | None = Field(default=None, gt=0, description="there, M^-1 cm^-1")
    donor_max_nm: float | None = Field(default=None, ge=150, le=5000, description="emission maximum of a given donor")
    partner_width_ev: float = Field(default=0.3, gt=0, le=3, description="full width of the partner's band")
    quantum_yield: float = Field(default=1.0, gt=0, le=1, description="of the donor without acceptor")
    kappa2: float = Field(default=KAPPA2_RANDOM, gt=0, le=4, description="orientation factor; 2/3: turning freely")
    refractive_index: float | None = Field(default=None, ge=1, le=5, description="left out: that of the medium")

    @model_validator(mode="after")
    def _one_partner(self) -> Self:
        if self.acceptor_max_nm is not None and self.donor_max_nm is not None:
            raise ValueError("give an acceptor or a donor, not both: the dye is the other one")
        if (self.acceptor_max_nm is None) != (self.acceptor_absorptivity is None):
            raise ValueError("acceptor_max_nm and acceptor_absorptivity belong together: give both")
        return self


class HandOver:
    """Foerster radius with the partner of the settings."""

    name = "transfer"
    version = "1"
    needs: tuple[type[Record], ...] = (Medium, Band)
    makes: tuple[type[Record], ...] = (Transfer,)
    Settings: type[Frozen] = TransferSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy and SciPy."""
        return availability("numpy", "scipy")

    def run(self, inputs: Inputs, settings: TransferSettings, context: Context) -> Iterable[Record]:
        """One Transfer; OutOfScope where the dye is the donor and its emission maximum is not known."""
        yield transfer(inputs[Band], settings, settings.refractive_index or inputs[Medium].refractive_index)


@dataclass(frozen=True)
class Possibilities:
    """Equally probable positions (eV) of a band and its width (eV)."""

    energy_ev: FloatArray
    width_ev: float


def transfer(band: Band, settings: TransferSettings, refractive_index: float) -> Transfer:
    """Overlap and radius with the intervals of position and absorptivity carried over."""
    from orchil_stages.optics.transfer import forster_radius_nm, gaussian_overlap
    from orchil_stages.spectrum.spread import possible

    maybe = possible(band)
    absorbs = Possibilities(HC_EV_NM / band.absorption_max_nm + maybe.shift_ev, band.width_ev)
    heights = band.molar_absorptivity * maybe.factor
    donor, acceptor = "the dye", "the dye"
    if settings.donor_max_nm is None:
        emits = _emission(band)
    else:
        donor = f"{settings.donor_max_nm:g} nm"
        emits = _given(settings.donor_max_nm, settings.partner_width_ev)
    if settings.acceptor_max_nm is not None and settings.acceptor_absorptivity is not None:
        acceptor = f"{settings.acceptor_max_nm:g} nm, {settings.acceptor_absorptivity:g} M^-1 cm^-1"
        absorbs = _given(settings.acceptor_max_nm, settings.partner_width_ev)
        heights = np.array([settings.acceptor_absorptivity])
    per_height = gaussian_overlap(emits.energy_ev[:, None], emits.width_ev, absorbs.energy_ev, absorbs.width_ev)
    overlap = per_height[..., None] * heights
    radius = 10 * forster_radius_nm(overlap, settings.quantum_yield, refractive_index, settings.kappa2)
    return Transfer(
        donor=donor,
        acceptor=acceptor,
        overlap_m_cm_nm4=maybe.spread(overlap),
        foerster_radius_angstrom=maybe.spread(radius),
        quantum_yield=settings.quantum_yield,
        kappa2=settings.kappa2,
        refractive_index=refractive_index,
    )


def _given(position_nm: float, width_ev: float) -> Possibilities:
    return Possibilities(np.array([HC_EV_NM / position_nm]), width_ev)


def _emission(band: Band) -> Possibilities:
    """Where the dye emits; the width is that of its absorption (mirror image)."""
    from orchil_stages.spectrum.spread import POSITIONS, two_halves

    if band.emission_max_nm is None:
        raise OutOfScope("the calibration tells no emission maximum for this dye, which is the donor")
    middle = HC_EV_NM / band.emission_max_nm
    low = HC_EV_NM / (band.emission_high_nm or band.emission_max_nm)
    high = HC_EV_NM / (band.emission_low_nm or band.emission_max_nm)
    return Possibilities(middle + two_halves(POSITIONS, low - middle, high - middle, band.coverage), band.width_ev)
