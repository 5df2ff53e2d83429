"""The redox stage: Orbitals and Band to a Redox."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Literal

from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    Frozen,
    Identity,
    Inputs,
    Medium,
    Orbitals,
    OutOfScope,
    Record,
    Redox,
    Spread,
)
from pydantic import Field

from orchil_stages.installed import availability


class RedoxSettings(Frozen):
    """The scale."""

    reference: Literal["SCE", "Fc", "NHE"] = Field(
        default="SCE", description="electrode: saturated calomel, ferrocene, normal hydrogen"
    )


class EstimateRedox:
    """Potentials from orbital levels and the energy of the excited singlet."""

    name = "redox"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity, Medium, Orbitals, Band)
    makes: tuple[type[Record], ...] = (Redox,)
    Settings: type[Frozen] = RedoxSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy."""
        return availability("numpy")

    def run(self, inputs: Inputs, settings: RedoxSettings, context: Context) -> Iterable[Record]:
        """One Redox; OutOfScope where the emission maximum, and with it the excited state's energy, is not known."""
        yield redox(inputs[Identity], inputs[Medium], inputs[Orbitals], inputs[Band], settings)


def redox(identity: Identity, medium: Medium, orbitals: Orbitals, band: Band, settings: RedoxSettings) -> Redox:
    """Potentials of ground and excited state (Rehm and Weller, Isr. J. Chem. 8, 259, 1970: E* = E -/+ E00)."""
    from .levels import FROM_SCE, features, line

    if band.emission_max_nm is None:
        raise OutOfScope("the calibration tells no emission maximum: the energy of the excited state is not known")
    excited = HC_EV_NM * (1 / band.absorption_max_nm + 1 / band.emission_max_nm) / 2
    size = orbitals.gap_ev, identity.charge, identity.heavy_atoms
    shift = FROM_SCE[settings.reference]
    gives, takes = line("oxidation"), line("reduction")
    oxidation = gives.potential(features(orbitals.homo_ev, *size)) + shift
    reduction = takes.potential(features(orbitals.lumo_ev, *size)) + shift
    wider = _energy_error(band)
    return Redox(
        reference=settings.reference,
        oxidation_potential_v=_spread(oxidation, gives.error),
        reduction_potential_v=_spread(reduction, takes.error),
        excited_oxidation_potential_v=_spread(oxidation - excited, (gives.error**2 + wider**2) ** 0.5),
        excited_reduction_potential_v=_spread(reduction + excited, (takes.error**2 + wider**2) ** 0.5),
        cautions=tuple(_cautions(identity, medium)),
    )


def _energy_error(band: Band) -> float:
    """Half-width (eV) of the interval of the band's position, taken over to a coverage of 0.9."""
    from scipy.special import ndtri

    from .levels import COVERAGE

    half = HC_EV_NM * (1 / band.absorption_low_nm - 1 / band.absorption_high_nm) / 2
    return float(half * ndtri((1 + COVERAGE) / 2) / ndtri((1 + band.coverage) / 2))


def _spread(value: float, error: float) -> Spread:
    from .levels import COVERAGE

    return Spread(value=value, low=value - error, high=value + error, coverage=COVERAGE)


_POLAR = 15.0


def _cautions(identity: Identity, medium: Medium) -> Iterator[str]:
    yield "potentials as in acetonitrile, estimated from orbital levels: a guide to an order, not to a driving force"
    if abs(identity.charge) > 1:
        yield "no compound of this charge is among those the estimate was fitted to"
    if identity.charge and medium.dielectric_constant < _POLAR:
        yield "levels of an ion in a medium of low permittivity: the estimate is off by much"
