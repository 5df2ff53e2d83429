"""One quantity of a library: what its measured dyes do to all others."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import (
    HC_EV_NM,
    MEASURED,
    AnchoredQuantity,
    AnchoringDye,
    FloatArray,
    IntArray,
    LibraryTable,
)

from .energies import Energies, reading_error
from .kernel import trained_kernel
from .likeness import Likeness
from .posterior import Measured, Posterior, Regression

LEAST_CORRELATION = 0.15
"""A candidate whose error goes together with that of no measured dye by more than this stays as it is."""
LEAST_WEIGHT = 0.01
MOST = 1500
"""So many measured dyes are taken at once; of more, those nearest to the rows at hand, which leaves wider intervals."""
LISTED = 5
"""So many measured dyes are named in a record, the largest weights first."""
WORDS = {"absorption_max_nm": "absorption maximum", "emission_max_nm": "emission maximum"}


@dataclass(frozen=True)
class Dyes:
    """What tells rows apart; media and species by number."""

    smiles: list[str]
    medium: IntArray
    species: IntArray

    @classmethod
    def of(cls, table: LibraryTable) -> Dyes:
        """Two rows with one canonical SMILES are one species."""
        media = list(table.medium) or [""] * len(table.smiles)
        return cls(list(table.smiles), *(np.unique(words, return_inverse=True)[1] for words in (media, table.smiles)))


class Series:
    """The measured dyes of one quantity; ``rows`` (m,) of the table are measured and predicted with an interval."""

    def __init__(self, table: LibraryTable, dyes: Dyes, quantity: str, reading_nm: float) -> None:
        self._table, self._dyes, self._quantity = table, dyes, quantity
        self._kernel = trained_kernel()
        self._column, values = table.column(quantity), table.column(MEASURED + quantity).value
        self._predicted = Energies.of(self._column)
        self._noise = reading_error(self._predicted.value, reading_nm, self._kernel.scatter_ev)
        self.rows = np.flatnonzero(np.isfinite(values) & self._predicted.known)
        self._measured_nm = values[self.rows]
        energy = HC_EV_NM / self._measured_nm
        noise = reading_error(energy, reading_nm, self._kernel.scatter_ev)
        residual = energy - self._predicted.value[self.rows]
        self._measured = Measured.of(self._predicted.error[self.rows], residual, noise)
        self._cautions = self._doubts(noise)
        self._solved: tuple[NDArray[np.intp], Regression] | None = None

    def compare(self, likeness: Likeness, among: NDArray[np.intp]) -> None:
        """Take the likeness to all measured dyes; ``among`` (m,) are the places of these there."""
        self._likeness, self._among = likeness, among

    def changes(self, rows: NDArray[np.intp], similarity: FloatArray) -> dict[int, AnchoredQuantity]:
        """What changes for some rows of the table, by row; ``similarity`` (n, all measured dyes)."""
        correlation = self._correlation(rows, similarity)
        near = self._predicted.known[rows] & (correlation.max(axis=1, initial=0.0) > LEAST_CORRELATION)
        if not near.any():
            return {}
        chosen, places = rows[near], self._nearest(correlation[near])
        found = self._regression(places).at(self._predicted.error[chosen], correlation[near][:, places])
        ratio = self._ratio(chosen, found)
        moved = self._predicted.moved(chosen, found.shift, ratio).T.tolist()
        alike = similarity[near][:, self._among[places]]
        return {
            row: self._change(
                row,
                moved[at],
                float(ratio[at]),
                float(found.shift[at]),
                self._anchors(places, found.weights[at], alike[at]),
            )
            for at, row in enumerate(chosen.tolist())
        }

    def _nearest(self, correlation: FloatArray) -> NDArray[np.intp]:
        """Places of the measured dyes that are taken, in order."""
        if correlation.shape[1] <= MOST:
            return np.arange(correlation.shape[1])
        return np.sort(np.argsort(-correlation.max(axis=0), kind="stable")[:MOST])

    def _regression(self, places: NDArray[np.intp]) -> Regression:
        """Solved for some of the measured dyes; the last one is kept, because most often it is asked for again."""
        if self._solved is None or not np.array_equal(self._solved[0], places):
            rows = self.rows[places]
            similarity = self._likeness.rows([self._dyes.smiles[row] for row in rows])
            correlation = self._correlation(rows, similarity)[:, places]
            self._solved = places, Regression(self._measured.some(places), correlation)
        return self._solved[1]

    def _correlation(self, rows: NDArray[np.intp], similarity: FloatArray) -> FloatArray:
        """Of the errors of rows (n,) with those of the measured dyes, (n, m)."""
        same = [codes[rows][:, None] == codes[self.rows] for codes in (self._dyes.medium, self._dyes.species)]
        return self._kernel.correlation(similarity[:, self._among], *same)

    def _ratio(self, rows: NDArray[np.intp], found: Posterior) -> FloatArray:
        """New over old width (n,): no prediction of a measurement is surer than a measurement."""
        floor = self._noise[rows] / self._predicted.error[rows]
        return np.asarray(np.minimum(1.0, np.maximum(np.sqrt(np.maximum(found.variance_left, 0.0)), floor)))

    def _change(
        self, row: int, after: list[float], ratio: float, shift: float, anchors: tuple[tuple[AnchoringDye, ...], int]
    ) -> AnchoredQuantity:
        column = self._column
        return AnchoredQuantity(
            quantity=self._quantity,
            coverage=float(column.coverage[row]),
            before_nm=float(column.value[row]),
            before_low_nm=float(column.low[row]),
            before_high_nm=float(column.high[row]),
            after_nm=after[0],
            after_low_nm=after[1],
            after_high_nm=after[2],
            shift_ev=shift,
            error_ratio=ratio,
            anchors=anchors[0],
            further_anchors=anchors[1],
            caution=self._cautions.get(row),
        )

    def _anchors(
        self, places: NDArray[np.intp], weights: FloatArray, alike: FloatArray
    ) -> tuple[tuple[AnchoringDye, ...], int]:
        """Those with the largest weights, and how many more have one to speak of."""
        order = np.argsort(-np.abs(weights), kind="stable")
        kept = order[np.abs(weights[order]) >= LEAST_WEIGHT].tolist()
        listed = (self._anchor(int(places[at]), float(weights[at]), float(alike[at])) for at in kept[:LISTED])
        return tuple(listed), max(0, len(kept) - LISTED)

    def _anchor(self, place: int, weight: float, similarity: float) -> AnchoringDye:
        row, table = int(self.rows[place]), self._table
        return AnchoringDye(
            name=table.name[row] if table.name else str(table.candidate[row]),
            medium=table.medium[row] if table.medium else "",
            measured_nm=float(self._measured_nm[place]),
            predicted_nm=float(self._column.value[row]),
            similarity=min(similarity, 1.0),
            weight=weight,
            shift_ev=weight * float(self._measured.residual[place]),
        )

    def _doubts(self, noise: FloatArray) -> dict[int, str]:
        """A sentence for every measured row that is far from its prediction; ``noise`` (m,) before it was raised."""
        away = np.abs(self._measured.residual) / np.hypot(self._measured.error, noise)
        return {
            int(self.rows[at]): (
                f"measured {WORDS[self._quantity]} {self._measured_nm[at]:.0f} nm is {away[at]:.0f} standard errors "
                f"from the predicted {self._column.value[self.rows[at]]:.0f} nm and counts less: check unit, medium, "
                "form and which band it is"
            )
            for at in np.flatnonzero(self._measured.doubtful)
        }
