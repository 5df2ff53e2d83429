"""The page of one candidate: what the engine itself knows of it, beside the panels of plugins."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from orchil_schemas.panel import StructureKit

from orchil.store import CandidatePage, Store

from .night import Night
from .panels import Panels, Section
from .table import Wish, records, rows
from .words import limits, number, percent

RELATIVES = 4
AMONG = 5000
"""Relatives are looked for among so many of the best: a page must not read a whole large library."""


@dataclass(frozen=True)
class WantLine:
    """One want as this candidate meets it."""

    label: str
    wanted: str
    value: str
    probability: str
    loss: str
    strip: dict[str, Any]


@dataclass(frozen=True)
class Relative:
    """A candidate like this one."""

    id: int
    name: str
    similarity: str
    svg: str
    absorption: str


@dataclass(frozen=True)
class Shown:
    """Everything on the page of one candidate."""

    page: CandidatePage
    row: Mapping[str, Any]
    svg: str
    wants: tuple[WantLine, ...]
    numbers: tuple[dict[str, str], ...]
    sections: tuple[Section, ...]
    relatives: tuple[Relative, ...]
    provenance: tuple[dict[str, Any], ...]
    cautions: tuple[str, ...]


class Neighbours:
    """The computed structures of the library, to look for relatives in."""

    def __init__(self, store: Store, kit: StructureKit | None) -> None:
        self._kit = kit
        found = store.query(_STRUCTURES, (AMONG,))
        self._ids: list[int] = found["id"].tolist()
        self._smiles: list[str] = found["smiles"].tolist()

    def of(self, smiles: str | None) -> list[tuple[int, float]]:
        """The most alike with their likeness, most alike first."""
        if not smiles or self._kit is None:
            return []
        found = self._kit.nearest(smiles, self._smiles, RELATIVES)
        return [(self._ids[one.at], one.similarity) for one in found]


_STRUCTURES = """
SELECT c.id, c.smiles FROM candidate c
LEFT JOIN score s ON s.candidate_id = c.id
    AND s.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
WHERE c.status = 'done' AND c.smiles IS NOT NULL AND c.duplicate_of IS NULL
ORDER BY s.rank IS NULL, s.rank, c.row_number LIMIT ?
"""


def read_candidate(store: Store, night: Night, panels: Panels, neighbours: Neighbours, key: int) -> Shown | None:
    """The page of the candidate with this id, None when there is none."""
    page = store.candidate_page(key)
    if page is None:
        return None
    (row,) = rows(store.query, Wish(ids=(key,))).rows
    return Shown(
        page=page,
        row=row,
        svg=panels.drawing(row["smiles"]),
        wants=tuple(_wants(row, night)),
        numbers=tuple(_numbers(row, night)),
        sections=tuple(panels.sections(page, night.screen)),
        relatives=tuple(_relatives(store, panels, neighbours.of(row["smiles"]))),
        provenance=tuple(provenance(store, key)),
        cautions=_cautions(page),
    )


def _wants(row: Mapping[str, Any], night: Night) -> list[WantLine]:
    lines = []
    for want, (probability, loss) in zip(night.screen.brief.want, row["wants"], strict=False):
        quantity = night.quantities[want.quantity]
        value, low, high, text = row["quantities"].get(want.quantity, [None, None, None, ""])
        edges = [None if abs(edge) == float("inf") else edge for edge in want.limits]
        strip = {"value": value, "low": low, "high": high, "from": edges[0], "to": edges[1], "unit": quantity.unit}
        wanted = limits(want, quantity.unit) + (" (must)" if want.must else "")
        shown = f"{text} {quantity.unit}".strip() if text else "not known"
        lines.append(WantLine(quantity.label, wanted, shown, percent(probability), percent(loss), strip))
    return lines


def _numbers(row: Mapping[str, Any], night: Night) -> list[dict[str, str]]:
    held = row["quantities"]
    return [
        {"label": one.label, "value": held[name][3], "unit": one.unit, "meaning": one.meaning}
        for name, one in night.quantities.items()
        if name in held
    ]


def _relatives(store: Store, panels: Panels, found: Sequence[tuple[int, float]]) -> list[Relative]:
    if not found:
        return []
    known = {row["id"]: row for row in rows(store.query, Wish(ids=tuple(key for key, _ in found))).rows}
    return [
        Relative(
            key,
            known[key]["candidate"],
            number(alike),
            panels.drawing(known[key]["smiles"]),
            known[key]["quantities"].get("absorption_max_nm", [0, 0, 0, ""])[3],
        )
        for key, alike in found
    ]


def _cautions(page: CandidatePage) -> tuple[str, ...]:
    """Cautions of every record that has any, each once."""
    found = [caution for payload in page.records.values() for caution in payload.get("cautions", ())]
    return tuple(dict.fromkeys(found))


_PROVENANCE = """
SELECT l.kind, w.stage, w.stage_version AS version, w.settings, a.versions, a.host, a.finished_at, r.digest
FROM candidate_record l
JOIN record r ON r.digest = l.record_digest
LEFT JOIN work w ON w.digest = r.made_by
LEFT JOIN attempt a ON a.id = (SELECT max(id) FROM attempt WHERE work_digest = w.digest AND ok)
WHERE l.candidate_id = ? ORDER BY a.id, l.kind
"""


def provenance(store: Store, key: int) -> list[dict[str, Any]]:
    """Which stage, version, settings and libraries made each record of a candidate."""
    import json

    found = records(store.query(_PROVENANCE, (key,)))
    for one in found:
        settings = json.loads(one["settings"]) if one["settings"] else {}
        settings = json.loads(settings) if isinstance(settings, str) else settings
        versions = json.loads(one["versions"]) if one["versions"] else {}
        one["settings"] = ", ".join(f"{name} = {value}" for name, value in settings.items())
        one["versions"] = ", ".join(f"{name} {value}" for name, value in versions.items())
    return found
