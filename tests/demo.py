"""A small night with everything in it that a reader can meet: picks, failures, twins, two media, hostile names.

Structures and brief are those of the demo library. The names of three rows are what a careless page or sheet would run.
"""

from __future__ import annotations

import csv
import sqlite3
from pathlib import Path

from orchil import cli

ROOT = Path(__file__).parents[1]
SCRIPT = "<script>window.broken = 1</script>"
FORMULA = '=HYPERLINK("http://example.invalid","x")'
IMAGE = '"><img src=x onerror="window.broken = 2">'

_BORROWED = ("OB-001", "OB-009", "OB-022", "OB-049", "OB-064", "OB-065", "OB-067", "OB-077")


def make_demo_store(folder: Path) -> Path:
    """Screen a handful of the demo library for real; returns the store."""
    with (ROOT / "demo_library" / "candidates.csv").open(encoding="utf-8") as file:
        known = {row["id"]: row["smiles"] for row in csv.DictReader(file)}
    rows = [(name, known[name], "", "from the demo library") for name in _BORROWED]
    rows += [
        (SCRIPT, "CN(C)c1ccc(/C=C/c2ccc([N+](=O)[O-])cc2)cc1", "", SCRIPT),
        (FORMULA, "CN(C)c1ccc(/N=N/c2ccc(C#N)cc2)cc1", "", FORMULA),
        (IMAGE, "C1CC", "", "not a structure"),
        ("OB-001", known["OB-001"], "acetonitrile", "the same dye in another medium"),
    ]
    library = folder / "library.csv"
    with library.open("w", newline="", encoding="utf-8") as file:
        csv.writer(file).writerows([("id", "smiles", "medium", "note"), *rows])
    store = folder / "demo.db"
    brief = ROOT / "demo_library" / "green_stop.toml"
    words = ["screen", str(library), "--brief", str(brief), "--store", str(store), "--workers", "1", "--top", "0"]
    assert cli.run(words) == cli.SOME_FAILED
    return store


def multiplied(store: Path, target: Path, count: int) -> Path:
    """A store of ``count`` candidates: copies of those that are done, each with its numbers moved a little."""
    source = sqlite3.connect(store)
    made = sqlite3.connect(target)
    try:
        source.backup(made)
        _multiply(made, count)
        made.commit()
    finally:
        source.close()
        made.close()
    return target


def _multiply(made: sqlite3.Connection, count: int) -> None:
    done = [row[0] for row in made.execute("SELECT id FROM candidate WHERE status = 'done' ORDER BY id")]
    (last,) = made.execute("SELECT max(id) FROM candidate").fetchone()
    made.execute("CREATE TEMP TABLE copy (old INTEGER, new INTEGER)")
    pairs = [(done[at % len(done)], last + 1 + at) for at in range(count - last)]
    made.executemany("INSERT INTO copy VALUES (?, ?)", pairs)
    made.execute("CREATE INDEX temp.copy_old ON copy (old)")
    for table, changes in _CHANGES.items():
        columns = [row[1] for row in made.execute(f"PRAGMA table_info({table})")]
        picked = ", ".join(changes.get(name, f't."{name}"') for name in columns)
        key = "id" if table == "candidate" else "candidate_id"
        made.execute(f"INSERT INTO {table} SELECT {picked} FROM {table} t JOIN copy c ON c.old = t.{key}")


_NEW = {"candidate_id": "c.new"}
_CHANGES: dict[str, dict[str, str]] = {
    "candidate": {"id": "c.new", "row_number": "c.new", "name": "'copy ' || c.new", "duplicate_of": "NULL"},
    "candidate_record": _NEW,
    "quantity": _NEW | {"value": "t.value * (0.8 + 0.4 * (c.new * 7919 % 997) / 997.0)"},
    "band": _NEW,
    "score": _NEW | {"rank": "c.new", "pick": "NULL", "score": "t.score * (c.new * 7919 % 997) / 997.0"},
    "want_result": _NEW,
}
