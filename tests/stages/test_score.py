"""Score: probabilities of wants, scores, ranks, fronts and picks."""

from __future__ import annotations

import time

import numpy as np
import pytest
from orchil_schemas import Brief, Column, LibraryStage, LibraryTable, NoSettings, Want
from orchil_stages.score import Score
from orchil_stages.score.desire import FLOOR, probabilities
from orchil_stages.score.fronts import pareto_fronts
from orchil_stages.score.ranking import rank_table
from scipy import stats


def column(value, low=None, high=None, coverage=0.9):
    value = np.asarray(value, dtype=float)
    empty = np.full(len(value), np.nan)
    sure = low is None
    return Column(
        value,
        empty if sure else np.asarray(low, dtype=float),
        empty if sure else np.asarray(high, dtype=float),
        empty if sure else np.full(len(value), coverage),
    )


def table(columns, smiles=None):
    n = len(next(iter(columns.values())).value)
    return LibraryTable(range(100, 100 + n), smiles or ["C" * (i + 1) for i in range(n)], columns)


def scored(table_, wants, **pick):
    brief = Brief(title="x", want=wants, pick=pick)
    return list(Score().run(table_, brief, NoSettings()))


def test_is_a_library_stage():
    assert isinstance(Score(), LibraryStage)
    assert Score().found().ok
    brief = Brief(title="x", want=[{"quantity": "a", "at_least": 1}, {"quantity": "a", "at_most": 2}])
    assert Score().reads(brief, NoSettings()) == ("a",)


def test_a_symmetric_interval_is_a_normal_distribution():
    """Against scipy.stats.norm; +-1.96 sigma hold 95 % (any table of the normal distribution)."""
    wave = column([530, 505, 600], [510, 485, 580], [550, 525, 620], 0.95)
    got = probabilities(wave, Want(quantity="q", between=(500, 560)))
    sigma = 20 / 1.959964
    expected = [stats.norm(v, sigma).cdf(560) - stats.norm(v, sigma).cdf(500) for v in (530, 505, 600)]
    assert got == pytest.approx(np.maximum(expected, FLOOR), abs=1e-6)


@pytest.mark.parametrize("coverage", [0.5, 0.8, 0.9, 0.95])
def test_a_skew_interval_keeps_its_coverage_tails_and_median(coverage):
    """By definition of a central interval: coverage inside, the rest halved on both tails; the median."""
    skew = column([500], [490], [540], coverage)
    assert probabilities(skew, Want(quantity="q", between=(490, 540)))[0] == pytest.approx(coverage)
    assert probabilities(skew, Want(quantity="q", at_most=490))[0] == pytest.approx((1 - coverage) / 2)
    assert probabilities(skew, Want(quantity="q", at_least=540))[0] == pytest.approx((1 - coverage) / 2)
    assert probabilities(skew, Want(quantity="q", at_least=500))[0] == pytest.approx(0.5)


def test_without_interval_a_linear_desirability_with_a_soft_edge():
    """Derringer and Suich (1980) with exponent 1; the edge is 5 % of the window, or of an only limit."""
    got = probabilities(column([500, 560, 561.5, 563, 450]), Want(quantity="q", between=(500, 560)))
    assert got == pytest.approx([1, 1, 0.5, FLOOR, FLOOR])
    assert probabilities(column([15, 15.375, 20]), Want(quantity="q", at_most=15)) == pytest.approx([1, 0.5, FLOOR])
    assert probabilities(column([0, -1]), Want(quantity="q", at_least=0)) == pytest.approx([1, FLOOR])


def test_missing_value_and_half_an_interval():
    got = probabilities(
        Column(np.array([np.nan, 530]), np.array([1.0, np.nan]), np.array([2.0, 540]), np.array([0.9, 0.9])),
        Want(quantity="q", between=(500, 560)),
    )
    assert got == pytest.approx([FLOOR, 1])


def test_one_sided_width_of_zero_is_a_step():
    got = probabilities(column([500, 500], [500, 500], [510, 510]), Want(quantity="q", at_least=500.0001))
    assert got == pytest.approx([0.5, 0.5], abs=1e-4)
    assert probabilities(column([500], [500], [510]), Want(quantity="q", at_least=499))[0] == 1


def test_score_is_the_weighted_geometric_mean_and_hit_probability_the_product():
    """scipy.stats.gmean is the reference for the mean."""
    sigma = 10 / 1.6448536
    data = {"a": column([500, 520], [490, 510], [510, 530]), "b": column([40, 10])}
    wants = [{"quantity": "a", "at_least": 505, "weight": 3}, {"quantity": "b", "at_most": 15}]
    results = dict(scored(table(data), wants))
    chances = stats.norm(500, sigma).sf(505), 0.01
    assert results[100].score == pytest.approx(stats.gmean(chances, weights=[3, 1]), rel=1e-6)
    assert results[100].hit_probability == pytest.approx(chances[0] * chances[1], rel=1e-6)
    assert sum(want.contribution for want in results[100].wants) == pytest.approx(1)
    assert results[101].rank == 1
    assert results[100].rank == 2


def test_contribution_is_zero_when_everything_is_met_and_missing_has_no_value():
    results = dict(scored(table({"a": column([5, np.nan])}), [{"quantity": "a", "at_most": 9}]))
    assert results[100].score == results[100].hit_probability == 1
    assert results[100].wants[0].contribution == 0
    assert results[101].wants[0].value is None
    assert results[101].wants[0].probability == 0.01


def test_a_quantity_nobody_has():
    results = scored(table({"a": column([5, 6])}), [{"quantity": "elsewhere", "at_least": 0}])
    assert [record.score for _, record in results] == pytest.approx([0.01, 0.01])
    assert all(record.pick is None for _, record in results)


def test_ranks_are_unique_and_ties_go_to_the_hit_probability_then_to_the_earlier_row():
    data = {"a": column([5, 5, 50]), "b": column([5, 5, 5])}
    results = scored(table(data), [{"quantity": "a", "at_most": 9}, {"quantity": "b", "at_most": 9}])
    assert [record.rank for _, record in results] == [1, 2, 3]


def brute_force_fronts(points):
    fronts, left, number = np.zeros(len(points), dtype=int), set(range(len(points))), 0
    while left:
        number += 1
        front = {
            i for i in left if not any((points[j] >= points[i]).all() and (points[j] > points[i]).any() for j in left)
        }
        fronts[list(front)] = number
        left -= front
    return fronts


@pytest.mark.parametrize("wants", [1, 2, 4])
def test_fronts_against_the_definition(wants):
    points = np.random.default_rng(wants).integers(1, 6, size=(80, wants)) / 5
    order = np.argsort(-np.log(points).sum(axis=1), kind="stable")
    assert pareto_fronts(points, order).tolist() == brute_force_fronts(points).tolist()


def test_beyond_the_exact_ones_the_best_keep_their_fronts(monkeypatch):
    points = np.random.default_rng(7).uniform(0.1, 1, size=(60, 3))
    order = np.argsort(-np.log(points).sum(axis=1), kind="stable")
    whole = brute_force_fronts(points)
    monkeypatch.setattr("orchil_stages.score.fronts.EXACT", 20)
    fronts = pareto_fronts(points, order)
    assert fronts[order[:20]].tolist() == whole[order[:20]].tolist()
    assert set(fronts[order[20:]]) == {fronts[order[:20]].max() + 1}


def test_picks_are_diverse_and_go_down_the_ranking():
    smiles = ["CCCCCCCCO", "CCCCCCCCCO", "c1ccc2ccccc2c1", "O=C1C=CC(=O)C=C1", "nonsense("]
    data = {"a": column([9, 8, 7, 6, 5])}
    wants = [{"quantity": "a", "at_least": 20}]
    data["a"] = column([9, 8, 7, 6, 5], [7, 6, 5, 4, 3], [19, 18, 17, 16, 15])
    picks = {c: r.pick for c, r in scored(table(data, smiles), wants, count=10, spread=0.35)}
    assert picks == {100: 1, 101: None, 102: 2, 103: 3, 104: None}
    picks = {c: r.pick for c, r in scored(table(data, smiles), wants, count=2, spread=0)}
    assert picks == {100: 1, 101: 2, 102: None, 103: None, 104: None}


def test_the_same_molecule_in_two_media_is_picked_once():
    picks = [r.pick for _, r in scored(table({"a": column([5, 5])}, ["CCO", "OCC"]), [{"quantity": "a", "at_most": 9}])]
    assert picks == [1, None]


def test_a_must_that_is_probably_missed_is_not_picked():
    data = {"a": column([5, 500]), "b": column([50, 5])}
    wants = [{"quantity": "a", "at_most": 9}, {"quantity": "b", "at_most": 9, "must": True}]
    assert [r.pick for _, r in scored(table(data, ["C", "c1ccccc1"]), wants)] == [None, 1]


def test_an_empty_library():
    empty = LibraryTable([], [], {})
    assert scored(empty, [{"quantity": "a", "at_most": 9}]) == []


def test_a_hundred_thousand_candidates_are_ranked_within_a_second_of_cpu():
    n = 100_000
    rng = np.random.default_rng(1)
    values = rng.uniform(400, 700, size=(5, n))
    data = {str(k): column(v, v - rng.uniform(5, 40, n), v + rng.uniform(5, 40, n)) for k, v in enumerate(values)}
    wants = [Want(quantity=name, between=(500, 560)) for name in data]
    library = table(data, [""] * n)
    seconds = []
    for _ in range(2):
        start = time.process_time()
        rank_table(library, wants)
        seconds.append(time.process_time() - start)
    assert min(seconds) < 1.0
