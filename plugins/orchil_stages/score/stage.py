"""The library stage `score`: columns of the library and a brief -> one Score for every candidate."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

import orchil_schemas
from orchil_schemas import Availability, Brief, Frozen, LibraryTable, NoSettings, Record, Want, WantResult

from orchil_stages.installed import availability

ScoreSettings = NoSettings


class Score:
    """Ranks the whole library against a brief and makes the diverse choice."""

    name = "score"
    version = "1"
    makes: tuple[type[Record], ...] = (orchil_schemas.Score,)
    Settings: type[Frozen] = ScoreSettings

    def found(self) -> Availability:
        """Are RDKit (for the likeness of picks) and SciPy installed?"""
        return availability("rdkit", "scipy")

    def reads(self, brief: Brief, settings: NoSettings) -> tuple[str, ...]:
        """The quantities of the wants, each once."""
        return tuple(dict.fromkeys(want.quantity for want in brief.want))

    def run(self, table: LibraryTable, brief: Brief, settings: NoSettings) -> Iterable[tuple[int, Record]]:
        """Yield (candidate, Score) in the order of the table."""
        from .picks import pick_diverse
        from .ranking import eligible_rows, rank_table

        ranking = rank_table(table, brief.want)
        picked = pick_diverse(eligible_rows(ranking, brief.want).tolist(), table.smiles, brief.pick)
        numbers = zip(
            ranking.rank.tolist(),
            ranking.score.tolist(),
            ranking.hit_probability.tolist(),
            ranking.front.tolist(),
            ranking.value.tolist(),
            ranking.probability.tolist(),
            ranking.contribution.tolist(),
            strict=True,
        )
        for row, (rank, score, hit, front, values, chances, shares) in enumerate(numbers):
            yield (
                table.candidate[row],
                orchil_schemas.Score(
                    rank=rank,
                    score=min(score, 1.0),
                    hit_probability=hit,
                    pareto_front=front,
                    pick=picked.get(row),
                    wants=_results(brief.want, values, chances, shares),
                ),
            )


def _results(
    wants: Sequence[Want], values: Sequence[float], chances: Sequence[float], shares: Sequence[float]
) -> tuple[WantResult, ...]:
    return tuple(
        WantResult(
            quantity=want.quantity,
            value=None if math.isnan(value) else value,
            probability=chance,
            weight=want.weight,
            contribution=share,
        )
        for want, value, chance, share in zip(wants, values, chances, shares, strict=True)
    )
