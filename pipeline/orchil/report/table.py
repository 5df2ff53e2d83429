"""Rows of the table of candidates: filtered, sorted and paged in the database, formatted once for every reader."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import pandas as pd

from .words import number, percent

Ask = Callable[[str, Sequence[Any]], pd.DataFrame]
"""Runs one SELECT with parameters."""

FIXED = {
    "rank": "s.rank",
    "pick": "s.pick",
    "candidate": "c.name",
    "medium": "coalesce(c.medium_used, c.medium)",
    "status": "c.status",
    "score": "s.score",
    "hit_probability": "s.hit_probability",
    "pareto_front": "s.pareto_front",
    "row_number": "c.row_number",
}
"""Columns that every store has, by the expression to sort them with."""

_FROM = """
FROM candidate c
LEFT JOIN score s ON s.candidate_id = c.id AND c.status = 'done'
    AND s.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
"""
_TEXTS = ("c.name", "c.smiles", "c.structure", "c.medium_used", "c.medium", "c.cautions", "c.reason")


@dataclass(frozen=True)
class Range:
    """Only candidates whose quantity lies between the two; None leaves a side open."""

    quantity: str
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True)
class Wish:
    """Which rows, in which order: ``only`` is a status, "picked" or empty; ``sort`` a fixed column or a quantity."""

    text: str = ""
    only: str = ""
    ranges: tuple[Range, ...] = ()
    sort: str = "rank"
    descending: bool = False
    start: int = 0
    count: int = 50
    ids: tuple[int, ...] | None = None


@dataclass(frozen=True)
class Rows:
    """One page of rows as plain data, and how many there are on all pages."""

    rows: list[dict[str, Any]]
    total: int


def rows(ask: Ask, wish: Wish) -> Rows:
    """The rows of a page: a quantity is ``[value, low, high, text]``; missing values are None."""
    condition, values = _where(wish)
    counted = _FROM if "s." in condition else "FROM candidate c"
    total = int(ask(f"SELECT count(*) AS n {counted} {condition}", values)["n"][0])
    order, extra, extra_values = _order(wish)
    sql = f"SELECT c.id {_FROM} {extra} {condition} ORDER BY {order} LIMIT ? OFFSET ?"
    ids = ask(sql, [*extra_values, *values, wish.count, wish.start])["id"].tolist()
    return Rows(_filled(ask, [int(one) for one in ids]), total)


def _where(wish: Wish) -> tuple[str, list[Any]]:
    parts: list[str] = []
    values: list[Any] = []
    for word in wish.text.split():
        like = "%" + word.replace("!", "!!").replace("%", "!%").replace("_", "!_") + "%"
        parts.append("(" + " OR ".join(f"{column} LIKE ? ESCAPE '!'" for column in _TEXTS) + ")")
        values += [like] * len(_TEXTS)
    if wish.only == "picked":
        parts.append("s.pick IS NOT NULL")
    elif wish.only:
        parts.append("c.status = ?")
        values.append(wish.only)
    for one in wish.ranges:
        sides = [f"q.value {sign} ?" for sign, side in ((">=", one.low), ("<=", one.high)) if side is not None]
        inside = " AND ".join(["q.name = ?", *sides])
        parts.append(f"c.id IN (SELECT q.candidate_id FROM quantity q WHERE {inside})")
        values += [one.quantity, *(side for side in (one.low, one.high) if side is not None)]
    if wish.ids is not None:
        parts.append(f"c.id IN ({', '.join('?' * len(wish.ids))})")
        values += wish.ids
    return ("WHERE " + " AND ".join(parts) if parts else ""), values


def _order(wish: Wish) -> tuple[str, str, list[Any]]:
    """Order, a join it needs and the values of that join; what is missing comes last either way."""
    way = "DESC" if wish.descending else "ASC"
    if wish.sort in FIXED:
        key, join, values = FIXED[wish.sort], "", []
    else:
        key, values = "o.value", [wish.sort]
        join = "LEFT JOIN quantity o ON o.candidate_id = c.id AND o.name = ?"
    return f"{key} IS NULL, {key} {way}, s.rank IS NULL, s.rank, c.row_number", join, values


_FIELDS = """
SELECT c.id, c.name AS candidate, c.row_number, c.smiles, coalesce(c.medium_used, c.medium) AS medium, c.status,
    CASE WHEN c.status = 'failed' THEN
        coalesce(c.failed_stage || ': ', '') || coalesce(c.reason_code || ': ', '') || coalesce(c.reason, '')
    END AS reason,
    s.rank, s.score, s.hit_probability, s.pareto_front, s.pick, b.trust,
    coalesce(c.cautions || '; ' || b.cautions, c.cautions, b.cautions) AS cautions, d.name AS duplicate_of
"""


def _filled(ask: Ask, ids: Sequence[int]) -> list[dict[str, Any]]:
    made: dict[int, dict[str, Any]] = {}
    for chunk in (ids[at : at + 500] for at in range(0, len(ids), 500)):
        marks = ", ".join("?" * len(chunk))
        joins = "LEFT JOIN band b ON b.candidate_id = c.id LEFT JOIN candidate d ON d.id = c.duplicate_of"
        found = records(ask(f"{_FIELDS} {_FROM} {joins} WHERE c.id IN ({marks})", chunk))
        made |= {row["id"]: row | {"quantities": {}, "wants": []} for row in found}
        quantities = f"SELECT candidate_id, name, value, low, high FROM quantity WHERE candidate_id IN ({marks})"
        for one in records(ask(quantities, chunk)):
            value, low, high = one["value"], one["low"], one["high"]
            made[one["candidate_id"]]["quantities"][one["name"]] = [
                *map(_short, (value, low, high)),
                number(value, low, high),
            ]
        for one in records(ask(_WANTS.format(marks=marks), chunk)):
            made[one["candidate_id"]]["wants"].append([_short(one["probability"]), _short(one["contribution"])])
    for row in made.values():
        row["score_text"] = "" if row["score"] is None else f"{row['score']:.2f}"
        row["hit_text"] = percent(row["hit_probability"])
    return [made[one] for one in ids]


_WANTS = """
SELECT candidate_id, probability, contribution FROM want_result
WHERE candidate_id IN ({marks}) AND screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
ORDER BY candidate_id, position
"""


def records(found: pd.DataFrame) -> list[dict[str, Any]]:
    """Rows as dictionaries of plain Python values with None for what is missing."""
    plain = found.astype(object)
    return plain.where(plain.notna(), None).to_dict("records")  # type: ignore[return-value]


def _short(value: float | None) -> float | None:
    """Six digits are more than any number here has."""
    return None if value is None else float(f"{value:.6g}")
