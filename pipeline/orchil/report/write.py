"""Writes the report of a night."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from orchil.errors import RequestError
from orchil.registry import Registry
from orchil.store import Store

from .candidate import Neighbours, Shown, read_candidate
from .charts import library
from .night import Night, read_night
from .page import environment, inline_script, page_data, script, style
from .panels import Panels
from .table import Rows, Wish, rows


@dataclass(frozen=True)
class ReportRequest:
    """How many of the best stand in the table, and names or ids of candidates that get a page beside the picks."""

    rows: int = 500
    also: Sequence[str] = ()


def write_report(store: Store, registry: Registry, request: ReportRequest, path: Path) -> int:
    """Write the file; returns its size in bytes. :class:`RequestError` where it cannot be written."""
    content = report_html(store, registry, request).encode()
    try:
        path.write_bytes(content)
    except OSError as error:
        raise RequestError(f"{path} cannot be written: {error.strerror}") from error
    return len(content)


def report_html(store: Store, registry: Registry, request: ReportRequest) -> str:
    """The report as one HTML text."""
    night = read_night(store, registry)
    panels = Panels(registry)
    found = rows(store.query, Wish(count=request.rows))
    pages = _pages(store, night, panels, Neighbours(store, registry.offers.structures), request)
    table = [row | {"svg": panels.drawing(row["smiles"])} for row in found.rows]
    data = page_data(night, mode="file", rows=table, total=found.total, pages=[one.row["id"] for one in pages])
    return (
        environment()
        .get_template("report.html")
        .render(
            night=night,
            picks=pages,
            note=_note(found, request),
            link="#candidate-{}".format,
            data=data,
            css=style(),
            js=script(),
            library=inline_script(library()),
        )
    )


def _pages(store: Store, night: Night, panels: Panels, neighbours: Neighbours, request: ReportRequest) -> list[Shown]:
    picked = rows(store.query, Wish(only="picked", sort="pick", count=10_000)).rows
    keys = [row["id"] for row in picked] + [_key(store, name) for name in request.also]
    made = (read_candidate(store, night, panels, neighbours, key) for key in dict.fromkeys(keys))
    return [one for one in made if one is not None]


def _key(store: Store, name: str) -> int:
    found = store.candidate_page(name)
    if found is None:
        raise RequestError(f'there is no candidate "{name}" in this store')
    return found.candidate.id


def _note(found: Rows, request: ReportRequest) -> str:
    if found.total <= request.rows:
        return ""
    return f"The table and the plot hold the best {request.rows} of {found.total} candidates; the funnel counts all."
