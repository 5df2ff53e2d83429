"""Calibration: arithmetic of the linear models, the band they give, and its cautions.

The models here are made up with round numbers, so that every expected value can be worked out by hand; the
file that is shipped is only asked to be whole.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from orchil_schemas import Band, Context, Geometry, Identity, Inputs, Orbitals, Transitions
from orchil_stages.calibrate import Calibrate
from orchil_stages.calibrate.features import NAMES, band_features
from orchil_stages.calibrate.linear import Calibration, load_calibration, trained_calibration
from orchil_stages.calibrate.stage import COVERAGES
from orchil_stages.medium import lookup
from pydantic import ValidationError

HC_EV_NM = 1239.841984  # CODATA 2018
QUANTILE = {"0.5": 0.7, "0.8": 1.3, "0.9": 1.6, "0.95": 2.0}
ENERGY = NAMES.index("energy")


def _model(intercept: float, slope: float = 0.0, size: float = 0.1, size_slope: float = 0.0) -> dict[str, Any]:
    """A model that sees the energy only: centre 3 eV, scale 0.5 eV."""
    only = np.eye(len(NAMES))[ENERGY]
    return {
        "centre": (3.0 * only).tolist(),
        "scale": np.where(only > 0, 0.5, 1.0).tolist(),
        "intercept": intercept,
        "slope": (slope * only).tolist(),
        "size_intercept": float(np.log(size)),
        "size_slope": (size_slope * only).tolist(),
        "low": {key: -value for key, value in QUANTILE.items()},
        "high": QUANTILE,
    }


def _calibration(**changed: Any) -> Calibration:
    whole = {
        "about": {},
        "position": _model(-0.1, slope=0.2, size=0.1, size_slope=0.5),
        "absorptivity": _model(4.5),
        "width": _model(-0.5),
        "stokes": _model(0.4, size=0.05),
        "feature_inverse": np.diag(np.eye(len(NAMES))[ENERGY]).tolist(),
        "distance_edges": [1.0, 2.0],
    }
    return load_calibration(json.dumps(whole | changed))


def _features(energy: float) -> Any:
    return np.eye(len(NAMES))[ENERGY] * energy


def _identity(charge: int = 0, zwitterion: bool = False) -> Identity:
    return Identity(
        smiles="C", inchikey="", fixed_hydrogen_layer="", charge=charge, formula="", heavy_atoms=20, atoms=30,
        molar_mass_g_mol=250.0, zwitterion=zwitterion,
    )  # fmt: skip


def _transitions(energies: list[float], strengths: list[float]) -> Transitions:
    count = len(energies)
    vectors, ones, zeros = np.ones((count, 3)), np.ones(count), np.zeros(count)
    return Transitions(
        method="made up", energy_ev=energies, oscillator_strength=strengths,
        transition_dipole_debye=3 * vectors, long_axis_angle_deg=10 * ones, electron_shift_angstrom=2 * ones,
        shift_angstrom=vectors, charge_transfer_share=0.5 * ones, overlap=0.6 * ones,
        dipole_change_debye=4 * vectors, leading_from=zeros, leading_to=zeros, leading_weight=0.9 * ones,
        pi_share=0.95 * ones,
    )  # fmt: skip


ORBITALS = Orbitals(
    homo_ev=-9.0, lumo_ev=-7.0, gap_ev=2.0, dipole_debye=np.zeros(3), partial_charges_e=np.zeros(30),
    occupied_window=16, virtual_window=16, overlap_error=0.0, dipole_error_debye=0.0,
)  # fmt: skip


def _geometry(rescued: str | None) -> Geometry:
    return Geometry(
        atomic_numbers=[1], positions_angstrom=np.zeros((1, 3)), charge=0, energy_hartree=0.0, gradient_norm=0.0,
        gradients_used=1, solvation=None, engine="made up", rescued=rescued,
    )  # fmt: skip


DARK_BELOW = _transitions([2.5, 3.0, 3.6], [0.001, 0.4, 0.7])


def _band(
    monkeypatch: pytest.MonkeyPatch,
    transitions: Transitions = DARK_BELOW,
    identity: Identity | None = None,
    medium: str = "toluene",
    coverage: float = 0.9,
    rescued: str | None = None,
) -> Band:
    monkeypatch.setattr("orchil_stages.calibrate.linear.trained_calibration", _calibration)
    stage = Calibrate()
    inputs = Inputs([identity or _identity(), lookup(medium), _geometry(rescued), ORBITALS, transitions])
    (band,) = stage.run(inputs, stage.Settings(coverage=coverage), Context(Path(), 1))
    assert isinstance(band, Band)
    return band


# the linear models


def test_value_is_a_line_in_the_standardised_features() -> None:
    assert float(_calibration().position.predict(_features(4.0))) == pytest.approx(-0.1 + 0.2 * (4.0 - 3.0) / 0.5)


def test_a_line_does_not_run_away() -> None:
    """Features are held at four standard deviations, sizes at exp(1.1)."""
    model = _calibration().position
    assert float(model.predict(_features(100.0))) == pytest.approx(-0.1 + 0.2 * 4.0)
    assert float(model.error_size(_features(100.0))) == pytest.approx(0.1 * np.exp(1.1))
    assert float(model.error_size(_features(3.5))) == pytest.approx(0.1 * np.exp(0.5))


def test_many_rows_at_once() -> None:
    rows = np.array([_features(energy) for energy in (2.5, 3.0, 4.0)])
    assert _calibration().position.predict(rows) == pytest.approx([-0.3, -0.1, 0.3])


@pytest.mark.parametrize("coverage", COVERAGES)
def test_interval_is_quantiles_times_size(coverage: float) -> None:
    low, high = _calibration().position.interval(_features(3.0), coverage)
    half = QUANTILE[f"{coverage:g}"] * 0.1
    assert (float(low), float(high)) == pytest.approx((-0.1 - half, -0.1 + half))


def test_intervals_are_nested() -> None:
    intervals = [_calibration().position.interval(_features(3.3), coverage) for coverage in COVERAGES]
    lows, highs = np.array(intervals).T
    assert (np.diff(lows) < 0).all()
    assert (np.diff(highs) > 0).all()


def test_a_coverage_that_was_not_trained_is_refused() -> None:
    with pytest.raises(KeyError):
        _calibration().position.interval(_features(3.0), 0.7)
    with pytest.raises(ValidationError, match=r"0\.7 is not calibrated; choose one of 0\.5, 0\.8, 0\.9, 0\.95"):
        Calibrate().Settings(coverage=0.7)


@pytest.mark.parametrize(("energy", "trust"), [(3.4, "inside"), (3.8, "edge"), (2.2, "edge"), (4.1, "outside")])
def test_trust_by_distance(energy: float, trust: str) -> None:
    """Mahalanobis distance over one feature: 0.8, 1.6, 1.6, 2.2 against edges at 1 and 2."""
    assert _calibration().trust(_features(energy)) == trust


# the features


def test_every_feature_has_a_name() -> None:
    features = band_features(_identity(), lookup("ethanol"), ORBITALS, DARK_BELOW)
    found = dict(zip(NAMES, features, strict=True))
    assert len(set(NAMES)) == len(NAMES)
    assert found["energy"] == 3.0  # the first state is dark
    assert found["energy_squared"] == 9.0
    assert found["dark_below"] == pytest.approx(0.5)
    assert found["next_above"] == pytest.approx(0.6)
    assert found["log_strength"] == pytest.approx(np.log10(0.4))
    assert found["log_strongest_ratio"] == pytest.approx(np.log10(0.7 / 0.4))
    assert found["gap"] == 2.0
    assert found["hydrogen_bond_donor"] == 1.0
    assert found["polarity"] == pytest.approx(0.289, abs=1e-3)  # Lippert-Mataga, ethanol
    assert found["log_atoms"] == pytest.approx(np.log(20))


@pytest.mark.parametrize(
    ("identity", "on"),
    [(_identity(1), "cation"), (_identity(-2), "anion"), (_identity(0, zwitterion=True), "zwitterion")],
)
def test_charge_features(identity: Identity, on: str) -> None:
    found = dict(zip(NAMES, band_features(identity, lookup("water"), ORBITALS, DARK_BELOW), strict=True))
    assert [name for name in ("cation", "anion", "zwitterion") if found[name]] == [on]


def test_features_of_one_state_are_finite() -> None:
    """A single, dark state: nothing above it, no strength to take a logarithm of."""
    features = band_features(_identity(), lookup("gas phase"), ORBITALS, _transitions([4.0], [0.0]))
    assert np.isfinite(features).all()


# the band


def test_band_from_physics_and_correction(monkeypatch: pytest.MonkeyPatch) -> None:
    """Physics 3.0 eV, correction -0.1 eV, size 0.1 eV, quantile 1.6: 2.90 eV from 2.74 to 3.06 eV."""
    band = _band(monkeypatch)
    assert (band.state, band.first_bright_state, band.strongest_state) == (1, 1, 2)
    assert band.physics_absorption_max_nm == pytest.approx(HC_EV_NM / 3.0)
    assert band.absorption_max_nm == pytest.approx(HC_EV_NM / 2.9)
    assert band.absorption_low_nm == pytest.approx(HC_EV_NM / 3.06)
    assert band.absorption_high_nm == pytest.approx(HC_EV_NM / 2.74)
    assert band.molar_absorptivity == pytest.approx(10**4.5)
    assert band.width_ev == pytest.approx(10**-0.5)
    assert band.emission_max_nm == pytest.approx(HC_EV_NM / 2.6)
    assert band.oscillator_strength == 0.4
    assert band.transition_dipole_debye == pytest.approx(3 * np.sqrt(3))
    assert band.cautions == ()


@pytest.mark.parametrize("coverage", COVERAGES)
@pytest.mark.parametrize("energy", [1.2, 2.0, 3.0, 4.5])
def test_values_lie_inside_their_intervals(energy: float, coverage: float, monkeypatch: pytest.MonkeyPatch) -> None:
    band = _band(monkeypatch, _transitions([energy, energy + 0.3], [0.5, 0.1]), coverage=coverage)
    assert band.coverage == coverage
    assert band.absorption_low_nm < band.absorption_max_nm < band.absorption_high_nm
    assert band.molar_absorptivity_low < band.molar_absorptivity < band.molar_absorptivity_high
    assert band.emission_low_nm is not None
    assert band.emission_max_nm is not None
    assert band.emission_high_nm is not None
    assert band.emission_low_nm < band.emission_max_nm < band.emission_high_nm
    assert band.width_ev > 0
    offered = {info.name for info in Band.offers}
    assert {quantity.name for quantity in band.quantities()} == offered


@pytest.mark.parametrize("energy", [0.25, 12.0])
def test_energies_far_outside_stay_finite_and_ordered(energy: float, monkeypatch: pytest.MonkeyPatch) -> None:
    band = _band(monkeypatch, _transitions([energy], [0.5]))
    assert 170 < band.absorption_low_nm <= band.absorption_max_nm <= band.absorption_high_nm < 4200


def test_the_strongest_band_is_the_reported_one_when_they_are_the_same(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    same = _band(monkeypatch, _transitions([3.0, 3.4], [0.9, 0.1]))
    assert same.strongest_absorption_max_nm == same.absorption_max_nm
    assert _band(monkeypatch).strongest_absorption_max_nm < _band(monkeypatch).absorption_max_nm


@pytest.mark.parametrize(
    ("identity", "medium", "cautioned"),
    [
        (_identity(1), "gas phase", True),
        (_identity(0, zwitterion=True), "gas phase", True),
        (_identity(1), "water", False),
        (_identity(), "gas phase", False),
    ],
)
def test_an_ion_in_the_gas_phase_is_cautioned(
    identity: Identity, medium: str, cautioned: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    band = _band(monkeypatch, identity=identity, medium=medium)
    assert any("gas phase" in caution for caution in band.cautions) is cautioned


def test_a_dark_candidate_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    band = _band(monkeypatch, _transitions([2.8, 3.0], [0.001, 0.002]))
    assert band.state == 1
    assert any("no bright state" in caution for caution in band.cautions)


def test_a_rescued_relaxation_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    assert not _band(monkeypatch).cautions
    (caution,) = _band(monkeypatch, rescued="held as drawn: C8-O16").cautions
    assert "held as drawn: C8-O16" in caution


def test_a_stranger_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    band = _band(monkeypatch, _transitions([4.5], [0.5]))
    assert band.trust == "outside"
    assert any("unlike the dyes" in caution for caution in band.cautions)


def test_the_shipped_calibration_is_whole() -> None:
    """Every model has every coverage, nested intervals, and one number for each feature."""
    shipped = trained_calibration()
    for model in (shipped.position, shipped.absorptivity, shipped.width, shipped.stokes):
        assert {len(row) for row in (model.centre, model.scale, model.slope, model.size_slope)} == {len(NAMES)}
        assert (model.scale > 0).all()
        edges = np.array([model.interval(model.centre, coverage) for coverage in COVERAGES])
        assert (np.diff(edges[:, 0]) < 0).all()
        assert (np.diff(edges[:, 1]) > 0).all()
        assert (edges[:, 0] < edges[:, 1]).all()
    assert shipped.feature_inverse.shape == (len(NAMES), len(NAMES))
    assert (np.linalg.eigvalsh(shipped.feature_inverse) > 0).all()
    assert 0 < shipped.distance_edges[0] < shipped.distance_edges[1]
    assert shipped.trust(shipped.position.centre) == "inside"
