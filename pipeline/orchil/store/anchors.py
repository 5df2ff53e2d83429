"""Numbers that the user's measurements have moved: they stand where the predicted ones stood, which are kept beside.

Every function runs inside the caller's transaction.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import sqlalchemy as sa
from orchil_schemas import Anchor

from . import bulk
from .models import anchor, band, candidate_record, quantity

Row = dict[str, Any]

COLUMNS = {
    "absorption_max_nm": ("absorption_max_nm", "absorption_low_nm", "absorption_high_nm"),
    "emission_max_nm": ("emission_max_nm", "emission_low_nm", "emission_high_nm"),
}
"""Columns of ``band`` by quantity: value and interval."""


def withdraw(connection: sa.Connection) -> None:
    """Put all predicted numbers back and forget what moved them."""
    rows = [dict(row._mapping) for row in connection.execute(sa.select(anchor))]
    if not rows:
        return
    _set(connection, [_numbers(row, *(row[f"unanchored_{part}"] for part in ("value", "low", "high"))) for row in rows])
    _forget_records(connection, {row["candidate_id"] for row in rows})
    connection.execute(sa.delete(anchor))


def apply(connection: sa.Connection, made: Sequence[tuple[int, Anchor]]) -> None:
    """Let the anchored numbers stand in for the predicted ones, which are there."""
    moved = [(owner, change) for owner, record in made for change in record.changes]
    keys = [{"candidate_id": owner, "name": change.quantity} for owner, change in moved]
    new = [
        _numbers(key, change.after_nm, change.after_low_nm, change.after_high_nm)
        for key, (_, change) in zip(keys, moved, strict=True)
    ]
    _set(connection, new)
    rows = [
        key
        | {
            "unanchored_value": change.before_nm,
            "unanchored_low": change.before_low_nm,
            "unanchored_high": change.before_high_nm,
            "caution": change.caution,
        }
        for key, (_, change) in zip(keys, moved, strict=True)
    ]
    bulk.insert(connection, anchor, rows)


def outdate(connection: sa.Connection, offered: Iterable[tuple[int, str]]) -> None:
    """Forget what moved numbers that are predicted anew, by candidate and quantity."""
    outdated = [(owner, name) for owner, name in offered if name in COLUMNS]
    if outdated:
        same = (anchor.c.candidate_id == sa.bindparam("owner")) & (anchor.c.name == sa.bindparam("moved"))
        connection.execute(sa.delete(anchor).where(same), [{"owner": owner, "moved": name} for owner, name in outdated])
        _forget_records(connection, {owner for owner, _ in outdated})


def _forget_records(connection: sa.Connection, owners: Iterable[int]) -> None:
    mine = (candidate_record.c.candidate_id == sa.bindparam("owner")) & (candidate_record.c.kind == Anchor.kind)
    connection.execute(sa.delete(candidate_record).where(mine), [{"owner": owner} for owner in owners])


def _numbers(key: Row, value: float, low: float, high: float) -> Row:
    return {"owner": key["candidate_id"], "moved": key["name"], "now": value, "least": low, "most": high}


def _set(connection: sa.Connection, rows: Sequence[Row]) -> None:
    """Write value and interval into ``quantity`` and ``band``."""
    if not rows:
        return
    now: list[sa.BindParameter[float]] = [sa.bindparam(name) for name in ("now", "least", "most")]
    same = (quantity.c.candidate_id == sa.bindparam("owner")) & (quantity.c.name == sa.bindparam("moved"))
    columns = dict(zip(("value", "low", "high"), now, strict=True))
    connection.execute(sa.update(quantity).where(same).values(columns), rows)
    for name, parts in COLUMNS.items():
        mine = [{key: row[key] for key in row if key != "moved"} for row in rows if row["moved"] == name]
        change = sa.update(band).where(band.c.candidate_id == sa.bindparam("owner"))
        if mine:
            connection.execute(change.values(dict(zip(parts, now, strict=True))), mine)
