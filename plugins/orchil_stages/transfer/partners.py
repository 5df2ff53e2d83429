"""The library stage `partners`: for every dye the best acceptors of the library."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import HC_EV_NM, Availability, Brief, FloatArray, Frozen, IntArray, LibraryTable, Partners, Record
from pydantic import Field

from orchil_stages.installed import availability

from .stage import KAPPA2_RANDOM

_BLOCK = 256
"""Donors at a time: memory stays below 100 MB for tens of thousands of acceptors."""


class PartnersSettings(Frozen):
    """How many acceptors are kept for each donor, and what the radius is computed with."""

    partners: int = Field(default=0, ge=0, le=100, description="acceptors kept for each dye; 0: none")
    quantum_yield: float = Field(default=1.0, gt=0, le=1, description="of every donor")
    kappa2: float = Field(default=KAPPA2_RANDOM, gt=0, le=4, description="orientation factor")
    refractive_index: float = Field(default=1.4, ge=1, le=5, description="of what lies between them")


class FindPartners:
    """Foerster radii between pairs of the library, from the most likely bands."""

    name = "partners"
    version = "1"
    makes: tuple[type[Record], ...] = (Partners,)
    Settings: type[Frozen] = PartnersSettings

    def found(self) -> Availability:
        """Needs NumPy and SciPy."""
        return availability("numpy", "scipy")

    def reads(self, brief: Brief, settings: PartnersSettings) -> tuple[str, ...]:
        """Positions, absorptivity and width of the bands."""
        return _READS if settings.partners else ()

    def run(self, table: LibraryTable, brief: Brief, settings: PartnersSettings) -> Iterable[tuple[int, Record]]:
        """Yield (candidate, Partners) for every dye with a known emission that has a possible acceptor."""
        if settings.partners == 0:
            return
        absorbs, height, width, emits = (table.column(name).value for name in _READS)
        accepting = np.flatnonzero(np.isfinite(absorbs * height * width))
        donating = np.flatnonzero(np.isfinite(emits * width))
        candidate = np.asarray(table.candidate, dtype=np.int64)
        for start in range(0, len(donating), _BLOCK):
            donors = donating[start : start + _BLOCK]
            found = _best(donors, accepting, (absorbs, height, width, emits), settings)
            for donor, acceptors, radii in zip(donors.tolist(), *found, strict=True):
                if len(radii):
                    yield int(candidate[donor]), _record(candidate[acceptors], radii, settings)


_READS = ("absorption_max_nm", "molar_absorptivity", "band_width_ev", "emission_max_nm")


def _best(
    donors: IntArray, acceptors: IntArray, columns: tuple[FloatArray, ...], settings: PartnersSettings
) -> tuple[list[IntArray], list[FloatArray]]:
    """Rows and radii (angstrom) of the best acceptors of each donor, best first; never the donor itself."""
    from orchil_stages.optics.transfer import forster_radius_nm, gaussian_overlap

    absorbs, height, width, emits = columns
    overlap = height[acceptors] * gaussian_overlap(
        HC_EV_NM / emits[donors, None], width[donors, None], HC_EV_NM / absorbs[acceptors], width[acceptors]
    )
    overlap[donors[:, None] == acceptors] = 0.0
    count = min(settings.partners, len(acceptors))
    best = np.argsort(-overlap, axis=1, kind="stable")[:, :count]
    value = np.take_along_axis(overlap, best, axis=1)
    radius = 10 * forster_radius_nm(value, settings.quantum_yield, settings.refractive_index, settings.kappa2)
    kept = value > 0
    return [acceptors[row[k]] for row, k in zip(best, kept, strict=True)], [
        row[k] for row, k in zip(radius, kept, strict=True)
    ]


def _record(acceptor: IntArray, radius: FloatArray, settings: PartnersSettings) -> Partners:
    return Partners(
        acceptor=acceptor,
        foerster_radius_angstrom=np.round(radius, 2),
        quantum_yield=settings.quantum_yield,
        kappa2=settings.kappa2,
        refractive_index=settings.refractive_index,
    )
