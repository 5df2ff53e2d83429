"""The steps after the Hamiltonian: train the correction and the anchoring, and print how good they are."""

from __future__ import annotations

import argparse
import hashlib
import pickle
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from scipy.special import ndtri

from orchil_stages.calibrate import files
from orchil_stages.excite.parameters import trained_parameters

from . import learning
from .anchoring import Case, fit_kernel, pairs_of, write_kernel
from .bench import COVERAGE, Table
from .hamiltonian import FOLDS, make_jobs, parameters_without
from .learning import Unseen, assemble, cross_validate, held_out, learn, targets, unseen_intervals
from .samples import Sample, load_samples
from .tables import read_tddft, render

FOLDER = Path(files.__file__).with_name(files.FOLDER)


def calibrate(chosen: argparse.Namespace) -> None:
    """Train the correction on all rows, take its intervals from unseen scaffolds, write its files."""
    samples, by_fold = read_samples(chosen)
    unseen = validated(by_fold, chosen.cache)
    correction = assemble(learn(samples), unseen, targets(held_out(by_fold, unseen)))
    about = {"rows": len(samples), "dyes": len({s.measured.smiles for s in samples})}
    files.save(correction, FOLDER, about)
    print(f"{about['rows']} rows, {about['dyes']} dyes, {len(correction.points)} pseudo-inputs written")


def bench(chosen: argparse.Namespace) -> None:
    """Print how well scaffolds are predicted that neither Hamiltonian nor correction had seen."""
    _, by_fold = read_samples(chosen)
    unseen = validated(by_fold, chosen.cache)
    table = Table(by_fold, unseen, read_tddft(chosen.data / "tddft_vertical.csv"))
    print(f"{len(table)} rows, {table.dyes} dyes, {FOLDS} folds disjoint in scaffolds")
    print(render(list(table.positions())))
    for line in table.lines():
        print(line)


def anchor(chosen: argparse.Namespace) -> None:
    """Fit how the errors of relatives go together, on predictions that had not seen their scaffold."""
    _, by_fold = read_samples(chosen)
    unseen = validated(by_fold, chosen.cache)
    kernel = fit_kernel(pairs_of(cases(held_out(by_fold, unseen), unseen)))
    write_kernel(kernel, f"out-of-fold errors of {len(unseen.folds)} rows, {FOLDS} folds disjoint in scaffolds")
    print(kernel)


def cases(samples: Sequence[Sample], unseen: Unseen) -> list[Case]:
    """Measured dyes beside what a screen would say of them without having seen their scaffold."""
    residual = targets(samples)["position"] - unseen.values["position"]
    low, high = unseen_intervals(residual, unseen, COVERAGE)
    error = (high - low) / (2.0 * ndtri((1.0 + COVERAGE) / 2.0))
    return [
        Case(s.measured.smiles, s.measured.medium, s.physics_ev + shift, size, s.measured.energy_ev)
        for s, shift, size in zip(samples, unseen.values["position"].tolist(), error.tolist(), strict=True)
    ]


def read_samples(chosen: argparse.Namespace) -> tuple[list[Sample], list[list[Sample]]]:
    """All rows under the shipped numbers, and the same rows under the numbers trained without each fold."""
    jobs = make_jobs(chosen.data, chosen.cache, chosen.limit)
    sets = [trained_parameters(), *(parameters_without(chosen.cache, held) for held in range(FOLDS))]
    shipped, *by_fold = map(list, zip(*load_samples(jobs, chosen.cache, chosen.workers, sets), strict=True))
    return shipped, by_fold


def validated(by_fold: Sequence[Sequence[Sample]], cache: Path) -> Unseen:
    """Out-of-fold values, kept in the cache folder until rows, physics or settings of the processes change."""
    digest = hashlib.sha256(repr((learning.POINTS, sorted(learning.NOISE.items()))).encode())
    for samples in by_fold:
        digest.update(np.array([s.physics_ev for s in samples]).tobytes())
    path = cache / "samples" / f"unseen-{digest.hexdigest()[:24]}.pkl"
    if not path.exists():
        path.write_bytes(pickle.dumps(cross_validate(by_fold), protocol=5))
    unseen: Unseen = pickle.loads(path.read_bytes())
    return unseen
