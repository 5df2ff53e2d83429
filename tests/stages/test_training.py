"""The program that makes the trained numbers: quarantine, split by scaffold, robust fits, intervals."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_stages.calibrate.kernel import Bands, covariance
from orchil_stages.excite.parameters import Parameters, index, names, start_parameters
from orchil_stages.training.choice import rows_for_training
from orchil_stages.training.dataset import is_test, media_of_dyes, read_measured, scaffold
from orchil_stages.training.fit import Evaluated, make_problem, train
from orchil_stages.training.gaussian import pseudo_inputs, robust_weights
from orchil_stages.training.learning import conformal, error_size
from orchil_stages.training.tables import errors, linear_fit
from scipy.sparse import csr_array

HEADER = (
    "tag,smiles,solvent_smiles,absorption_max_nm,emission_max_nm,lifetime_ns,quantum_yield,log10_molar_absorptivity,"
    "absorption_fwhm_cm1,emission_fwhm_cm1,absorption_fwhm_nm,emission_fwhm_nm,reference"
)
NAPHTHALENE, STILBENE = "c1ccc2ccccc2c1", "C(=C/c1ccccc1)\\c1ccccc1"


def _table(folder: Path, *rows: tuple[str, str, str, str]) -> Path:
    lines = [f"{tag},{s},{m},{a},{e},,,,,,,,doi" for tag, (s, m, a, e) in enumerate(rows)]
    path = folder / "measured.csv"
    path.write_text("\n".join([HEADER, *lines]) + "\n", encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("row", "said"),
    [
        ((NAPHTHALENE, "CCO", "", "340"), "no absorption"),
        ((NAPHTHALENE, NAPHTHALENE, "320", ""), "solid"),
        ((NAPHTHALENE, "CCO", "400", "350"), "shorter"),
        ((NAPHTHALENE, "CCO", "250", ""), "outside 300"),
        ((NAPHTHALENE + ".[Cl-]", "CCO", "320", ""), "more than one"),
        ((NAPHTHALENE, "c1ccc(-c2ccc(-c3ccccc3)cc2)cc1", "320", ""), "not in the table"),
    ],
)
def test_known_faults_are_kept_apart_with_a_reason(tmp_path: Path, row: tuple[str, str, str, str], said: str) -> None:
    (read,) = read_measured(_table(tmp_path, row))
    assert read.fault is not None
    assert said in read.fault


def test_repeats_become_one_vote_or_a_fault(tmp_path: Path) -> None:
    near, far = (STILBENE, "CCO", "310", ""), (STILBENE, "CCO", "350", "")
    (merged,) = read_measured(_table(tmp_path, near, (STILBENE, "CCO", "314", "")))
    assert merged.fault is None
    assert merged.absorption_nm == 312.0
    (apart,) = read_measured(_table(tmp_path, near, far))
    assert apart.fault is not None


def test_the_split_follows_the_scaffold_alone() -> None:
    substituted = "CN(C)c1ccc2ccccc2c1"
    assert scaffold(substituted) == scaffold(NAPHTHALENE)
    assert scaffold("CCCC=CC=C") == "acyclic"
    share = np.mean([is_test(f"scaffold {n}") for n in range(4000)])
    assert share == pytest.approx(0.25, abs=0.03)


def test_at_most_three_media_per_dye_and_the_extremes_among_them(tmp_path: Path) -> None:
    rows = [(STILBENE, m, str(a), "") for m, a in (("CCO", 310), ("CO", 315), ("Cc1ccccc1", 320), ("O", 305))]
    (group,) = media_of_dyes(read_measured(_table(tmp_path, *rows))).values()
    chosen = {row.absorption_nm for row in rows_for_training(group)}
    assert len(chosen) <= 3
    others = [row.absorption_nm for row in group[1:]]
    assert {min(others), max(others)} <= chosen


def test_gauss_newton_finds_the_numbers_behind_noisy_data_with_outliers() -> None:
    generator = np.random.default_rng(7)
    start = start_parameters().vector
    slopes = generator.normal(size=(1200, len(start)))
    truth = start + 0.05 * generator.normal(size=len(start))
    targets = slopes @ truth + 0.01 * generator.normal(size=1200)
    targets[:12] += 3.0

    def evaluate(vector: np.ndarray) -> list[Evaluated]:
        energies = slopes @ vector
        return [Evaluated(n, float(e), slopes[n], 1.0, 0, 1.0) for n, e in enumerate(energies)]

    problem = make_problem(targets, np.ones(1200))
    found = train(evaluate, problem, start, 40, lambda *_: None)
    residual = np.abs(slopes @ found - slopes @ truth)
    assert np.median(residual) < 0.03


def test_names_and_vector_belong_together() -> None:
    parameters = start_parameters()
    assert len(names()) == len(parameters.vector) == len(index())
    moved = Parameters(np.arange(len(names()), dtype=float))
    assert moved["gap_scale"] == index()["gap_scale"]


def test_conformal_quantiles_cover_what_they_promise() -> None:
    """Finite-sample coverage of split conformal prediction (Vovk, Gammerman, Shafer 2005)."""
    generator = np.random.default_rng(3)
    covered = []
    for _ in range(300):
        ratio = generator.standard_t(4, size=200)
        low, high = conformal(ratio, 0.05), conformal(ratio, 0.95)
        covered.append(low <= generator.standard_t(4) <= high)
    assert np.mean(covered) == pytest.approx(0.9, abs=0.05)


def _line_of_bands(count: int, generator: np.random.Generator) -> Bands:
    """Bands that differ in one feature only."""
    features = np.sort(generator.uniform(-2.0, 2.0, size=(count, 1)), axis=0)
    return Bands(csr_array(np.ones((count, 1))), features, np.ones(count))


def test_the_process_agrees_with_an_independent_library_on_clean_data() -> None:
    """Every row a pseudo-input: the exact Gaussian process, as scikit-learn solves it."""
    from sklearn.gaussian_process import GaussianProcessRegressor
    from sklearn.gaussian_process.kernels import RBF

    generator = np.random.default_rng(4)
    bands, new = _line_of_bands(60, generator), _line_of_bands(25, generator)
    target = np.sin(2.0 * bands.features[:, 0])
    weights = robust_weights(covariance(bands, bands), covariance(bands, bands), 1e-3, target)
    ours = covariance(new, bands) @ weights
    reference = GaussianProcessRegressor(RBF(1.0), alpha=1e-3, optimizer=None).fit(bands.features, target)
    assert ours == pytest.approx(reference.predict(new.features), abs=0.02)


def test_the_process_is_not_led_away_by_wrong_rows() -> None:
    generator = np.random.default_rng(5)
    bands = _line_of_bands(400, generator)
    truth = np.sin(2.0 * bands.features[:, 0])
    target = truth + 0.05 * generator.normal(size=400)
    target[::20] += 3.0
    points = pseudo_inputs(bands, 40, seed=1)
    cross = covariance(bands, points)
    found = cross @ robust_weights(cross, covariance(points, points), 0.05, target)
    assert np.abs(found - truth).mean() < 0.06


def test_pseudo_inputs_are_fewer_than_the_rows_and_are_centres() -> None:
    generator = np.random.default_rng(6)
    bands = _line_of_bands(300, generator)
    points = pseudo_inputs(bands, 10, seed=1)
    assert len(points) <= 10
    assert not set(np.round(points.features[:, 0], 6)) & set(np.round(bands.features[:, 0], 6))
    assert np.asarray((points.environments.multiply(points.environments)).sum(axis=1)) == pytest.approx(1.0)


def test_the_expected_size_follows_errors_that_grow() -> None:
    """Errors of ten times the size at one end: the intervals there are several times wider, and cover at both ends."""
    generator = np.random.default_rng(8)
    place = generator.uniform(0.0, 1.0, size=4000)
    features = ((place - 0.5) * 12.0**0.5)[:, None]
    residual = 0.5 * 10.0**place * generator.normal(size=4000)
    size = error_size(residual, features)
    low, high = size.interval(features, 0.9)
    inside = (residual >= low) & (residual <= high)
    for end in (place < 0.2, place > 0.8):
        assert inside[end].mean() == pytest.approx(0.9, abs=0.04)
    edges = [high[features[:, 0].argmin()], high[features[:, 0].argmax()]]
    assert edges[1] > 4.0 * edges[0]


def test_errors_and_linear_fit_agree_with_hand_made_numbers() -> None:
    measured = np.array([2.0, 2.5, 3.0, 3.5])
    found = errors(measured + np.array([0.1, -0.1, 0.1, -0.1]), measured)
    assert found.mae == pytest.approx(0.1)
    assert found.bias == pytest.approx(0.0, abs=1e-12)
    assert found.r2 == pytest.approx(1 - 0.04 / 1.25)
    assert found.spearman == pytest.approx(1.0)
    slope, intercept = linear_fit(measured, 2.0 * measured - 1.0)
    assert (slope, intercept) == (pytest.approx(2.0), pytest.approx(-1.0))
