"""Training of the response Hamiltonian: jobs, fit, parameter file."""

from __future__ import annotations

import argparse
import json
import time
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray, Geometry

from orchil_stages.excite import parameters as excite_parameters
from orchil_stages.excite.parameters import Parameters, load_parameters, names, start_parameters
from orchil_stages.excite.stage import ExciteSettings

from .choice import rows_for_training
from .dataset import fold, media_of_dyes, read_measured, scaffold
from .fit import Evaluated, Job, Shards, make_problem, train
from .geometries import read_cache
from .tables import errors, render

ITERATIONS = 40
FOLD_ITERATIONS = 3
"""From the numbers trained on all dyes; the steps see no dye of the fold, and the last one changes next to nothing."""

FOLDS = 5
ALL = -1
"""No fold is left out."""
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
    """Train on all dyes, then without each fold in turn; write the parameter file and those of the folds."""
    jobs = make_jobs(chosen.data, chosen.cache, chosen.limit)
    shards = Shards(jobs, chosen.cache, window_size(), chosen.workers)
    jobs = [job for job, usable in zip(jobs, shards.usable, strict=True) if usable]
    fitting = _Fitting(jobs, shards, chosen.cache)
    print(f"{len(jobs)} rows, {len(names())} numbers", flush=True)
    trained = fitting.train(ALL, _start(chosen.cache, ALL).vector, ITERATIONS, None)
    PARAMETER_FILE.write_text(_file(chosen.cache, ALL).read_text(encoding="utf-8"), encoding="utf-8")
    at_start = shards.evaluate(trained)
    for held in range(FOLDS):
        fitting.train(held, trained, FOLD_ITERATIONS, at_start)
    shards.close()


@dataclass(frozen=True)
class _Fitting:
    """The rows and the workers that hold them."""

    jobs: list[Job]
    shards: Shards
    cache: Path

    def train(self, held: int, start: FloatArray, iterations: int, at_start: list[Evaluated] | None) -> FloatArray:
        """The numbers trained without fold ``held``; every accepted step is shown and kept."""
        targets = np.array([job.measured.energy_ev for job in self.jobs])
        out = np.array([fold(scaffold(job.measured.smiles), FOLDS) for job in self.jobs]) == held
        problem = make_problem(targets, weights(self.jobs, (~out).astype(float)))
        began = time.monotonic()

        def report(iteration: int, objective: float, energies: FloatArray, vector: FloatArray) -> None:
            shown = [(f"step {iteration} training", errors(energies[~out], targets[~out]))]
            if out.any():
                shown.append((f"step {iteration} fold {held}, left out", errors(energies[out], targets[out])))
            print(f"objective {objective:.3f} after {time.monotonic() - began:.0f} s\n{render(shown)}", flush=True)
            about = {"rows": int((~out).sum()), "step": iteration}
            write_parameters(Parameters(vector), about, _file(self.cache, held))

        return train(self.shards.evaluate, problem, start, iterations, report, at_start=at_start)


def _file(cache: Path, held: int) -> Path:
    return cache / ("trained.json" if held == ALL else f"trained_without_{held}.json")


def parameters_without(cache: Path, held: int) -> Parameters:
    """What was trained without one fold (FileNotFoundError before `fit`)."""
    return load_parameters(_file(cache, held).read_text(encoding="utf-8"))


def _start(cache: Path, held: int) -> Parameters:
    """Where an interrupted training had come to, else the untrained numbers."""
    path = _file(cache, held)
    return load_parameters(path.read_text(encoding="utf-8")) if path.exists() else start_parameters()


def write_parameters(parameters: Parameters, about: Mapping[str, object], path: Path) -> None:
    """The parameter file, numbers rounded to what training can resolve."""
    values = {name: round(float(value), 6) for name, value in zip(names(), parameters.vector, strict=True)}
    text = json.dumps({"about": dict(about), "parameters": values}, indent=1)
    path.write_text(text + "\n", encoding="utf-8")
