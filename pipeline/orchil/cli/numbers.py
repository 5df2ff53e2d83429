"""Every number of one candidate, and where each came from."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from rich.table import Table

from orchil.registry import Registry
from orchil.report.candidate import provenance
from orchil.report.words import NOISE
from orchil.store import CandidatePage, Store

from .tables import NumberText, digits, missing, table

_QUANTITIES = "SELECT name, value, low, high, unit FROM quantity WHERE candidate_id = ? ORDER BY name"


def number_tables(store: Store, page: CandidatePage, registry: Registry) -> Iterable[Table]:
    """All quantities with intervals and the stage that made them; all records with settings and libraries."""
    made = provenance(store, page.candidate.id)
    by_kind = {one["kind"]: f"{one['stage']} {one['version']}" for one in made if one["stage"]}
    found = store.query(_QUANTITIES, (page.candidate.id,)).to_dict("records")
    if found:
        kinds = _kind_of_quantity(registry)
        rows = [(one["name"], _span(one), one["unit"], by_kind.get(kinds.get(one["name"], ""), "")) for one in found]
        yield table(["quantity", "value", "unit", "made by"], rows, title="all numbers")
    if made:
        records = [(one["kind"], by_kind.get(one["kind"], ""), one["settings"], one["versions"]) for one in made]
        yield table(["record", "made by", "settings", "with"], records, title="where they come from")


def _kind_of_quantity(registry: Registry) -> dict[str, str]:
    kinds = [kind for stage in registry.stages.values() for kind in stage.makes]
    return {info.name: kind.kind for kind in kinds for info in kind.offers}


def _span(one: Mapping[Any, Any]) -> NumberText:
    """``531 (484-590)``, three digits each; only a number without an interval can be noise around zero."""
    value, low, high = (one[key] for key in ("value", "low", "high"))
    if missing(low) or missing(high):
        return NumberText(digits(0.0 if abs(value) < NOISE else value))
    return NumberText(f"{digits(value)} ({digits(low)}-{digits(high)})")
