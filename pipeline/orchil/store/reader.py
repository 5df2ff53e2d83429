"""Reading: every function runs inside the caller's connection and writes nothing."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from orchil_schemas import MEASURED, Brief, Column, LibraryTable

from .frames import frame
from .models import (
    anchor,
    attempt,
    candidate,
    candidate_record,
    measurement,
    quantity,
    record,
    screen,
    want_result,
    work,
)
from .rows import CandidatePage, CandidateState, ScreenInfo

_STATE = [candidate.c[name] for name in CandidateState.__dataclass_fields__]
_CHUNK = 5000


def active_screen(connection: sa.Connection) -> ScreenInfo | None:
    """The screen activated last."""
    row = connection.execute(sa.select(screen).order_by(screen.c.active_at.desc()).limit(1)).first()
    if row is None:
        return None
    return ScreenInfo(row.id, Brief.model_validate(row.brief), row.library, row.versions, row.created)


def all_candidates(connection: sa.Connection) -> list[CandidateState]:
    """Every candidate in the order of the library."""
    return [CandidateState(*row) for row in connection.execute(sa.select(*_STATE).order_by(candidate.c.row_number))]


def known_work(connection: sa.Connection, digests: Iterable[str]) -> dict[str, tuple[str, ...]]:
    """Digests of the records that finished work made, by the digest of the work."""
    rows = _by_digest(connection, sa.select(work.c.digest, work.c.outputs), work.c.digest, digests)
    return {row.digest: tuple(row.outputs) for row in rows}


def load_records(connection: sa.Connection, digests: Iterable[str]) -> dict[str, tuple[str, str]]:
    """Kind and payload JSON by digest; unknown digests are left out."""
    rows = _by_digest(connection, sa.select(record), record.c.digest, digests)
    return {row.digest: (row.kind, row.payload) for row in rows}


def recent_seconds(connection: sa.Connection, stages: Sequence[str], count: int) -> dict[str, list[float]]:
    """Wall seconds of the last ``count`` successful attempts of each stage, oldest first."""
    good = sa.select(attempt.c.seconds).where(attempt.c.ok, attempt.c.seconds.is_not(None))
    newest = good.order_by(attempt.c.id.desc()).limit(count)
    return {stage: list(connection.scalars(newest.where(attempt.c.stage == stage)))[::-1] for stage in stages}


def _by_digest(
    connection: sa.Connection, select: sa.Select[Any], key: sa.Column[str], digests: Iterable[str]
) -> Iterator[sa.Row[Any]]:
    asked = iter(dict.fromkeys(digests))
    query = select.where(key.in_(sa.bindparam("digests", expanding=True)))
    while chunk := list(islice(asked, _CHUNK)):
        yield from connection.execute(query, {"digests": chunk})


def measured_names(connection: sa.Connection) -> set[str]:
    """The quantities of which the user has measured some."""
    return set(connection.scalars(sa.select(measurement.c.name).distinct()))


def library_table(connection: sa.Connection, names: Sequence[str], anchored: bool) -> LibraryTable:
    """The named quantities over all candidates that are done, in the order of the library."""
    medium = sa.func.coalesce(candidate.c.medium_used, candidate.c.medium, "")
    query = sa.select(candidate.c.id, candidate.c.smiles, candidate.c.name, medium).where(candidate.c.status == "done")
    rows = connection.execute(query.order_by(candidate.c.row_number)).all()
    owners = np.fromiter((row[0] for row in rows), dtype=np.int64, count=len(rows))
    columns = {name: _column(connection, _values(name, anchored), owners) for name in names}
    smiles, labels, media = [row[1] or "" for row in rows], [row[2] for row in rows], [row[3] for row in rows]
    return LibraryTable(owners.tolist(), smiles, columns, labels, media)


def _values(name: str, anchored: bool) -> sa.Select[Any]:
    """Candidate, value, low, high and coverage of a predicted or, with a prefix, measured quantity."""
    if name.startswith(MEASURED):
        gaps = (sa.null(), sa.null(), sa.null())
        measured = measurement.c.name == name.removeprefix(MEASURED)
        return sa.select(measurement.c.candidate_id, measurement.c.value, *gaps).where(measured)
    parts = [quantity.c[part] for part in ("value", "low", "high")]
    if anchored:
        return sa.select(quantity.c.candidate_id, *parts, quantity.c.coverage).where(quantity.c.name == name)
    same = (anchor.c.name == quantity.c.name) & (anchor.c.candidate_id == quantity.c.candidate_id)
    before = [sa.func.coalesce(anchor.c[f"unanchored_{part.name}"], part) for part in parts]
    chosen = sa.select(quantity.c.candidate_id, *before, quantity.c.coverage)
    return chosen.select_from(quantity.outerjoin(anchor, same)).where(quantity.c.name == name)


def _column(connection: sa.Connection, query: sa.Select[Any], owners: np.ndarray[Any, np.dtype[np.int64]]) -> Column:
    cursor = connection.execute(query).cursor
    assert cursor is not None
    # Rows straight from the driver: for 100,000 candidates SQLAlchemy's row objects take most of the time.
    # None becomes NaN here, and only here: the table of a library stage is numbers.
    values = np.array(cursor.fetchall(), dtype=np.float64).reshape(-1, 5)
    filled = np.full((4, len(owners)), np.nan)
    order = np.argsort(owners)
    place = np.searchsorted(owners, values[:, 0], sorter=order)
    known = place < len(owners)
    known[known] = owners[order[place[known]]] == values[known, 0]
    filled[:, order[place[known]]] = values[known, 1:].T
    return Column(*filled)


def ranking(connection: sa.Connection, limit: int | None) -> pd.DataFrame:
    """The view ``ranking``, best first, candidates without a rank last."""
    query = "SELECT * FROM ranking" + ("" if limit is None else f" LIMIT {int(limit)}")
    found = connection.exec_driver_sql(query)
    return frame(list(found.keys()), found.all())


def candidate_page(connection: sa.Connection, name_or_id: str | int) -> CandidatePage | None:
    """Everything about the candidate of that name, else of that id; of several with one name the first.

    A number is an id and no name.
    """
    key = candidate.c.name if isinstance(name_or_id, str) else candidate.c.id
    named = _states(connection, key == name_or_id)
    if not named and isinstance(name_or_id, str) and name_or_id.isdecimal() and len(name_or_id) < 10:
        named = _states(connection, candidate.c.id == int(name_or_id))
    if not named:
        return None
    chosen = named[0]
    links = _links(connection, chosen.id)
    return CandidatePage(
        candidate=chosen,
        extra=connection.scalars(sa.select(candidate.c.extra).where(candidate.c.id == chosen.id)).one(),
        row=_ranking_row(connection, chosen.row_number),
        records={row.kind: json.loads(row.payload) for row in links},
        attempts=_attempts(connection, chosen.id, links),
        wants=_wants(connection, chosen.id),
        repeated_by=tuple(one.name for one in _states(connection, candidate.c.duplicate_of == chosen.id)),
        same_name=tuple(one.id for one in _states(connection, candidate.c.name == chosen.name) if one != chosen),
    )


def _states(connection: sa.Connection, condition: sa.ColumnElement[bool]) -> list[CandidateState]:
    query = sa.select(*_STATE).where(condition).order_by(candidate.c.row_number)
    return [CandidateState(*row) for row in connection.execute(query)]


def _links(connection: sa.Connection, owner: int) -> Sequence[sa.Row[Any]]:
    query = sa.select(record).join(candidate_record, candidate_record.c.record_digest == record.c.digest)
    return connection.execute(query.where(candidate_record.c.candidate_id == owner).order_by(record.c.kind)).all()


def _ranking_row(connection: sa.Connection, row_number: int) -> dict[str, Any]:
    found = connection.execute(sa.text("SELECT * FROM ranking WHERE row_number = :number"), {"number": row_number})
    return dict(found.mappings().one())


def _attempts(connection: sa.Connection, owner: int, links: Sequence[sa.Row[Any]]) -> tuple[dict[str, Any], ...]:
    """Tries made for this candidate, and those of shared work whose results it holds in full."""
    held = {row.digest for row in links}
    makers = known_work(connection, {row.made_by for row in links if row.made_by})
    shared = [digest for digest, outputs in makers.items() if held.issuperset(outputs)]
    query = sa.select(attempt).where(sa.or_(attempt.c.candidate_id == owner, attempt.c.work_digest.in_(shared)))
    return _dictionaries(connection.execute(query.order_by(attempt.c.id)))


def _wants(connection: sa.Connection, owner: int) -> tuple[dict[str, Any], ...]:
    latest = sa.select(screen.c.id).order_by(screen.c.active_at.desc()).limit(1).scalar_subquery()
    mine = sa.select(want_result).where(want_result.c.candidate_id == owner, want_result.c.screen_id == latest)
    return _dictionaries(connection.execute(mine.order_by(want_result.c.position)))


def _dictionaries(rows: Iterable[sa.Row[Any]]) -> tuple[dict[str, Any], ...]:
    return tuple(dict(row._mapping) for row in rows)
