"""How long the pages of a large night take: ``python tests/bench/pages.py STORE [CANDIDATES]``.

STORE is any finished night; it is copied and its candidates multiplied, 100,000 of them where no number is given.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

from orchil.registry import Registry
from orchil.report import ReportRequest, report_html
from orchil.report.night import read_night
from orchil.report.panels import Panels
from orchil.report.points import points
from orchil.report.table import Range, Wish, rows
from orchil.store import Store

sys.path.insert(0, str(Path(__file__).parents[2]))
from tests.demo import multiplied

WISHES = {
    "first page by rank": Wish(count=25),
    "page 2000 by rank": Wish(count=25, start=50_000),
    "sorted by absorption maximum": Wish(count=25, sort="absorption_max_nm", descending=True),
    "a window of 5 nm": Wish(count=25, ranges=(Range("absorption_max_nm", 500, 505),)),
    "a word": Wish(count=25, text="polyethylene"),
}


def main(store: str, count: int) -> None:
    """Print seconds of the clock and of the processor."""
    with tempfile.TemporaryDirectory() as folder:
        large = multiplied(Path(store), Path(folder) / "large.db", count)
        registry = Registry.load()
        panels = Panels(registry)
        with Store.open_read_only(large) as opened:
            panels.drawing("c1ccccc1")
            read_night(opened, registry)
            for name, wish in WISHES.items():
                timed(name, lambda wish=wish: [panels.drawing(r["smiles"]) for r in rows(opened.query, wish).rows])
            timed("points of the plot", lambda: points(opened.query, "absorption_max_nm", "molar_absorptivity"))
            timed("brief and funnel", lambda: read_night(opened, registry))
            timed("report of 500 rows", lambda: report_html(opened, registry, ReportRequest()))


def timed(name: str, action: object) -> None:
    """Run and print."""
    clock, processor = time.perf_counter(), time.process_time()
    action()
    print(f"{name:32s} {time.perf_counter() - clock:8.3f} s {time.process_time() - processor:8.3f} s of the processor")


if __name__ == "__main__":
    main(sys.argv[1], int(sys.argv[2]) if len(sys.argv) > 2 else 100_000)
