"""Calibration: environments, likeness, the learned correction, the band it gives, and its cautions.

The correction here is made up with round numbers, so that every expected value can be worked out by hand; the files
that are shipped are only asked to be whole.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from orchil_schemas import BadResult, Band, Context, Geometry, Identity, Inputs, Orbitals, StateAnalysis, Transitions
from orchil_stages.calibrate import Calibrate
from orchil_stages.calibrate.correction import TARGETS, Correction, ErrorSize, Head, View, size_features
from orchil_stages.calibrate.coverages import COVERAGES
from orchil_stages.calibrate.environments import environment_weights
from orchil_stages.calibrate.features import NAMES, band_features
from orchil_stages.calibrate.files import FOLDER, load, rounded, save, trained_correction
from orchil_stages.calibrate.kernel import ENVIRONMENT_LENGTH, FEATURE_LENGTH, Bands, covariance
from orchil_stages.excite.report import METHOD
from orchil_stages.medium import lookup
from pydantic import ValidationError
from scipy.sparse import csr_array

HC_EV_NM = 1239.841984  # CODATA 2018
QUANTILE = {"0.5": 0.7, "0.8": 1.3, "0.9": 1.6, "0.95": 2.0}
COUNT = len(NAMES)
ENERGY = NAMES.index("energy")
METHANE = environment_weights("C", np.eye(5)[0], np.eye(5)[0])
(METHANE_CODE,) = METHANE


def _error(size: float, slope: float = 0.0) -> ErrorSize:
    """A size that grows with the energy feature alone."""
    slopes = np.zeros(COUNT + 2)
    slopes[2 + ENERGY] = slope
    low = {key: -value for key, value in QUANTILE.items()}
    return ErrorSize(float(np.log(size)), np.zeros(COUNT + 2), slopes, low, QUANTILE)


def _correction() -> Correction:
    """One pseudo-input: hole and electron on the carbon of methane, all features in their middle (energy 3 eV)."""
    centre = np.zeros(COUNT)
    centre[ENERGY] = 3.0
    scale = np.full(COUNT, 1e6)
    scale[ENERGY] = 0.5
    view = View(np.array([METHANE_CODE]), centre, scale)
    point = Bands(csr_array(np.full((1, 2), 0.5**0.5)), np.zeros((1, COUNT)), np.ones(1))
    values = {"position": (-0.3, 0.2, 0.1), "absorptivity": (4.0, 0.5, 0.1), "width": (-0.5, 0.0, 0.1)}
    values |= {"stokes": (0.3, 0.1, 0.05), "emission_strength": (-1.0, 0.5, 0.1)}
    heads = {name: Head(middle, np.array([weight]), _error(size)) for name, (middle, weight, size) in values.items()}
    return Correction(view, point, heads, (0.8, 0.4))


def _features(energy: float) -> Any:
    return np.eye(COUNT)[ENERGY] * energy


def _identity(charge: int = 0, zwitterion: bool = False, smiles: str = "C") -> Identity:
    return Identity(
        smiles=smiles, inchikey="", fixed_hydrogen_layer="", charge=charge, formula="", heavy_atoms=20, atoms=30,
        molar_mass_g_mol=250.0, zwitterion=zwitterion,
    )  # fmt: skip


def _transitions(energies: list[float], strengths: list[float], method: str = METHOD) -> Transitions:
    count = len(energies)
    vectors, ones, zeros = np.ones((count, 3)), np.ones(count), np.zeros(count)
    return Transitions(
        method=method, energy_ev=energies, oscillator_strength=strengths,
        transition_dipole_debye=3 * vectors, long_axis_angle_deg=10 * ones, electron_shift_angstrom=2 * ones,
        shift_angstrom=vectors, charge_transfer_share=0.5 * ones, overlap=0.6 * ones,
        dipole_change_debye=4 * vectors, leading_from=zeros, leading_to=zeros, leading_weight=0.9 * ones,
        pi_share=0.95 * ones,
    )  # fmt: skip


def _analysis(states: int) -> StateAnalysis:
    """Hole and electron of every state on the first atom of five."""
    on_carbon = np.tile(np.eye(5)[0], (states, 1))
    ones, names = np.ones(states), ("",) * states
    return StateAnalysis(
        point_group="C1", symmetry_operations=1, symmetry_tolerance_angstrom=0.1, symmetry_error_angstrom=0.0,
        reported_state=0, irrep=names, irrep_share=ones, hole_irrep=names, electron_irrep=names, allowed_share=ones,
        reason=names, explanation=names, pair_strength=ones, positive_debye=ones, negative_debye=ones,
        hole_electron_overlap=ones, hole_pi_share=ones, electron_pi_share=ones, charge_transfer_share=ones,
        fragment_transfer_share=ones, dipole_change_debye=ones, hole_by_atom=on_carbon, electron_by_atom=on_carbon,
        fragment_of_atom=np.zeros(5, dtype=int), fragment_names=("CH4",), hole_by_fragment=np.ones((states, 1)),
        electron_by_fragment=np.ones((states, 1)),
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
    monkeypatch.setattr("orchil_stages.calibrate.reading.trained_correction", _correction)
    stage = Calibrate()
    records = [identity or _identity(), lookup(medium), _geometry(rescued), ORBITALS, transitions]
    inputs = Inputs([*records, _analysis(len(transitions.energy_ev))])
    (band,) = stage.run(inputs, stage.Settings(coverage=coverage), Context(Path(), 1))
    assert isinstance(band, Band)
    return band


# environments


def test_an_environment_weighs_as_much_as_hole_and_electron_on_its_atom() -> None:
    """Methanol: the carbon with its three hydrogens, the oxygen with its one; the whole molecule is counted once."""
    hole, electron = np.array([0.5, 0.1, 0.1, 0.1, 0.1, 0.1]), np.array([0.2, 0.6, 0.0, 0.0, 0.0, 0.2])
    found = environment_weights("CO", hole, electron)
    assert len(found) == 3
    shares = {(round(h, 6), round(e, 6)) for h, e in found.values()}
    assert shares == {(0.8, 0.2), (0.2, 0.8)}


def test_a_side_chain_without_excitation_has_no_weight() -> None:
    """Butylbenzene with hole and electron in the ring: nothing on environments of the chain's end."""
    from rdkit import Chem

    atoms = Chem.AddHs(Chem.MolFromSmiles("CCCCc1ccccc1")).GetNumAtoms()
    ring = np.zeros(atoms)
    ring[4:10] = 1 / 6
    with_chain = environment_weights("CCCCc1ccccc1", ring, ring)
    methyl = environment_weights("C", np.eye(5)[0], np.eye(5)[0])
    assert with_chain.get(next(iter(methyl)), (0.0, 0.0)) == (0.0, 0.0)
    assert min(sum(pair) for pair in with_chain.values()) == 0.0


def test_structure_and_states_of_different_molecules_are_refused() -> None:
    with pytest.raises(BadResult, match="6 atoms in the states, 5 in the structure"):
        environment_weights("C", np.zeros(6), np.zeros(6))


# likeness


def _two(overlap: float, apart: float) -> tuple[Bands, Bands]:
    """Two bands with a given overlap of environments whose first feature differs by ``apart`` spreads."""
    one = Bands(csr_array([[1.0, 0.0]]), np.zeros((1, 4)), np.ones(1))
    other = Bands(csr_array([[overlap, (1 - overlap**2) ** 0.5]]), np.array([[apart, 0, 0, 0]]), np.ones(1))
    return one, other


def test_covariance_is_one_for_equal_bands_and_falls_by_the_formula() -> None:
    assert float(covariance(*_two(1.0, 0.0))[0, 0]) == pytest.approx(1.0)
    by_environment = np.exp(-(2 - 2 * 0.6) / (2 * ENVIRONMENT_LENGTH**2))
    assert float(covariance(*_two(0.6, 0.0))[0, 0]) == pytest.approx(by_environment)
    by_feature = np.exp(-(2.0**2) / (2 * FEATURE_LENGTH**2 * 4))
    assert float(covariance(*_two(0.6, 2.0))[0, 0]) == pytest.approx(by_environment * by_feature)


def test_covariance_is_positive_definite() -> None:
    """A covariance of a Gaussian process has no negative eigenvalue."""
    generator = np.random.default_rng(2)
    raw = np.abs(generator.normal(size=(40, 12)))
    bands = Bands(
        csr_array(raw / np.linalg.norm(raw, axis=1, keepdims=True)), generator.normal(size=(40, 3)), np.ones(40)
    )
    assert np.linalg.eigvalsh(covariance(bands, bands)).min() > -1e-12


# the correction


def _seen(energy: float, share: float = 1.0) -> Any:
    """A band of methane at an energy, with a share of its excitation on an environment that training never saw."""
    correction = _correction()
    weights = {METHANE_CODE: (share, share)}
    if share < 1:
        weights[7] = (1 - share, 1 - share)
    return correction, correction.see(_features(energy)[None, :], [weights])


def test_value_is_middle_plus_covariance_times_weight() -> None:
    correction, seen = _seen(3.0)
    assert float(correction.value("position", seen)[0]) == pytest.approx(-0.3 + 0.2)
    correction, seen = _seen(4.0)
    k = np.exp(-(2.0**2) / (2 * FEATURE_LENGTH**2 * COUNT))
    assert float(correction.value("position", seen)[0]) == pytest.approx(-0.3 + 0.2 * k)


def test_features_far_outside_are_held_at_the_edge() -> None:
    near, far = _seen(5.0), _seen(500.0)  # four spreads of 0.5 eV above 3 eV, and beyond
    assert far[0].value("position", far[1]) == pytest.approx(near[0].value("position", near[1]))


@pytest.mark.parametrize("coverage", COVERAGES)
def test_interval_is_quantiles_times_size(coverage: float) -> None:
    correction, seen = _seen(3.0)
    low, high = correction.interval("position", seen, coverage)
    half = QUANTILE[f"{coverage:g}"] * 0.1
    assert (float(low[0]), float(high[0])) == pytest.approx((-half, half))


def test_the_size_of_an_error_depends_on_the_features_within_limits() -> None:
    size = _error(0.1, slope=0.5)
    features = size_features(Bands(csr_array(np.ones((2, 1))), np.stack([_features(1.0), _features(50.0)]), np.ones(2)),
                             np.ones(2))  # fmt: skip
    assert size.size(features) == pytest.approx([0.1 * np.exp(0.5), 0.1 * np.exp(1.3)])


def test_a_coverage_that_was_not_trained_is_refused() -> None:
    correction, seen = _seen(3.0)
    with pytest.raises(KeyError):
        correction.interval("position", seen, 0.7)
    with pytest.raises(ValidationError, match=r"0\.7 is not calibrated; choose one of 0\.5, 0\.8, 0\.9, 0\.95"):
        Calibrate().Settings(coverage=0.7)


@pytest.mark.parametrize(("share", "trust"), [(1.0, "inside"), (0.7, "edge"), (0.3, "outside")])
def test_trust_by_likeness(share: float, trust: str) -> None:
    """Likeness is the known share here, against edges at 0.8 and 0.4."""
    correction, seen = _seen(3.0, share)
    assert float(seen.likeness[0]) == pytest.approx(share)
    assert correction.trust(seen) == [trust]


def test_files_give_back_what_was_saved(tmp_path: Path) -> None:
    correction = _correction()
    stored = Correction(correction.view, rounded(correction.points), correction.heads, correction.likeness_edges)
    save(stored, tmp_path / "made", {"rows": 1})
    again = load(tmp_path / "made")
    weights = [{METHANE_CODE: (0.7, 0.2)}]
    one, other = (c.see(_features(3.4)[None, :], weights) for c in (stored, again))
    for target in TARGETS:
        assert again.value(target, other) == pytest.approx(stored.value(target, one), abs=1e-6)
        assert again.interval(target, other, 0.8)[1] == pytest.approx(stored.interval(target, one, 0.8)[1])
    assert again.trust(other) == stored.trust(one)


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
    assert band.emission_strength == pytest.approx(10**-0.5)
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


def test_states_of_another_method_are_taken_as_computed(monkeypatch: pytest.MonkeyPatch) -> None:
    """What was learned for our states would be wrong for others: no shift, a wide interval, no emission, a caution."""
    ours = _band(monkeypatch)
    other = _band(monkeypatch, _transitions([2.5, 3.0, 3.6], [0.001, 0.4, 0.7], method="somebody's own"))
    assert other.absorption_max_nm == other.physics_absorption_max_nm == pytest.approx(HC_EV_NM / 3.0)
    assert other.absorption_low_nm < ours.absorption_low_nm
    assert other.emission_max_nm is None
    assert other.trust == "outside"
    assert any("another method" in c or "no correction was learned" in c for c in other.cautions)


def test_a_dark_candidate_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    band = _band(monkeypatch, _transitions([2.8, 3.0], [0.001, 0.002]))
    assert band.state == 1
    assert any("no bright state" in caution for caution in band.cautions)


def test_a_rescued_relaxation_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    assert not _band(monkeypatch).cautions
    (caution,) = _band(monkeypatch, rescued="held as drawn: C8-O16").cautions
    assert "held as drawn: C8-O16" in caution


def test_a_stranger_is_cautioned(monkeypatch: pytest.MonkeyPatch) -> None:
    """Water has no environment of methane."""
    monkeypatch.setattr("orchil_stages.calibrate.reading.environment_weights", lambda *_: {7: (1.0, 1.0)})
    band = _band(monkeypatch)
    assert band.trust == "outside"
    assert any("unlike the dyes" in caution for caution in band.cautions)


def test_the_shipped_correction_is_whole_and_small() -> None:
    """Every target has every coverage with nested intervals; at most 5 MB; no dye of the training set inside."""
    import orchil_stages.calibrate

    folder = Path(orchil_stages.calibrate.__file__).parent / FOLDER
    assert sum(path.stat().st_size for path in folder.iterdir()) < 5e6
    shipped = trained_correction()
    assert set(shipped.heads) == set(TARGETS)
    assert len(shipped.view.centre) == len(shipped.view.scale) == COUNT
    assert (np.diff(shipped.view.codes) > 0).all()
    seen = shipped.see(shipped.view.centre[None, :], [METHANE])
    for target in TARGETS:
        edges = np.array([shipped.interval(target, seen, coverage) for coverage in COVERAGES])[:, :, 0]
        assert (np.diff(edges[:, 0]) < 0).all()
        assert (np.diff(edges[:, 1]) > 0).all()
        assert (edges[:, 0] < 0).all()
        assert (edges[:, 1] > 0).all()
    assert 0 < shipped.likeness_edges[1] < shipped.likeness_edges[0] < 1


def test_the_codes_of_environments_are_those_of_training() -> None:
    """RDKit numbers circular environments the same on every machine, and training counts on it.

    The codes of aromatic carbon are those printed in "Getting Started with the RDKit in Python" (from memory).
    """
    ring = np.ones(12) / 6
    codes = set(environment_weights("c1ccccc1", ring, ring))
    assert codes == {98513984, 2763854213, 3218693969}
    assert codes <= set(trained_correction().view.codes.tolist())
