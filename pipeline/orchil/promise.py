"""Who comes first when the night may be too short: the most promising by what cheap stages know.

The ranking stage itself judges, by those wants alone whose quantity is known by then. Further wants can only lower
the probability that all are met, so that this is a bound. The rest of the order: whose failure is known comes first,
because it costs nothing; who misses a ``must`` comes last; among equals smaller ones first, because more of them fit.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from orchil_schemas import Brief, Column, LibraryRow, LibraryTable, Record, Score

from .chain import Chain, LibraryStep, Step

CHEAP_SECONDS = 60.0
"""A stage that may take longer (its time limit) is not cheap."""
SIZE = "heavy_atoms"
"""The quantity that goes for the size of a candidate; without it the text of its structure does."""
MET = 0.5
"""A ``must`` that is met with less probability counts as missed, as it does in picking."""


Numbers = tuple[float | None, float | None, float | None, float | None]
"""Value, low, high and coverage."""
Verdict = tuple[bool, float]
"""Does it miss a must; its score."""


@dataclass(frozen=True, slots=True)
class Glance:
    """What cheap stages found out about one candidate; ``failed`` when it has lost a wanted quantity already.

    Of a library of a million there are a million of these: no more is kept than the order needs.
    """

    id: int
    size: float
    quantities: Mapping[str, Numbers]
    failed: bool

    @classmethod
    def at(cls, candidate: int, records: Iterable[Record], wanted: Collection[str], failed: bool) -> Glance:
        """Keep the wanted numbers of the records."""
        made = list(records)
        found = {one.name: one for record in made for one in record.quantities()}
        length = float(sum(len(record.structure) for record in made if isinstance(record, LibraryRow)))
        kept = {name: (one.value, one.low, one.high, one.coverage) for name, one in found.items() if name in wanted}
        return cls(candidate, found[SIZE].value if SIZE in found else length, kept, failed)


def cheap_steps(chain: Chain) -> list[Step]:
    """What runs over the whole library first: entry steps, and quick ones that need nothing dear."""
    made: set[type[Record]] = {LibraryRow}
    cheap = []
    for step in chain.steps:
        if made.issuperset(step.stage.needs) and (
            step in chain.entry_steps or step.stage.time_limit_seconds <= CHEAP_SECONDS
        ):
            cheap.append(step)
            made.update(step.gives)
    return cheap


def most_promising(glances: Sequence[Glance], chain: Chain, brief: Brief) -> list[int]:
    """Candidates, the most promising first; equals stay in the order they came in."""
    verdicts = _verdicts(glances, chain, brief)

    def place(glance: Glance) -> tuple[bool, bool, float, float]:
        missed, score = verdicts.get(glance.id, (False, 0.0))
        return not glance.failed, missed, -score, glance.size

    return [glance.id for glance in sorted(glances, key=place)]


def _verdicts(glances: Sequence[Glance], chain: Chain, brief: Brief) -> dict[int, Verdict]:
    """Verdicts by those wants that are known so far; none where none is, or where nothing ranks."""
    judge = next((step for step in chain.library_steps if Score in step.stage.makes), None)
    known = {name for glance in glances for name in glance.quantities}
    wants = tuple(want for want in brief.want if want.quantity in known)
    if judge is None or not wants:
        return {}
    return _judged(judge, glances, brief.model_copy(update={"want": wants}))


def _judged(judge: LibraryStep, glances: Sequence[Glance], brief: Brief) -> dict[int, Verdict]:
    columns = {name: _column(glances, name) for name in judge.stage.reads(brief, judge.settings)}
    unknown = [""] * len(glances)
    table = LibraryTable([glance.id for glance in glances], unknown, columns, unknown, unknown)
    made = judge.stage.run(table, brief, judge.settings)
    musts = {want.quantity for want in brief.want if want.must}
    return {owner: (_misses(record, musts), record.score) for owner, record in made if isinstance(record, Score)}


def _column(glances: Sequence[Glance], name: str) -> Column:
    """One quantity over the candidates, NaN where it is unknown or has no interval."""
    found = [glance.quantities.get(name) for glance in glances]
    rows = [one or (None,) * 4 for one in found]
    return Column(*np.array(rows, dtype=np.float64).reshape(-1, 4).T)


def _misses(score: Score, musts: Collection[str]) -> bool:
    return any(one.probability < MET and one.quantity in musts for one in score.wants)
