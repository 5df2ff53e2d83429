"""`orchil report`: one HTML file."""

from __future__ import annotations

from pathlib import Path

from orchil.report import ReportRequest, write_report
from orchil.store import Store

from .common import loaded_registry, remark


def run_report(target: str, output: Path, request: ReportRequest) -> None:
    """Write the report and say how large it is."""
    with Store.open_read_only(target) as store:
        size = write_report(store, loaded_registry(), request, output)
    remark([f"{output}: {size / 1e6:.1f} MB, opens in any browser and needs no network"])
