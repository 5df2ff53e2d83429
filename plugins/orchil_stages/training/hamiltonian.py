"""Training of the response Hamiltonian: jobs, fit, parameter file."""

from __future__ import annotations

import argparse
import json
import time
from collections import Counter
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray, Geometry

from orchil_stages.excite import parameters as excite_parameters
from orchil_stages.excite.parameters import Parameters, load_parameters, names, start_parameters
from orchil_stages.excite.stage import ExciteSettings

from .choice import rows_for_training
from .dataset import is_test, media_of_dyes, read_measured, scaffold
from .fit import Job, Shards, make_problem, train
from .geometries import read_cache
from .tables import errors, render

ITERATIONS = 40
PARAMETER_FILE = Path(excite_parameters.__file__).with_name("trained.json")


def window_size() -> tuple[int, int]:
    """The window that screens use by default."""
    settings = ExciteSettings()
    return settings.occupied, settings.virtual


def make_jobs(data: Path, cache: Path, limit: int | None = None) -> list[Job]:
    """Measurements with a relaxed geometry, up to three media per dye."""
    by_dye = media_of_dyes(read_measured(data / "measured_dyes.csv"))
    relaxed = [done for done in read_cache(cache) if done.geometry is not None and done.smiles in by_dye]
    jobs: list[Job] = []
    for done in relaxed[:limit]:
        geometry = Geometry.model_validate_json(done.geometry or "")
        jobs.extend(Job(row, geometry) for row in rows_for_training(by_dye[done.smiles]))
    return jobs


def weights(jobs: list[Job], training: FloatArray) -> FloatArray:
    """One vote per dye, spread over its rows; zero for test rows."""
    rows = Counter(job.measured.smiles for job in jobs)
    votes: FloatArray = training / np.array([rows[job.measured.smiles] for job in jobs])
    return votes


def fit(chosen: argparse.Namespace) -> None:
    """Train on the training scaffolds, show the errors as they fall, write the parameter file."""
    jobs = make_jobs(chosen.data, chosen.cache, chosen.limit)
    shards = Shards(jobs, chosen.cache, window_size(), chosen.workers)
    jobs = [job for job, usable in zip(jobs, shards.usable, strict=True) if usable]
    targets = np.array([job.measured.energy_ev for job in jobs])
    test = np.array([is_test(scaffold(job.measured.smiles)) for job in jobs])
    problem = make_problem(targets, weights(jobs, (~test).astype(float)))
    print(f"{len(jobs)} rows, {int(test.sum())} of them kept for testing, {len(names())} numbers", flush=True)
    start = time.monotonic()

    def report(iteration: int, objective: float, energies: FloatArray, vector: FloatArray) -> None:
        shown = [(f"step {iteration} training", errors(energies[~test], targets[~test]))]
        if test.any():
            shown.append((f"step {iteration} test", errors(energies[test], targets[test])))
        print(f"objective {objective:.3f} after {time.monotonic() - start:.0f} s\n{render(shown)}", flush=True)
        write_parameters(Parameters(vector), {"rows": int((~test).sum()), "step": iteration}, chosen.cache)

    train(shards.evaluate, problem, _start(chosen.cache).vector, ITERATIONS, report)
    shards.close()
    PARAMETER_FILE.write_text((chosen.cache / "trained.json").read_text(encoding="utf-8"), encoding="utf-8")


def _start(cache: Path) -> Parameters:
    """Where an interrupted training had come to, else the untrained numbers."""
    path = cache / "trained.json"
    return load_parameters(path.read_text(encoding="utf-8")) if path.exists() else start_parameters()


def write_parameters(parameters: Parameters, about: Mapping[str, object], cache: Path) -> None:
    """The parameter file, numbers rounded to what training can resolve."""
    values = {name: round(float(value), 6) for name, value in zip(names(), parameters.vector, strict=True)}
    text = json.dumps({"about": dict(about), "parameters": values}, indent=1)
    (cache / "trained.json").write_text(text + "\n", encoding="utf-8")
