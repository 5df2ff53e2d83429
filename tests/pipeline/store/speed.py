"""Print CPU seconds of the store on made-up rows: ``python tests/pipeline/store/speed.py 100000``."""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from orchil.store import CandidateRow, Store
from orchil_schemas import Brief, Score, Want, WantResult

NAMES = (
    "absorption_max_nm",
    "molar_absorptivity",
    "oscillator_strength",
    "long_axis_angle_deg",
    "emission_max_nm",
)
BAND = """
INSERT INTO band SELECT id, 1, 1, 1, 0.9, 350 + (id * 7919 % 400000) / 1000.0, 340, 900, 500, 500,
    id % 90000, 1, 2, 0.3, 0.5, 10, id % 90, 1, NULL, NULL, NULL, 'inside', NULL FROM candidate
"""
QUANTITY = "INSERT INTO quantity SELECT ?, id, id * 1.5, id * 1.0, id * 2.0, 0.9, 'nm' FROM candidate"
QUERIES = (
    "SELECT * FROM ranking LIMIT 10",
    "SELECT * FROM ranking WHERE rank <= 10",
    "SELECT * FROM ranking WHERE pick IS NOT NULL",
    "SELECT * FROM ranking WHERE absorption_max_nm BETWEEN 500 AND 501",
    "SELECT candidate FROM ranking ORDER BY molar_absorptivity DESC LIMIT 10",
    "SELECT * FROM ranking WHERE candidate = 'dye-77'",
    "SELECT count(*) AS n FROM ranking WHERE status = 'failed'",
)


@contextmanager
def timed(what: str) -> Iterator[None]:
    """Print the CPU seconds of the block."""
    start = time.process_time()
    yield
    print(f"{time.process_time() - start:8.3f} s  {what}")


def main(count: int, folder: Path) -> None:
    """Fill a store with ``count`` candidates and time what is done with it."""
    with Store.open(folder / "speed.db", create=True) as store:
        rows = [CandidateRow(n, f"dye-{n}", "C=C", medium="toluene", extra={"batch": "A"}) for n in range(1, count + 1)]
        with timed("add_candidates"):
            store.add_candidates(rows)
        with timed("add_candidates, all there already"):
            store.add_candidates(rows)
        _fill(store)
        with timed(f"library_table of {len(NAMES)} quantities"):
            store.library_table(NAMES)
        brief = Brief(title="speed", want=(Want(quantity=NAMES[0], at_least=500),))
        screen = store.begin_screen(library="speed.csv", brief=brief, versions={})
        scores = list(_scores(count))
        for again in ("first", "again"):
            with timed(f"put_library_records of scores with 3 wants, {again}"):
                store.put_library_records(screen, scores)
        for query in QUERIES:
            with timed(query):
                store.query(query)


def _fill(store: Store) -> None:
    with store._writing() as connection:
        connection.exec_driver_sql("UPDATE candidate SET status = 'done', smiles = 'C=C' WHERE id % 50 > 0")
        connection.exec_driver_sql(BAND)
        for name in NAMES:
            connection.exec_driver_sql(QUANTITY, (name,))


def _scores(count: int) -> Iterator[tuple[int, Score]]:
    wants = tuple(
        WantResult(quantity=name, value=1.0, probability=0.8, weight=2.0, contribution=0.2) for name in NAMES[:3]
    )
    for n in range(1, count + 1):
        pick = n if n <= 10 else None
        yield n, Score(rank=n, score=0.5, hit_probability=0.2, pareto_front=1, pick=pick, wants=wants)


if __name__ == "__main__":
    with tempfile.TemporaryDirectory() as made:
        main(int(sys.argv[1]), Path(made))
