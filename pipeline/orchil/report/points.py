"""Points of the plot of two quantities."""

from __future__ import annotations

from typing import Any

from .table import Ask, records
from .words import number

MOST = 3000
"""More points than this say no more to an eye: the best are shown."""

_SQL = """
SELECT c.id, c.name AS candidate, s.rank, s.pick, s.pareto_front,
    a.value AS x, a.low AS x_low, a.high AS x_high, b.value AS y, b.low AS y_low, b.high AS y_high
FROM score s
JOIN candidate c ON c.id = s.candidate_id AND c.status = 'done'
JOIN quantity a ON a.candidate_id = c.id AND a.name = ?
JOIN quantity b ON b.candidate_id = c.id AND b.name = ?
WHERE s.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
ORDER BY s.rank LIMIT ?
"""


def points(ask: Ask, x: str, y: str) -> list[dict[str, Any]]:
    """The best candidates that have both quantities, best first."""
    return [
        {
            "id": row["id"],
            "candidate": row["candidate"],
            "rank": row["rank"],
            "x": row["x"],
            "y": row["y"],
            "xText": number(row["x"], row["x_low"], row["x_high"]),
            "yText": number(row["y"], row["y_low"], row["y_high"]),
            "kind": kind(row),
        }
        for row in records(ask(_SQL, (x, y, MOST)))
    ]


def kind(row: dict[str, Any]) -> str:
    """The group of a point."""
    if row["pick"] is not None:
        return "picked"
    return "Pareto front 1" if row["pareto_front"] == 1 else "other"
