"""Writing a batch: every function runs inside the caller's transaction and may be repeated without harm."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import fields
from itertools import groupby
from operator import itemgetter
from typing import Any

import sqlalchemy as sa
from orchil_schemas import Band, Identity, IntakeNotes, Medium, Record, Score, Transitions

from . import anchors, bulk, typed
from .errors import StoreError
from .models import (
    anchor,
    attempt,
    band,
    candidate,
    candidate_record,
    quantity,
    record,
    score,
    transition,
    want_result,
    work,
)
from .rows import AttemptRow, Batch, CandidateOutcome, WorkRow

Row = dict[str, Any]
Link = tuple[int, Record]


def write_batch(connection: sa.Connection, batch: Batch) -> None:
    """Write all of a batch, parents before children."""
    linked = ((made.digest, made.kind, made.canonical_json) for _, made in batch.links)
    write_records(connection, [*batch.records, *linked], batch.works)
    bulk.add_missing(connection, work, [_work(row) for row in batch.works])
    bulk.insert(connection, attempt, [_attempt(row) for row in batch.attempts])
    write_links(connection, batch.links)
    _write_outcomes(connection, batch.outcomes)


def write_records(
    connection: sa.Connection, records: Iterable[tuple[str, str, str]], works: Iterable[WorkRow] = ()
) -> None:
    """Add the records that are not there yet."""
    makers = {digest: row.digest for row in works for digest in row.records}
    unique = {digest: (kind, payload) for digest, kind, payload in records}
    rows = [
        {
            "digest": digest,
            "kind": kind,
            "payload": _without_nan(kind, payload),
            "made_by": makers.get(digest),
        }
        for digest, (kind, payload) in unique.items()
    ]
    bulk.add_missing(connection, record, rows)


def write_links(connection: sa.Connection, links: Sequence[Link]) -> None:
    """Say which records a candidate has now, and fill the tables people query from them."""
    newest = {(owner, made.kind): made for owner, made in links}
    rows = [
        {"candidate_id": owner, "kind": kind, "record_digest": made.digest} for (owner, kind), made in newest.items()
    ]
    bulk.add_or_replace(connection, candidate_record, rows)
    current = [(owner, made) for (owner, _), made in newest.items()]
    _write_quantities(connection, current)
    _write_typed(connection, current)


_KNOWN_LATER = ("failed_stage", "reason_code", "reason", "smiles", "medium_used", "cautions", "duplicate_of")


def forget(connection: sa.Connection, candidates: Sequence[int]) -> None:
    """Set candidates back to waiting, without results. Records and finished work stay in the cache."""
    keys = [{"key": owner} for owner in candidates]
    if not keys:
        return
    for table in (candidate_record, quantity, transition, band, anchor):
        connection.execute(sa.delete(table).where(table.c.candidate_id == sa.bindparam("key")), keys)
    empty = dict.fromkeys(_KNOWN_LATER)
    change = sa.update(candidate).where(candidate.c.id == sa.bindparam("key")).values(status="waiting", **empty)
    connection.execute(change, keys)


def write_scores(connection: sa.Connection, screen_id: int, scores: Sequence[tuple[int, Score]]) -> None:
    """Replace all scores of a screen."""
    for table in (want_result, score):
        connection.execute(sa.delete(table).where(table.c.screen_id == screen_id))
    ordered = sorted(scores, key=itemgetter(0))  # in the order of the key, each page is filled once
    rows = [typed.score_row(screen_id, owner, one) for owner, one in ordered]
    wants = [row for owner, one in ordered for row in typed.want_rows(screen_id, owner, one)]
    bulk.insert(connection, score, rows)
    bulk.insert(connection, want_result, wants)


def _without_nan(kind: str, payload: str) -> str:
    # Parsing every payload would be slow; only text that could hold such a number is looked at closely.
    if "NaN" in payload or "Infinity" in payload:
        json.loads(payload, parse_constant=lambda word: _refuse(kind, word))
    return payload


def _refuse(kind: str, word: str) -> None:
    raise StoreError(f"a record of kind '{kind}' holds {word}: a stage must fail instead of making such a number")


def _work(row: WorkRow) -> Row:
    settings = json.loads(row.settings_json)
    return {
        "digest": row.digest,
        "stage": row.stage,
        "stage_version": row.version,
        "settings": settings,
        "outputs": list(row.records),
    }


def _attempt(row: AttemptRow) -> Row:
    values = _fields(row) | {"versions": dict(row.versions)}
    values["stage_version"] = values.pop("version")
    return values | {"seconds": _finite(row.seconds), "cpu_seconds": _finite(row.cpu_seconds)}


def _fields(row: AttemptRow | CandidateOutcome) -> Row:
    return {one.name: getattr(row, one.name) for one in fields(row)}


def _finite(value: float | None) -> float | None:
    return value if value is not None and math.isfinite(value) else None


def _write_quantities(connection: sa.Connection, links: Sequence[Link]) -> None:
    made = [(owner, one) for owner, found in links for one in found.quantities() if math.isfinite(one.value)]
    offered = {(owner, info.name) for owner, found in links for info in found.offers}
    anchors.outdate(connection, offered)
    gone = offered - {(owner, one.name) for owner, one in made}
    if gone:
        key = (quantity.c.candidate_id == sa.bindparam("owner")) & (quantity.c.name == sa.bindparam("gone"))
        connection.execute(sa.delete(quantity).where(key), [{"owner": owner, "gone": name} for owner, name in gone])
    rows = [
        {
            "candidate_id": owner,
            "name": one.name,
            "value": one.value,
            "low": _finite(one.low),
            "high": _finite(one.high),
            "coverage": one.coverage if one.low is not None and one.high is not None else None,
            "unit": one.unit,
        }
        for owner, one in made
    ]
    bulk.add_or_replace(connection, quantity, rows)


def _write_typed(connection: sa.Connection, links: Sequence[Link]) -> None:
    bands = [typed.band_row(owner, found) for owner, found in links if isinstance(found, Band)]
    bulk.add_or_replace(connection, band, bands)
    excited = [(owner, found) for owner, found in links if isinstance(found, Transitions)]
    if excited:
        old = sa.delete(transition).where(transition.c.candidate_id == sa.bindparam("key"))
        connection.execute(old, [{"key": owner} for owner, _ in excited])
    bulk.insert(connection, transition, [row for owner, found in excited for row in typed.state_rows(owner, found)])
    _update_candidates(connection, _known_from_intake(links))


def _known_from_intake(links: Sequence[Link]) -> Iterator[Row]:
    for owner, found in links:
        if isinstance(found, Identity):
            yield {"key": owner, "smiles": found.smiles}
        elif isinstance(found, Medium):
            yield {"key": owner, "medium_used": found.name}
        elif isinstance(found, IntakeNotes):
            yield {"key": owner, "cautions": typed.joined(found.cautions)}


def _write_outcomes(connection: sa.Connection, outcomes: Sequence[CandidateOutcome]) -> None:
    rows = [_fields(outcome) for outcome in outcomes]
    _update_candidates(connection, [{"key": row.pop("candidate_id"), **row} for row in rows])


def _update_candidates(connection: sa.Connection, rows: Iterable[Row]) -> None:
    # One statement sets the same columns in all its rows.
    change = sa.update(candidate).where(candidate.c.id == sa.bindparam("key"))
    for _, group in groupby(sorted(rows, key=sorted), key=sorted):
        connection.execute(change, list(group))
