"""A person's SQL can read and nothing else."""

from __future__ import annotations

import hashlib
import sqlite3

import pandas as pd
import pytest
from orchil.store import Store, StoreError

WRITES = [
    "INSERT INTO candidate (row_number, name) VALUES (9, 'x')",
    "UPDATE candidate SET name = 'x'",
    "DELETE FROM candidate",
    "DROP TABLE candidate",
    "CREATE TABLE t (x)",
    "CREATE TEMP TABLE t (x)",
    "CREATE VIEW v AS SELECT 1",
    "ALTER TABLE candidate RENAME TO c",
    "WITH x AS (SELECT 1) INSERT INTO candidate (row_number) SELECT * FROM x",
    "INSERT INTO candidate (row_number) VALUES (9) RETURNING *",
    "REPLACE INTO band (candidate_id) VALUES (1)",
    "ATTACH DATABASE '{other}' AS other",
    "ATTACH DATABASE ':memory:' AS other",
    "DETACH DATABASE main",
    "VACUUM",
    "VACUUM INTO '{other}'",
    "REINDEX",
    "ANALYZE",
    "BEGIN IMMEDIATE",
    "SAVEPOINT s",
    "PRAGMA query_only = OFF",
    "PRAGMA writable_schema = ON",
    "PRAGMA journal_mode = DELETE",
    "PRAGMA user_version = 7",
    "PRAGMA wal_checkpoint",
    "SELECT load_extension('libm.so')",
    "SELECT LOAD_EXTENSION('libm.so', 'x')",
    "EXPLAIN DELETE FROM candidate",
]


@pytest.mark.parametrize("sql", WRITES)
def test_nothing_can_be_written(filled, path, tmp_path, sql):
    other = tmp_path / "other.db"
    filled.close()  # folds the log into the file, whose bytes then tell everything
    before = hashlib.sha256(path.read_bytes()).hexdigest()
    with Store.open_read_only(path) as store, pytest.raises(StoreError, match=r"only read|cannot run"):
        store.query(sql.format(other=other))
    assert hashlib.sha256(path.read_bytes()).hexdigest() == before
    assert not other.exists()


@pytest.mark.parametrize("sql", [sql for sql in WRITES if "load_ext" not in sql.lower()])
def test_each_refusal_is_of_something_sqlite_would_do(sql, filled, tmp_path):
    """Otherwise a slip of the pen would pass for a lock: on an open connection each of these parses."""
    raw = sqlite3.connect(filled.location.path, isolation_level=None)
    try:
        raw.execute(f"EXPLAIN {sql.format(other=tmp_path / 'o.db').removeprefix('EXPLAIN ')}")
    finally:
        raw.close()


@pytest.mark.parametrize("sql", ["SELECT 1; DELETE FROM candidate", "SELECT 1; SELECT 2"])
def test_one_statement_only(filled, sql):
    with pytest.raises(StoreError, match="one statement"):
        filled.query(sql)
    assert len(filled.candidates()) == 3


@pytest.mark.parametrize(
    ("sql", "said"),
    [
        ("", "no rows"),
        ("-- nothing", "no rows"),
        ("SELEC 1", "syntax error"),
        ("SELECT lambda FROM ranking", "no such column: lambda"),
        ("SELECT * FROM rankings", "no such table: rankings"),
        ("SELECT 1\0; DELETE FROM candidate", "cannot run"),
        ("SELECT ?", "cannot run"),
    ],
)
def test_mistakes_are_said_plainly(filled, sql, said):
    with pytest.raises(StoreError, match=said):
        filled.query(sql)


def test_rows_with_parameters_and_types(filled):
    found = filled.query("SELECT candidate, rank, score FROM ranking WHERE status IN (?, ?)", ("done", "failed"))
    assert found["candidate"].tolist() == ["dye-1", "dye-2"]
    assert found["rank"].dtype == "Int64"
    assert found["rank"].tolist() == [1, pd.NA]
    assert found["score"].dtype == "float64"
    assert filled.query("SELECT :n AS n", {"n": 3})["n"].tolist() == [3]


def test_an_empty_answer_keeps_its_columns(filled):
    found = filled.query("SELECT candidate, rank FROM ranking WHERE rank > 99")
    assert list(found.columns) == ["candidate", "rank"]
    assert len(found) == 0


def test_everything_a_reader_needs_is_allowed(filled):
    assert filled.query("VALUES (1), (2)").shape == (2, 1)
    numbers = "WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n LIMIT 4) SELECT sum(i) AS s FROM n"
    assert filled.query(numbers)["s"].tolist() == [10]
    assert "rank" in filled.query("SELECT name FROM pragma_table_info('ranking')")["name"].tolist()
    versions = filled.query("SELECT key, value FROM screen, json_each(screen.versions)")
    assert versions.to_numpy().tolist() == [["orchil", "0.1"]]
    assert filled.query("SELECT json_extract(brief, '$.title') AS t FROM screen")["t"].tolist() == ["Green stop"]
    window = "SELECT candidate, row_number() OVER (ORDER BY candidate DESC) AS n FROM ranking"
    assert filled.query(window)["n"].tolist() == [1, 2, 3]
    assert list(filled.query("SELECT 1 AS a, 2 AS a").columns) == ["a", "a"]
