"""What the calibration is trained on: one sample for each measurement, with what a screen would know of it."""

from __future__ import annotations

import hashlib
import pickle
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import partial
from multiprocessing import get_context
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray, Identity, LibraryRow

from orchil_stages.by_hand import run_stages
from orchil_stages.calibrate.correction import Weights
from orchil_stages.calibrate.environments import environment_weights
from orchil_stages.calibrate.features import band_features
from orchil_stages.excite.analysis import populations
from orchil_stages.excite.bright import first_bright
from orchil_stages.excite.model import Opened, solve_states
from orchil_stages.excite.parameters import Parameters
from orchil_stages.excite.report import orbitals_record, transitions_record
from orchil_stages.excite.stage import ExciteSettings
from orchil_stages.excite.window import Assertions
from orchil_stages.ground_state import Wavefunction

from .dataset import Measurement
from .fit import Job
from .hamiltonian import window_size
from .windows import Row, load_row

_LOWEST_EV = 0.2


@dataclass(frozen=True)
class Sample:
    """One row: its measurement, scaffold, features, environment weights, and the first bright state (eV, f)."""

    measured: Measurement
    scaffold: str
    features: FloatArray
    weights: Weights
    physics_ev: float
    strength: float
    gap_ev: float


def load_samples(
    jobs: Sequence[Job], cache: Path, workers: int, sets: Sequence[Parameters]
) -> list[tuple[Sample, ...]]:
    """Rows that have states under every set of trained numbers, one sample for each set; kept in the cache folder."""
    text = "|".join(f"{job.measured.smiles} {job.measured.medium} {job.geometry.digest}" for job in jobs)
    digest = hashlib.sha256(text.encode())
    for parameters in sets:
        digest.update(parameters.vector.tobytes())
    path = cache / "samples" / f"{digest.hexdigest()[:24]}.pkl"
    if path.exists():
        kept: list[tuple[Sample, ...]] = pickle.loads(path.read_bytes())
        return kept
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        found = pool.map(partial(make_samples, cache=cache, sets=sets), jobs, chunksize=16)
        rows = [made for made in found if made is not None]
    path.parent.mkdir(exist_ok=True)
    path.write_bytes(pickle.dumps(rows, protocol=5))
    return rows


def make_samples(job: Job, cache: Path, sets: Sequence[Parameters]) -> tuple[Sample, ...] | None:
    """One row under each set of numbers; None when its ground state fails or lies too close to an excited state."""
    row = load_row(job.measured, job.geometry, cache, window_size())
    if row is None:
        return None
    identity = _identity(job.measured)
    distinct = {parameters.vector.tobytes(): parameters for parameters in sets}
    made = {key: _sample(row, identity, parameters) for key, parameters in distinct.items()}
    samples = tuple(s for p in sets if (s := made[p.vector.tobytes()]) is not None)
    return samples if len(samples) == len(sets) else None


def _sample(row: Row, identity: Identity, parameters: Parameters) -> Sample | None:
    window = row.prepared.window
    states, _ = solve_states(row.prepared, parameters, row.medium, row.ground_dipole, ExciteSettings().states)
    if states.energies[0] <= _LOWEST_EV:
        return None
    empty = np.zeros(0)
    wave = Wavefunction(empty, empty, empty, window.charges, row.ground_dipole)
    orbitals = orbitals_record(Opened(window, wave, Assertions(0.0, 0.0), ""))
    state, spread = first_bright(states.energies, states.strengths), populations(states, window)
    return Sample(
        measured=row.measured,
        scaffold=row.scaffold,
        features=band_features(identity, row.medium, orbitals, transitions_record(states, window)),
        weights=environment_weights(identity.smiles, spread.hole[state], spread.electron[state]),
        physics_ev=float(states.energies[state]),
        strength=float(states.strengths[state]),
        gap_ev=orbitals.gap_ev,
    )


def _identity(measured: Measurement) -> Identity:
    from orchil_stages.intake import Intake

    return run_stages(LibraryRow(structure=measured.smiles, medium=measured.medium), (Intake(),))[Identity]
