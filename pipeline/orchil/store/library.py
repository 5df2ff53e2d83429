"""Candidates from the library file, added once and never changed; only what the user measured may change."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import islice
from typing import Any

import sqlalchemy as sa

from . import bulk
from .errors import StoreError
from .models import candidate, measurement
from .rows import CandidateRow

_CHUNK = 5000
_CONTENT = ("row_number", "name", "structure", "format", "medium", "charge", "extra")


def add_candidates(connection: sa.Connection, rows: Sequence[CandidateRow]) -> None:
    """Add the rows that are not there; :class:`StoreError` when one is there with another content."""
    for chunk in _chunks(rows):
        known = _unchanged(connection, chunk)
        new = [content | {"status": "waiting"} for number, content in chunk.items() if number not in known]
        bulk.insert(connection, candidate, new)
    _write_measured(connection, rows)


def update_measured(connection: sa.Connection, rows: Sequence[CandidateRow]) -> int:
    """Take the measured values of the rows that are there; returns how many rows are not.

    :class:`StoreError` when one is there with another content.
    """
    there: set[int] = set()
    for chunk in _chunks(rows):
        there |= _unchanged(connection, chunk).keys()
    known = [row for row in rows if row.row_number in there]
    _write_measured(connection, known)
    return len(rows) - len(known)


def _write_measured(connection: sa.Connection, rows: Sequence[CandidateRow]) -> None:
    """Replace what was measured for these rows."""
    if not any(row.measured for row in rows) and connection.execute(sa.select(measurement).limit(1)).first() is None:
        return
    found = sa.select(candidate.c.id, candidate.c.row_number)
    for start in range(0, len(rows), _CHUNK):
        measured = {row.row_number: row.measured for row in rows[start : start + _CHUNK]}
        within = candidate.c.row_number.between(min(measured), max(measured))
        owners = {number: owner for owner, number in connection.execute(found.where(within)) if number in measured}
        old = sa.delete(measurement).where(measurement.c.candidate_id == sa.bindparam("key"))
        connection.execute(old, [{"key": owner} for owner in owners.values()])
        new = [
            {"name": name, "candidate_id": owners[number], "value": value}
            for number, values in measured.items()
            for name, value in values.items()
        ]
        bulk.insert(connection, measurement, new)


def _unchanged(connection: sa.Connection, chunk: dict[int, dict[str, Any]]) -> dict[int, dict[str, Any]]:
    """The rows of a chunk that are there; :class:`StoreError` when one is there with another content."""
    known = _known(connection, min(chunk), max(chunk))
    changed = [number for number in chunk.keys() & known.keys() if chunk[number] != known[number]]
    if changed:
        raise _changed(known[min(changed)], chunk[min(changed)])
    return {number: content for number, content in known.items() if number in chunk}


def _chunks(rows: Sequence[CandidateRow]) -> Iterator[dict[int, dict[str, Any]]]:
    left = iter(rows)
    while taken := list(islice(left, _CHUNK)):
        chunk: dict[int, dict[str, Any]] = {}
        for row in taken:
            content = _content(row)
            if chunk.setdefault(row.row_number, content) != content:
                raise _changed(chunk[row.row_number], content)
        yield chunk


def _content(row: CandidateRow) -> dict[str, Any]:
    return {name: getattr(row, name) for name in _CONTENT} | {"extra": dict(row.extra)}


def _known(connection: sa.Connection, first: int, last: int) -> dict[int, dict[str, Any]]:
    columns = [candidate.c[name] for name in _CONTENT]
    query = sa.select(*columns).where(candidate.c.row_number.between(first, last))
    return {row.row_number: dict(row._mapping) for row in connection.execute(query)}


def _changed(before: dict[str, Any], after: dict[str, Any]) -> StoreError:
    parts = [f"{key} {before[key]!r} became {after[key]!r}" for key in _CONTENT if before[key] != after[key]]
    return StoreError(
        f"the library changed since this store was made: in row {before['row_number']} {', '.join(parts)}; "
        "screen the new library into a new store"
    )
