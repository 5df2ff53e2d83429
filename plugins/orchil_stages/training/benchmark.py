"""The accuracy table on scaffolds never used in training."""

from __future__ import annotations

import argparse

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray

from orchil_stages.excite.parameters import trained_parameters

from .dataset import is_test, scaffold
from .fit import Evaluated, Job, Shards
from .hamiltonian import make_jobs, window_size
from .tables import Errors, errors, linear_fit, read_tddft, render


def table(chosen: argparse.Namespace) -> None:
    """Print the errors of several predictions on the same test dyes, each in its main medium."""
    jobs = one_per_dye(make_jobs(chosen.data, chosen.cache, chosen.limit))
    shards = Shards(jobs, chosen.cache, window_size(), chosen.workers)
    jobs = [job for job, usable in zip(jobs, shards.usable, strict=True) if usable]
    found = shards.evaluate(trained_parameters().vector)
    shards.close()
    known = read_tddft(chosen.data / "tddft_vertical.csv")
    test = np.array([is_test(scaffold(job.measured.smiles)) for job in jobs])
    print(
        f"{int(test.sum())} dyes on scaffolds never used in training; "
        f"linear fits made on the {int((~test).sum())} others"
    )
    print(render(comparison(jobs, found, known, test)))


def one_per_dye(jobs: list[Job]) -> list[Job]:
    """The first job of each dye: its main medium."""
    first: dict[str, Job] = {}
    for job in jobs:
        first.setdefault(job.measured.smiles, job)
    return list(first.values())


def comparison(
    jobs: list[Job], found: list[Evaluated], known: dict[str, float], test: NDArray[np.bool_]
) -> list[tuple[str, Errors]]:
    """Rows of the table: all dyes kept for testing, then those of them with a published TD-DFT energy."""
    measured = np.array([job.measured.energy_ev for job in jobs])
    physics = np.array([row.energy for row in found])
    gap = _fitted(np.array([row.gap for row in found]), measured, ~test)
    tddft = np.array([known.get(job.measured.smiles, np.nan) for job in jobs])
    both = np.isfinite(tddft)
    fitted = np.full(len(jobs), np.nan)
    fitted[both] = _fitted(tddft[both], measured[both], ~test[both])
    rows = [
        ("response Hamiltonian, nothing after it", physics, test),
        ("GFN2 HOMO-LUMO gap after a linear fit", gap, test),
        ("same dyes with TD-DFT: response Hamiltonian", physics, test & both),
        ("same dyes with TD-DFT: gap after a linear fit", gap, test & both),
        ("same dyes with TD-DFT: wB97X-D3 as published", tddft, test & both),
        ("same dyes with TD-DFT: wB97X-D3 after a linear fit", fitted, test & both),
    ]
    return [(name, errors(values[chosen], measured[chosen])) for name, values, chosen in rows]


def _fitted(values: FloatArray, measured: FloatArray, training: NDArray[np.bool_]) -> FloatArray:
    slope, intercept = linear_fit(values[training], measured[training])
    return slope * values + intercept
