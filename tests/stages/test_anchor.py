"""Anchoring: measured relatives correct a series and leave strangers alone, and intervals keep their promise."""

from __future__ import annotations

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, MEASURED, Brief, Column, LibraryTable, Want
from orchil_stages.anchor import Anchor, AnchorSettings
from orchil_stages.anchor.energies import Energies, reading_error
from orchil_stages.anchor.kernel import Kernel, trained_kernel
from orchil_stages.anchor.likeness import Likeness
from orchil_stages.anchor.posterior import DOUBT, Measured, Regression
from orchil_stages.training.anchoring import Case, Pairs, fit_kernel, pairs_of, standardised, write_kernel
from scipy.special import ndtri

from tests.published.facts import rows, series

BRIEF = Brief(title="t", want=(Want(quantity="absorption_max_nm", at_least=400),))
ABSORPTION, EMISSION = "absorption_max_nm", "emission_max_nm"
Z90 = float(ndtri(0.95))
ANTHRACENE = "c1ccc2cc3ccccc3cc2c1"


def column(energy_ev, error_ev, coverage=0.9):
    """Predictions in eV with symmetric intervals, as a column in nm."""
    energy, half = np.asarray(energy_ev, float), np.asarray(error_ev, float) * ndtri((1 + coverage) / 2)
    return Column(
        HC_EV_NM / energy, HC_EV_NM / (energy + half), HC_EV_NM / (energy - half), np.full(len(energy), coverage)
    )


def plain(values):
    gaps = np.full(len(values), np.nan)
    return Column(np.asarray(values, float), gaps, gaps, gaps)


def make_table(smiles, predicted, measured_nm, media=None, quantity=ABSORPTION):
    count = len(smiles)
    columns = {quantity: predicted, MEASURED + quantity: plain(measured_nm)}
    return LibraryTable(
        range(1, count + 1), smiles, columns, [f"dye {n}" for n in range(count)], media or ["ethanol"] * count
    )


def anchored(table, reading_nm=2.0):
    """Changes by candidate and quantity."""
    made = Anchor().run(table, BRIEF, AnchorSettings(reading_nm=reading_nm))
    return {(candidate, one.quantity): one for candidate, record in made for one in record.changes}


AZO = [row["smiles"] for row in rows("azo_series")]
NITRO = [
    "CN(C)c1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1",
    "CCN(CC)c1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1",
    "Nc1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1",
]


# -- who moves


def test_one_measured_relative_moves_its_series_and_no_stranger():
    smiles = [*NITRO, ANTHRACENE, "not a structure"]
    table = make_table(smiles, column([2.8, 2.8, 2.9, 3.4, 3.0], [0.15] * 5), [473, np.nan, np.nan, np.nan, np.nan])
    found = anchored(table)
    assert {candidate for candidate, _ in found} == {1, 2, 3}
    assert all(one.after_nm > one.before_nm for one in found.values())  # measured to the red of its prediction
    for candidate in (2, 3):
        (anchor,) = found[candidate, ABSORPTION].anchors
        assert (anchor.name, anchor.medium, anchor.measured_nm) == ("dye 0", "ethanol", 473)
        assert 0.5 < anchor.similarity < 1
        assert anchor.shift_ev == pytest.approx(found[candidate, ABSORPTION].shift_ev)


def test_nearer_relatives_move_further_and_grow_surer():
    found = anchored(make_table([*NITRO, AZO[0]], column([2.8] * 4, [0.15] * 4), [473, np.nan, np.nan, np.nan]))
    by_similarity = sorted(found.values(), key=lambda one: one.anchors[0].similarity)
    shifts = [abs(one.shift_ev) for one in by_similarity]
    ratios = [one.error_ratio for one in by_similarity]
    assert len(shifts) >= 3
    assert shifts == sorted(shifts)
    assert ratios == sorted(ratios, reverse=True)


def test_another_medium_counts_less():
    smiles, predicted, measured = NITRO[:2], column([2.8, 2.8], [0.15, 0.15]), [473, np.nan]
    same = anchored(make_table(smiles, predicted, measured))
    other = anchored(make_table(smiles, predicted, measured, media=["ethanol", "n-hexane"]))
    assert 0 < other[2, ABSORPTION].shift_ev / same[2, ABSORPTION].shift_ev < 1
    assert other[2, ABSORPTION].error_ratio > same[2, ABSORPTION].error_ratio


def test_the_measured_dye_takes_its_own_value_with_the_error_of_measuring():
    (one,) = anchored(make_table(NITRO[:1], column([2.8], [0.2]), [473.0])).values()
    assert one.after_nm == pytest.approx(473, abs=1.0)
    noise = float(reading_error(np.array([HC_EV_NM / 473]), 2.0, trained_kernel().scatter_ev)[0])
    half = (HC_EV_NM / one.after_low_nm - HC_EV_NM / one.after_high_nm) / 2
    assert half == pytest.approx(Z90 * noise, rel=0.05)


def test_the_same_dye_in_another_medium_is_moved_but_less_sure():
    table = make_table(NITRO[:1] * 2, column([2.8, 2.7], [0.2, 0.2]), [473, np.nan], media=["ethanol", "toluene"])
    found = anchored(table)
    assert found[1, ABSORPTION].error_ratio < found[2, ABSORPTION].error_ratio < 1


def test_quantities_are_moved_by_their_own_measurements():
    table = make_table(NITRO[:2], column([2.0, 2.0], [0.2, 0.2]), [650, np.nan], quantity=EMISSION)
    assert {quantity for _, quantity in anchored(table)} == {EMISSION}


def test_nothing_measured_nothing_moved():
    assert anchored(make_table(NITRO, column([2.8] * 3, [0.2] * 3), [np.nan] * 3)) == {}
    assert anchored(LibraryTable([], [], {})) == {}


def test_a_prediction_without_an_interval_neither_moves_nor_anchors():
    energy = np.array([2.8, 2.8])
    gaps = np.full(2, np.nan)
    bare = Column(HC_EV_NM / energy, gaps, gaps, gaps)
    assert anchored(make_table(NITRO[:2], bare, [473, np.nan])) == {}


def test_both_sides_of_a_lopsided_interval_shrink_alike():
    lopsided = Column(*(np.full(2, number) for number in (450.0, 410.0, 520.0, 0.9)))
    one = anchored(make_table(NITRO[:2], lopsided, [455, np.nan]))[2, ABSORPTION]

    def sides(value, low, high):
        return np.array([HC_EV_NM / low - HC_EV_NM / value, HC_EV_NM / value - HC_EV_NM / high])

    before = sides(one.before_nm, one.before_low_nm, one.before_high_nm)
    after = sides(one.after_nm, one.after_low_nm, one.after_high_nm)
    assert after / before == pytest.approx([one.error_ratio] * 2)


def test_a_worse_reading_counts_less():
    table = make_table(NITRO[:2], column([2.8, 2.8], [0.15, 0.15]), [473, np.nan])
    good, poor = (anchored(table, reading)[2, ABSORPTION] for reading in (2.0, 30.0))
    assert abs(poor.shift_ev) < 0.8 * abs(good.shift_ev)
    assert poor.error_ratio > good.error_ratio


# -- values that cannot be believed


def test_a_wild_value_counts_less_and_carries_a_caution():
    smiles, predicted = NITRO[:2], column([2.8, 2.8], [0.05, 0.05])
    wild = anchored(make_table(smiles, predicted, [700, np.nan]))
    assert "standard errors from the predicted 443 nm" in wild[1, ABSORPTION].caution
    assert wild[2, ABSORPTION].caution is None
    residual = HC_EV_NM / 700 - 2.8
    share = wild[1, ABSORPTION].shift_ev / residual
    assert share == pytest.approx((DOUBT * 0.05 / residual) ** 2, rel=1e-6)  # s^2 / (s^2 + n^2) = (5 s / r)^2
    mild = anchored(make_table(smiles, predicted, [470, np.nan]))
    assert mild[1, ABSORPTION].caution is None


def test_dyes_that_fail_more_than_their_intervals_say_widen_those_of_their_relatives():
    rng = np.random.default_rng(2)
    correlation = np.full((12, 12), 0.3) + 0.7 * np.eye(12)
    error, noise = np.full(12, 0.1), np.full(12, 0.02)
    as_promised = Measured.of(error, rng.normal(0, 0.1, 12), noise)
    threefold = Measured.of(error, rng.normal(0, 0.3, 12), noise)
    assert Regression(as_promised, correlation).spread < 1.5
    assert Regression(threefold, correlation).spread > 2


# -- do intervals keep their promise

MEASURED_OF_THE_SERIES = 7


@pytest.mark.parametrize(("believed", "least"), [(0.9, 0.87), (1.0, 0.85)])
def test_nine_in_ten_lie_inside_on_simulated_errors(believed, least):
    """Errors drawn from the kernel, and from one with less in common than is believed; seeded."""
    smiles, rng = AZO, np.random.default_rng(7)
    similarity = Likeness(smiles).rows(smiles)
    count, energy, error = len(smiles), 2.8, 0.15
    true = Kernel(share=0.9, power=5, other_medium=0.85, scatter_ev=0.02)
    same = np.ones((count, count), dtype=bool)
    prior = true.correlation(similarity, same, np.eye(count, dtype=bool)) * error**2
    belief = Kernel(share=believed, power=5, other_medium=0.85, scatter_ev=0.02)
    believed_prior = belief.correlation(similarity, same, np.eye(count, dtype=bool))
    draws = rng.multivariate_normal(np.zeros(count), prior, size=300)
    noise = reading_error(np.full(count, energy), 2.0, 0.02)
    inside, narrower = [], []
    for truth in draws:
        shown = rng.permutation(count)[:MEASURED_OF_THE_SERIES]
        hidden = np.setdiff1d(np.arange(count), shown)
        seen = Measured.of(
            np.full(MEASURED_OF_THE_SERIES, error), truth[shown] + rng.normal(0, noise[shown]), noise[shown]
        )
        regression = Regression(seen, believed_prior[np.ix_(shown, shown)])
        found = regression.at(np.full(len(hidden), error), believed_prior[np.ix_(hidden, shown)])
        half = Z90 * error * np.sqrt(found.variance_left)
        inside.append(np.abs(truth[hidden] - found.shift) <= half)
        narrower.append(np.sqrt(found.variance_left))
    assert np.mean(inside) >= least
    assert np.mean(narrower) < 0.9


def free_electrons_nm(vinylenes):
    """Kuhn, J. Chem. Phys. 17, 1198 (1949), from memory: 8 m c L^2 / (h (N + 1)), a box of one bond beyond each end.

    Textbook numbers: bonds of 0.139 nm, N = 2 n + 4 pi electrons, 8 m c / h = 3.297e12 per metre (CODATA).
    """
    electrons = 2 * vinylenes + 4
    return 3297.0 * (electrons * 0.139) ** 2 / (electrons + 1)


def test_measured_members_correct_their_homologous_series():
    """Streptocyanines: Malhotra and Whiting, J. Chem. Soc. 1960, 3812 (tests/published/facts/cyanines.csv).

    Each is left out in turn; the free-electron model errs in the same direction for all of them.
    """
    members = series("cyanines", "maximum")
    measured = members["absorption_max_nm"].to_numpy()
    predicted = HC_EV_NM / free_electrons_nm(members["n"].to_numpy())
    smiles, media = members["smiles"].tolist(), members["medium"].tolist()
    before, after, covered = [], [], []
    for out in range(len(members)):
        shown = np.where(np.arange(len(members)) == out, np.nan, measured)
        table = make_table(smiles, column(predicted, np.full(len(members), 0.2)), shown, media)
        one = anchored(table)[out + 1, ABSORPTION]
        before.append(abs(one.before_nm - measured[out]))
        after.append(abs(one.after_nm - measured[out]))
        covered.append(one.after_low_nm <= measured[out] <= one.after_high_nm)
    assert np.mean(after) < 0.5 * np.mean(before)
    assert all(covered)


# -- the parts


def test_similarity_is_a_kernel():
    smiles = [*AZO, ANTHRACENE]
    similarity = Likeness(smiles).rows(smiles)
    assert similarity == pytest.approx(similarity.T)
    assert np.diag(similarity) == pytest.approx(np.ones(len(smiles)))
    assert similarity.min() >= 0
    species = np.eye(len(smiles), dtype=bool)
    correlation = trained_kernel().correlation(similarity, np.ones_like(species), species)
    assert np.linalg.eigvalsh(correlation).min() > 0.01
    assert (Likeness(smiles[:2]).rows(["bad("]) == 0).all()


def test_similarity_counts():
    """Ethane has one kind of atom at each radius; butane is worked out by hand: C x2, CH3-CH2 and so on."""
    assert Likeness(["CC"]).rows(["CC"])[0, 0] == pytest.approx(1)
    assert 0 < Likeness(["CC"]).rows(["CCCC"])[0, 0] < 1
    assert Likeness(["CC"]).rows(["c1ccccc1"])[0, 0] == 0


def test_regression_agrees_with_the_formula_for_two_dyes():
    """One observation: shift = rho s s' r / (s^2 + n^2); Rasmussen and Williams 2006, equations 2.25 and 2.26."""
    seen = Measured.of(np.array([0.2]), np.array([-0.15]), np.array([0.03]))
    found = Regression(seen, np.ones((1, 1))).at(np.array([0.1]), np.array([[0.6]]))
    gain = 0.6 * 0.1 * 0.2 / (0.2**2 + 0.03**2)
    assert found.shift[0] == pytest.approx(gain * -0.15)
    assert found.weights[0, 0] == pytest.approx(gain)
    assert found.variance_left[0] == pytest.approx(1 - gain * 0.6 * 0.1 * 0.2 / 0.1**2)


def test_energies_turn_sides():
    found = Energies.of(Column(*(np.array([number]) for number in (500.0, 450.0, 600.0, 0.9))))
    assert found.above[0] == pytest.approx(HC_EV_NM / 450 - HC_EV_NM / 500)
    assert found.below[0] == pytest.approx(HC_EV_NM / 500 - HC_EV_NM / 600)
    assert found.moved(np.array([0]), np.array([0.0]), np.array([1.0]))[:, 0] == pytest.approx([500, 450, 600])


def test_many_measured_dyes_are_taken_in_part(monkeypatch):
    monkeypatch.setattr("orchil_stages.anchor.series.MOST", 3)
    measured = [row["absorption_max_nm"] for row in rows("azo_series")]
    energy = HC_EV_NM / np.array(measured) + 0.1
    found = anchored(make_table(AZO, column(energy, [0.15] * len(AZO)), [*measured[:-1], np.nan]))
    assert all(1 <= len(one.anchors) <= 3 for one in found.values())


# -- training


def simulated_pairs(kernel, count=20_000, seed=3):
    rng = np.random.default_rng(seed)
    similarity = rng.uniform(0, 1, count)
    medium, species = rng.random(count) < 0.4, rng.random(count) < 0.05
    similarity[species] = 1.0
    signal = np.full(count, 0.95)
    together = kernel.correlation(similarity, medium, species) * signal
    first = rng.normal(size=count)
    second = together * first + np.sqrt(1 - together**2) * rng.normal(size=count)
    return Pairs(similarity, first, second, signal, medium, species)


def test_the_fit_finds_the_kernel_behind_simulated_errors():
    true = Kernel(share=0.7, power=4, other_medium=0.6, scatter_ev=0.02)
    found = fit_kernel(simulated_pairs(true), scatter_ev=0.03)
    assert found.power in {3, 4, 5}
    assert found.share == pytest.approx(true.share, abs=0.08)
    assert found.other_medium == pytest.approx(true.other_medium, abs=0.08)
    assert found.scatter_ev == 0.03


def test_cases_become_pairs(tmp_path):
    cases = [Case(smiles, "ethanol", 2.8, 0.15, 2.8 + 0.1 * (-1) ** at) for at, smiles in enumerate(AZO)]
    errors, signal = standardised(cases)
    assert np.mean(errors**2) == pytest.approx(1)
    assert ((signal > 0.9) & (signal < 1)).all()
    pairs = pairs_of(cases)
    assert len(pairs.first) > len(AZO)
    assert pairs.similarity.max() < 1.000001
    assert pairs.same_medium.all()
    assert not pairs.same_species.any()
    kernel = Kernel(share=0.5, power=3, other_medium=0.5, scatter_ev=0.02)
    write_kernel(kernel, "made up", tmp_path / "trained.json")
    assert '"power": 3' in (tmp_path / "trained.json").read_text()
