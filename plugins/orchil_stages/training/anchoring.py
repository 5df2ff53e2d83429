"""Training of the anchoring: how the errors of two predictions go together, from dyes that are measured.

The input is a list of :class:`Case`: measured dyes with predictions that never saw them or their scaffold
(out-of-fold), and with the standard errors a screen would report. One case per dye and medium. Then

    kernel = fit_kernel(pairs_of(cases))
    write_kernel(kernel, "one sentence about where the numbers come from")

Numbers come from a pairwise likelihood (Varin, Reid, Firth, Statistica Sinica 21, 5, 2011): every pair of
standardised errors is a bivariate normal whose correlation is that of the kernel, lowered by what measuring adds.
Pairs depend on each other, so that the maximum is sound and its curvature is not; only the maximum is used.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass, replace
from operator import itemgetter
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray
from scipy.optimize import minimize
from scipy.special import expit, logit

from orchil_stages.anchor.energies import reading_error
from orchil_stages.anchor.kernel import TRAINED_FILE, Kernel, trained_kernel
from orchil_stages.anchor.likeness import Likeness
from orchil_stages.anchor.stage import AnchorSettings

CLIP = 4.0
"""Errors beyond so many standard errors are taken as this large."""
NEAR = 0.7
"""All pairs more alike than this are used, and as many of the others."""
ROWS_AT_ONCE = 1000
MOST_CORRELATED = 0.99
POWERS = range(2, 11)
FIRST = logit([0.8, 0.8])


@dataclass(frozen=True)
class Case:
    """One measured dye: canonical SMILES, medium as a screen names it, energies and standard error in eV."""

    smiles: str
    medium: str
    predicted_ev: float
    error_ev: float
    measured_ev: float


@dataclass(frozen=True)
class Pairs:
    """Pairs (k,) of cases: similarity from 0 to 1, both errors with unit variance, what the two have in common.

    ``signal`` is the share of the variance of the errors that is not noise of measurement: the correlation of two
    errors is that of the kernel times this.
    """

    similarity: FloatArray
    first: FloatArray
    second: FloatArray
    signal: FloatArray
    same_medium: NDArray[np.bool_]
    same_species: NDArray[np.bool_]


def pairs_of(cases: Sequence[Case], seed: int = 0) -> Pairs:
    """All pairs of alike cases and as many of the others, by a seeded choice."""
    errors, signal = standardised(cases)
    similarity, first, second = _chosen([case.smiles for case in cases], np.random.default_rng(seed))
    media, species = (
        np.unique(words, return_inverse=True)[1]
        for words in ([case.medium for case in cases], [case.smiles for case in cases])
    )
    return Pairs(
        similarity=similarity,
        first=errors[first],
        second=errors[second],
        signal=np.sqrt(signal[first] * signal[second]),
        same_medium=media[first] == media[second],
        same_species=species[first] == species[second],
    )


def standardised(cases: Sequence[Case]) -> tuple[FloatArray, FloatArray]:
    """Errors (n,) of unit variance, and the share (n,) of their variance that is not noise of measurement."""
    predicted, error, measured = np.array([(c.predicted_ev, c.error_ev, c.measured_ev) for c in cases]).T
    noise = reading_error(measured, AnchorSettings().reading_nm, trained_kernel().scatter_ev)
    signal = error**2 / (error**2 + noise**2)
    errors = (measured - predicted) / np.hypot(error, noise)
    errors = np.clip(errors / np.sqrt(np.mean(np.clip(errors, -CLIP, CLIP) ** 2)), -CLIP, CLIP)
    return errors, signal


def fit_kernel(pairs: Pairs, scatter_ev: float | None = None) -> Kernel:
    """The kernel of the largest pairwise likelihood; pure. ``scatter_ev`` is not fitted: as given, or as it was."""
    start = trained_kernel()

    def fitted(power: int) -> tuple[float, Kernel]:
        def lack(numbers: FloatArray) -> float:
            return -_mean_log_likelihood(pairs, _kernel(numbers, power, start))

        found = minimize(lack, FIRST, method="Nelder-Mead", options={"xatol": 1e-2, "fatol": 1e-7, "maxiter": 80})
        return float(found.fun), _kernel(found.x, power, start)

    best = min(map(fitted, POWERS), key=itemgetter(0))[1]
    return best if scatter_ev is None else replace(best, scatter_ev=scatter_ev)


def write_kernel(kernel: Kernel, about: str, path: Path = TRAINED_FILE) -> None:
    """Write ``trained.json``."""
    numbers = {name: round(value, 4) for name, value in asdict(kernel).items()}
    path.write_text(json.dumps({"about": about, **numbers}, indent=1) + "\n", encoding="utf-8")


def _kernel(numbers: FloatArray, power: int, like: Kernel) -> Kernel:
    """From two free numbers and a power."""
    share, other = expit(numbers).tolist()
    return replace(like, share=share, power=power, other_medium=other)


def _mean_log_likelihood(pairs: Pairs, kernel: Kernel) -> float:
    together = kernel.correlation(pairs.similarity, pairs.same_medium, pairs.same_species) * pairs.signal
    together = np.minimum(together, MOST_CORRELATED)
    left = 1 - together**2
    square = pairs.first**2 + pairs.second**2 - 2 * together * pairs.first * pairs.second
    return float(np.mean(-np.log(left) / 2 - square / (2 * left)))


def _chosen(smiles: Sequence[str], rng: np.random.Generator) -> tuple[FloatArray, NDArray[np.intp], NDArray[np.intp]]:
    """Similarity and the two places of the pairs that are used."""
    parts = [np.concatenate(part, axis=1) for part in zip(*_alike_and_others(smiles, rng), strict=True)]
    similarity, first, second = np.concatenate(parts, axis=1)
    return similarity, first.astype(np.intp), second.astype(np.intp)


def _alike_and_others(smiles: Sequence[str], rng: np.random.Generator) -> Iterator[tuple[FloatArray, FloatArray]]:
    """Block by block: the pairs (3, k) above NEAR, and a choice (3, at most k) of those below."""
    likeness = Likeness(smiles)
    for start in range(0, len(smiles), ROWS_AT_ONCE):
        rows = np.arange(start, min(start + ROWS_AT_ONCE, len(smiles)))
        similarity = likeness.rows(smiles[start : start + ROWS_AT_ONCE])
        later = np.arange(len(smiles))[None, :] > rows[:, None]
        alike = _listed(similarity, later & (similarity >= NEAR), start)
        others = _listed(similarity, later & (similarity < NEAR), start)
        count = min(alike.shape[1], others.shape[1])
        yield alike, others[:, rng.choice(others.shape[1], count, replace=False)]


def _listed(similarity: FloatArray, chosen: NDArray[np.bool_], start: int) -> FloatArray:
    row, column = np.nonzero(chosen)
    return np.stack([similarity[row, column], row + start, column])
