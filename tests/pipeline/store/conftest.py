"""A small library with made-up results, written as a run would write it."""

from __future__ import annotations

import numpy as np
import pytest
from orchil.store import (
    AttemptRow,
    Batch,
    CandidateOutcome,
    CandidateRow,
    Store,
    WorkRow,
)
from orchil_schemas import Band, Brief, Identity, IntakeNotes, Score, Transitions, Want, WantResult


def make_brief(title="Green stop", low=500.0):
    return Brief(title=title, want=(Want(quantity="absorption_max_nm", between=(low, low + 60)),))


def make_rows(count):
    return [
        CandidateRow(row_number=n, name=f"dye-{n}", structure="C" * (n % 7 + 1), medium="toluene", extra={"batch": "A"})
        for n in range(1, count + 1)
    ]


def make_identity(smiles="C=C", charge=0):
    return Identity(
        smiles=smiles,
        inchikey="VGGSQFUCUMXWEO-UHFFFAOYSA-N",
        fixed_hydrogen_layer="",
        charge=charge,
        formula="C2H4",
        heavy_atoms=2,
        atoms=6,
        molar_mass_g_mol=28.054,
        zwitterion=False,
    )


def make_band(peak=520.0, emission=None, cautions=(), **changes):
    values = {
        "state": 1,
        "first_bright_state": 1,
        "strongest_state": 0,
        "coverage": 0.9,
        "absorption_max_nm": peak,
        "absorption_low_nm": peak - 30,
        "absorption_high_nm": peak + 30,
        "physics_absorption_max_nm": peak - 5,
        "strongest_absorption_max_nm": peak,
        "molar_absorptivity": 50000.0,
        "molar_absorptivity_low": 30000.0,
        "molar_absorptivity_high": 80000.0,
        "width_ev": 0.35,
        "oscillator_strength": 0.9,
        "transition_dipole_debye": 10.0,
        "long_axis_angle_deg": 4.0,
        "electron_shift_angstrom": 1.5,
        "emission_max_nm": emission,
        "trust": "inside",
        "cautions": cautions,
    }
    return Band(**(values | changes))


def make_transitions(energies=(2.0, 3.0)):
    n = len(energies)
    return Transitions(
        method="response",
        energy_ev=energies,
        oscillator_strength=np.linspace(0.1, 0.9, n),
        transition_dipole_debye=np.arange(3 * n).reshape(n, 3),
        long_axis_angle_deg=np.full(n, 10.0),
        electron_shift_angstrom=np.full(n, 0.5),
        shift_angstrom=np.zeros((n, 3)),
        charge_transfer_share=np.full(n, 0.2),
        overlap=np.full(n, 0.8),
        dipole_change_debye=np.zeros((n, 3)),
        leading_from=np.arange(n),
        leading_to=np.zeros(n),
        leading_weight=np.full(n, 0.75),
        pi_share=np.full(n, 0.9),
    )


def make_score(rank, *, pick=None, value=520.0):
    want = WantResult(quantity="absorption_max_nm", value=value, probability=0.8, weight=2.0, contribution=0.2)
    return Score(rank=rank, score=1 / rank, hit_probability=0.5 / rank, pareto_front=1, pick=pick, wants=(want,))


def make_attempt(stage, digest, owner, *, ok=True, cpu=1.0, **changes):
    return AttemptRow(
        work_digest=digest,
        stage=stage,
        version="1",
        attempt=1,
        ok=ok,
        seconds=2 * cpu,
        cpu_seconds=cpu,
        versions={"numpy": "2"},
        host="bench",
        candidate_id=owner,
        **changes,
    )


def finished(owner, *records, stage="calibrate"):
    """A batch in which one stage made these records for a candidate, which is then done."""
    digest = f"work-of-{owner}-{stage}"
    return Batch(
        attempts=[make_attempt(stage, digest, owner)],
        works=[WorkRow(digest, stage, "1", '{"states":10}', tuple(one.digest for one in records))],
        records=[(one.digest, one.kind, one.canonical_json) for one in records],
        links=[(owner, one) for one in records],
        outcomes=[CandidateOutcome(owner, "done")],
    )


@pytest.fixture
def path(tmp_path):
    return tmp_path / "night.db"


@pytest.fixture
def store(path):
    with Store.open(path, create=True) as opened:
        yield opened


def fill(store):
    """Three candidates: 1 done (dye-1), 2 failed in relax, 3 waiting; candidate 1 is ranked."""
    store.add_candidates(make_rows(3))
    screen = store.begin_screen(library="library.csv", brief=make_brief(), versions={"orchil": "0.1"})
    notes = IntakeNotes(cautions=("energetic group",))
    store.commit(finished(1, make_identity(), notes, stage="intake"))
    store.commit(finished(1, make_transitions(), stage="excite"))
    store.commit(finished(1, make_band(cautions=("edge of the model",)), stage="calibrate"))
    failure = {"reason_code": "not_converged", "reason": "SCF did not converge"}
    store.commit(
        Batch(
            attempts=[make_attempt("relax", "failed-work", 2, ok=False, cpu=4.0, **failure)],
            outcomes=[CandidateOutcome(2, "failed", "relax", **failure)],
        )
    )
    store.put_library_records(screen, [(1, make_score(1, pick=1))])


@pytest.fixture
def filled(store):
    fill(store)
    return store
