"""What `orchil show` says of numbers that measurements have moved: how far, and because of whom."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from rich.table import Table

from .tables import NumberText, interval, table

_HEADERS = ["measured dye", "medium", "measured nm", "predicted nm", "similarity", "weight", "shift eV"]

Payloads = Mapping[str, dict[str, Any]]


def band_now(records: Payloads) -> dict[str, Any]:
    """The band with the intervals that hold now; the record itself is as it was predicted."""
    band = dict(records.get("band", {}))
    for change in _changes(records):
        stem = change["quantity"].removesuffix("_max_nm")
        band |= {f"{stem}_low_nm": change["after_low_nm"], f"{stem}_high_nm": change["after_high_nm"]}
    return band


def anchor_tables(records: Payloads) -> Iterator[Table]:
    """For each quantity that moved one table of the measured dyes behind it, the weightiest first."""
    for change in _changes(records):
        made = table(_HEADERS, map(_row, change["anchors"]), title=_title(change))
        if change["further_anchors"]:
            made.caption = f"and {change['further_anchors']} more with smaller weights"
        yield made


def _changes(records: Payloads) -> list[dict[str, Any]]:
    return list(records.get("anchor", {}).get("changes", ()))


def _title(change: Mapping[str, Any]) -> str:
    before, after = (
        interval(*(change[f"{when}{part}_nm"] for part in ("", "_low", "_high"))) for when in ("before", "after")
    )
    return f"{change['quantity']} moved by measured dyes: {before} became {after}"


def _row(dye: Mapping[str, Any]) -> tuple[object, ...]:
    numbers = (f"{dye['similarity']:.2f}", f"{dye['weight']:.2f}", f"{dye['shift_ev']:+.3f}")
    return dye["name"], dye["medium"], dye["measured_nm"], dye["predicted_nm"], *map(NumberText, numbers)
