"""Cross-validation over scaffolds, beside the baselines on the same rows."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import HC_EV_NM, FloatArray

from orchil_stages.emission.stage import together
from orchil_stages.optics.strength import einstein_a, gaussian_area, strength_from_area
from orchil_stages.optics.units import ev_to_cm1

from . import fingerprints
from .families import family
from .hamiltonian import FOLDS
from .learning import LEAST_YIELD, Unseen, cross_validate, held_out, targets, unseen_intervals
from .samples import Sample
from .tables import Errors, errors, linear_fit

COVERAGE = 0.9
_SMALLEST_SHIFT_NM = 10.0
_SOLVENTS = 3


@dataclass(frozen=True)
class Table:
    """Out-of-fold predictions beside what was measured."""

    by_fold: Sequence[Sequence[Sample]]
    unseen: Unseen
    tddft: Mapping[str, float]

    def __len__(self) -> int:
        return len(self._held)

    @property
    def dyes(self) -> int:
        """Number of different dyes."""
        return len({s.measured.smiles for s in self._held})

    @cached_property
    def _held(self) -> list[Sample]:
        """Each row as computed by the physics that had not seen it."""
        return held_out(self.by_fold, self.unseen)

    @property
    def measured(self) -> FloatArray:
        """Measured maxima, eV."""
        return np.array([s.measured.energy_ev for s in self._held])

    @property
    def physics(self) -> FloatArray:
        """First bright states, eV."""
        return np.array([s.physics_ev for s in self._held])

    @property
    def final(self) -> FloatArray:
        """After the correction, eV."""
        return self.physics + self.unseen.values["position"]

    def positions(self) -> Iterator[tuple[str, Errors]]:
        """The rows of the position table."""
        measured, everyone = self.measured, np.ones(len(self), dtype=bool)
        plain = self._fingerprint_only()
        known = np.array([self.tddft.get(s.measured.smiles, np.nan) for s in self._held])
        both = np.isfinite(known)
        gap = np.array([s.gap_ev for s in self._held])
        for name, values, rows in (
            ("response Hamiltonian, nothing after it", self.physics, everyone),
            ("with the learned correction", self.final, everyone),
            ("fingerprint-only process of the same kind", plain, everyone),
            ("GFN2 HOMO-LUMO gap after a linear fit", self._fitted(gap, everyone), everyone),
            ("rows with TD-DFT: response Hamiltonian", self.physics, both),
            ("rows with TD-DFT: with the learned correction", self.final, both),
            ("rows with TD-DFT: wB97X-D3 as published", known, both),
            ("rows with TD-DFT: wB97X-D3 after a linear fit", self._fitted(known, both), both),
        ):
            yield name, errors(values[rows], measured[rows])

    def _fingerprint_only(self) -> FloatArray:
        plain = fingerprints.plain_samples(self.by_fold[0])
        return np.asarray(cross_validate([plain] * FOLDS).values["position"])

    def _fitted(self, values: FloatArray, rows: NDArray[np.bool_]) -> FloatArray:
        """A line fitted outside of each fold."""
        made = np.full(len(self), np.nan)
        for held in range(FOLDS):
            out = self.unseen.folds == held
            slope, intercept = linear_fit(values[rows & ~out], self.measured[rows & ~out])
            made[out] = slope * values[out] + intercept
        return made

    def lines(self) -> Iterator[str]:
        """Everything else, a sentence each."""
        yield self._in_nm()
        yield from self._intervals()
        yield self._emission()
        yield self._rate()
        yield self._shifts()
        yield from self._families()

    def _in_nm(self) -> str:
        off = np.abs(HC_EV_NM / self.final - HC_EV_NM / self.measured)
        plain = np.abs(HC_EV_NM / self.physics - HC_EV_NM / self.measured)
        return f"position: {off.mean():.1f} nm with the correction, {plain.mean():.1f} nm by physics alone"

    def _intervals(self) -> Iterator[str]:
        """Coverage of the 90 % intervals, sizes of errors fitted outside of each fold."""
        fifths = np.argsort(np.argsort(self.unseen.likeness)) * 5 // len(self)
        for name, values in self._targets().items():
            known = np.isfinite(values)
            residual = values - self.unseen.values[name]
            low, high = unseen_intervals(residual, self.unseen, COVERAGE)
            inside, width = (residual >= low) & (residual <= high), high - low
            shares = [inside[known & (fifths == f)].mean() for f in range(5)]
            yield (
                f"{name}: mean absolute error {np.abs(residual[known]).mean():.3f} on {int(known.sum())} rows; 90 % "
                f"interval covers {inside[known].mean():.1%}, median width {np.median(width[known]):.3f}; by fifths, "
                f"least similar to training first: {', '.join(f'{share:.1%}' for share in shares)}"
            )

    def _targets(self) -> dict[str, FloatArray]:
        return targets(self._held)

    def _emission(self) -> str:
        measured = self._measured("emission_nm")
        known = np.isfinite(measured)
        found = HC_EV_NM / (self.physics - self.unseen.values["stokes"])
        return f"emission maximum: {np.abs(found - measured)[known].mean():.1f} nm on {int(known.sum())} rows"

    def _measured(self, name: str) -> FloatArray:
        return np.array([getattr(s.measured, name) or np.nan for s in self._held])

    def _rate(self) -> str:
        """Radiative rates against quantum yield over lifetime, beside those of the computed strength."""
        wanted = self._targets()["emission_strength"]
        known = np.isfinite(wanted)
        at_measured = HC_EV_NM / self._measured("emission_nm")[known]
        emits = (self.physics - self.unseen.values["stokes"])[known]
        measured = einstein_a(at_measured, 10.0 ** wanted[known])
        learned = einstein_a(emits, 10.0 ** self.unseen.values["emission_strength"][known])
        height, width = (10.0 ** self.unseen.values[name][known] for name in ("absorptivity", "width"))
        in_band = strength_from_area(gaussian_area(height, ev_to_cm1(width)))
        by_band = einstein_a(emits, in_band) * emits / self.final[known]
        computed = einstein_a(emits, np.array([s.strength for s in self._held])[known])
        both = together(learned, by_band)
        return (
            f"radiative rate: median factor {_factor(both / measured):.2f} on {len(measured)} rows "
            f"with a quantum yield above {LEAST_YIELD}; learned alone {_factor(learned / measured):.2f}, from the band "
            f"alone {_factor(by_band / measured):.2f}, from the computed strength {_factor(computed / measured):.2f}"
        )

    def _shifts(self) -> str:
        """Signs of solvent shifts of one dye in three or more media."""
        by_dye: dict[str, list[int]] = defaultdict(list)
        for row, sample in enumerate(self._held):
            by_dye[sample.measured.smiles].append(row)
        measured, final = HC_EV_NM / self.measured, HC_EV_NM / self.final
        right = [
            (final[one] - final[other]) * (measured[one] - measured[other]) > 0
            for rows in by_dye.values()
            if len(rows) >= _SOLVENTS
            for place, one in enumerate(rows)
            for other in rows[place + 1 :]
            if abs(measured[one] - measured[other]) > _SMALLEST_SHIFT_NM
        ]
        return f"solvent shifts beyond 10 nm: sign right in {np.mean(right):.1%} of {len(right)} pairs"

    def _families(self) -> Iterator[str]:
        """Errors by family of dyes, the largest family first."""
        names = np.array([family(s.measured.smiles) for s in self._held])
        dyes = {name: len({s.measured.smiles for s, n in zip(self._held, names, strict=True) if n == name})
                for name in set(names.tolist())}  # fmt: skip
        off = np.abs(self.final - self.measured)
        plain = np.abs(self.physics - self.measured)
        yield f"{'family':<48}{'dyes':>6}{'rows':>6}{'MAE/eV':>9}{'median':>9}{'physics':>9}"
        for name, count in sorted(dyes.items(), key=lambda pair: -pair[1]):
            rows = names == name
            errors_of = f"{off[rows].mean():>9.3f}{np.median(off[rows]):>9.3f}{plain[rows].mean():>9.3f}"
            yield f"{name:<48}{count:>6}{int(rows.sum()):>6}{errors_of}"


def _factor(ratio: FloatArray) -> float:
    """Median factor by which a ratio differs from 1, either way."""
    return float(np.exp(np.median(np.abs(np.log(ratio)))))
