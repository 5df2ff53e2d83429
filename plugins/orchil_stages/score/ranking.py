"""From columns to a ranking: probabilities of wants, score, rank and front, as arrays over the library."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray, IntArray, LibraryTable, Want

from .desire import probabilities
from .fronts import pareto_fronts


@dataclass(frozen=True)
class Ranking:
    """Arrays over n candidates in the order of the table; ``order`` lists rows by rank."""

    value: FloatArray
    probability: FloatArray
    score: FloatArray
    hit_probability: FloatArray
    contribution: FloatArray
    order: IntArray
    rank: IntArray
    front: IntArray


def rank_table(table: LibraryTable, wants: Sequence[Want]) -> Ranking:
    """Rank every candidate of the table; ties go to the higher hit probability, then to the earlier row.

    The score is the weighted geometric mean of the probabilities; the hit probability is their product, as if
    the errors of different quantities were independent.
    """
    columns = [table.column(want.quantity) for want in wants]
    value = np.stack([column.value for column in columns], axis=1)
    probability = np.stack([probabilities(c, w) for c, w in zip(columns, wants, strict=True)], axis=1)
    weight = np.array([want.weight for want in wants])
    cost = np.log(1 / probability) * weight
    score = np.exp(-cost.sum(axis=1) / weight.sum())
    hit = probability.prod(axis=1)
    order = np.lexsort((-hit, -score))
    return Ranking(
        value=value,
        probability=probability,
        score=score,
        hit_probability=hit,
        contribution=_shares(cost),
        order=order,
        rank=_places(order),
        front=pareto_fronts(probability, order),
    )


def eligible_rows(ranking: Ranking, wants: Sequence[Want]) -> IntArray:
    """Rows by rank that may be picked: some value is known and every ``must`` is more likely met than not."""
    must = np.array([want.must for want in wants])
    kept: NDArray[np.bool_] = np.all(ranking.probability[:, must] >= 0.5, axis=1)
    allowed = kept & ~np.all(np.isnan(ranking.value), axis=1)
    return np.asarray(ranking.order[allowed[ranking.order]])


def _shares(cost: FloatArray) -> FloatArray:
    total = cost.sum(axis=1, keepdims=True)
    return np.asarray(np.divide(cost, total, out=np.zeros_like(cost), where=total > 0))


def _places(order: IntArray) -> IntArray:
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = np.arange(1, len(order) + 1)
    return rank
