"""The commands: exit codes, sentences on stderr, output formats."""

from __future__ import annotations

import io
import json
import re
import subprocess
import sys

import pandas as pd
import pytest
from orchil.cli import run
from orchil.cli.formats import defused
from orchil.cli.tables import cell_text, digits, interval


@pytest.fixture
def orchil(night, monkeypatch, capfdbinary):
    """Runs one command line in the folder of the night; gives (exit code, stdout, stderr)."""
    monkeypatch.chdir(night.folder)

    def call(*arguments: str):
        code = run(list(arguments))
        out, err = capfdbinary.readouterr()
        return code, out, err.decode()

    return call


NAMES = ['=cmd|"x"', "<b>bold</b>", "[red]x[/red]", "a,b", "-7 rows"]


@pytest.fixture
def screened(orchil, night):
    lines = [
        "id,smiles",
        *(f'"{name.replace(chr(34), chr(34) * 2)}",word{"x" * at}' for at, name in enumerate(NAMES)),
    ]
    (night.folder / "list.csv").write_text("\n".join(lines) + "\n")
    (night.folder / "brief.toml").write_text(BRIEF)
    code, out, err = orchil("screen", "list.csv", "--brief", "brief.toml", "--store", "s.db", "--workers", "1")
    assert code == 0, err
    return out.decode(), err


BRIEF = 'title = "Words"\nmedium = "water"\n[[want]]\nquantity = "strength"\nat_least = 5\n'


def test_screen_prints_the_ranking_and_plain_progress(screened):
    out, err = screened
    assert "rank" in out
    assert all(name in out for name in NAMES)
    assert out.index("-7 rows") < out.index("=cmd")
    assert "orchil: 5 candidates to do" in err
    assert re.search(r"orchil: 5 done, 0 failed in [0-9.]+ s", err)


def test_some_failures_give_exit_code_one_and_counts(orchil, night):
    (night.folder / "list.csv").write_text("smiles\nalpha\nraise-1\n")
    (night.folder / "brief.toml").write_text(BRIEF)
    code, _, err = orchil("screen", "list.csv", "-b", "brief.toml", "-s", "s.db", "--workers", "1")
    assert code == 1
    assert "orchil: 1 failed: brew, unexpected" in err


@pytest.mark.parametrize(
    ("arguments", "part"),
    [
        (("screen", "none.csv", "-b", "brief.toml", "-s", "s.db"), "there is no library none.csv"),
        (("screen", "list.csv", "-b", "none.toml", "-s", "s.db"), "there is no brief none.toml"),
        (
            ("screen", "list.csv", "-b", "bad.toml", "-s", "s.db"),
            'bad.toml: want 1: unknown quantity "strenght"',
        ),
        (("screen", "list.csv", "-b", "brief.toml", "-s", "no/where.db"), "folder"),
        (("screen", "list.csv", "-b", "brief.toml", "-s", "s.db", "--workers", "0"), "workers"),
        (("screen", "list.csv"), "brief"),
        (("rank", "none.db", "-b", "brief.toml"), "none.db"),
        (("query", "none.db", "SELECT 1"), "none.db"),
        (("show", "none.db"), "none.db"),
        (("nonsense",), "nonsense"),
    ],
)
def test_wrong_requests_give_exit_code_two_and_a_sentence(orchil, night, arguments, part):
    (night.folder / "list.csv").write_text("smiles\nalpha\n")
    (night.folder / "brief.toml").write_text(BRIEF)
    (night.folder / "bad.toml").write_text(BRIEF.replace("strength", "strenght"))
    code, out, err = orchil(*arguments)
    assert code == 2
    assert part in err
    assert "Traceback" not in err
    assert out == b""


def test_a_store_that_is_no_store(orchil, night):
    (night.folder / "x.db").write_text("some text")
    code, _, err = orchil("show", "x.db")
    assert (code, err.count("\n")) == (2, 1)


def test_no_worker_starts(orchil, night, monkeypatch):
    (night.folder / "list.csv").write_text("smiles\nalpha\n")
    (night.folder / "brief.toml").write_text(BRIEF)
    monkeypatch.setattr("orchil.supervisor.sys.executable", "/bin/false")
    code, _, err = orchil("screen", "list.csv", "-b", "brief.toml", "-s", "s.db")
    assert code == 3
    assert "no worker process starts" in err


def test_query_formats(screened, orchil, night):
    sql = "SELECT candidate, rank, -score AS negative, NULL AS gap FROM ranking"
    code, out, _ = orchil("query", "s.db", sql)
    assert code == 0
    assert "[red]x[/red]" in out.decode()
    code, out, _ = orchil("query", "s.db", sql, "--format", "csv")
    table = pd.read_csv(io.BytesIO(out))
    assert set(table["candidate"]) == {"'" + NAMES[0], *NAMES[1:4], "'" + NAMES[4]}
    assert (table["negative"] < 0).all()
    code, out, _ = orchil("query", "s.db", sql, "--format", "json")
    records = json.loads(out)
    assert {record["candidate"] for record in records} == set(NAMES)
    assert {record["gap"] for record in records} == {None}
    code, out, _ = orchil("query", "s.db", sql, "--format", "parquet", "--output", "out.parquet")
    assert (code, out) == (0, b"")
    assert set(pd.read_parquet(night.folder / "out.parquet")["candidate"]) == set(NAMES)


@pytest.mark.parametrize(
    ("arguments", "part"),
    [
        (("DELETE FROM candidate",), "read"),
        (("SELECT 1 FROM nowhere",), "nowhere"),
        (("SELECT 1", "--format", "xlsx"), "table, csv, json, parquet"),
        (("SELECT 1", "-f", "csv", "-o", "no/where.csv"), "cannot be written"),
    ],
)
def test_wrong_queries(screened, orchil, arguments, part):
    code, _, err = orchil("query", "s.db", *arguments)
    assert code == 2
    assert part in err
    assert "Traceback" not in err


def test_show_the_night_and_one_candidate(screened, orchil):
    code, out, _ = orchil("show", "s.db")
    assert code == 0
    assert "Words: list.csv" in out.decode()
    assert re.search(r"done\s+5", out.decode())
    code, out, _ = orchil("show", "s.db", NAMES[1])
    assert code == 0
    assert "<b>bold</b> (row 2) in water" in out.decode()
    assert "brew" in out.decode()
    code, _, err = orchil("show", "s.db", "nobody")
    assert code == 2
    assert 'no candidate "nobody"' in err


def test_rank_against_another_brief(screened, orchil, night):
    (night.folder / "other.toml").write_text(BRIEF.replace("Words", "Others"))
    code, out, _ = orchil("rank", "s.db", "--brief", "other.toml", "--top", "1")
    assert code == 0
    assert "-7 rows" in out.decode()
    assert "bold" not in out.decode()
    assert "Others" in orchil("show", "s.db")[1].decode()


def test_stages_quantities_and_schemas(orchil, night):
    code, out, _ = orchil("stages")
    assert code == 0
    assert re.search(r"brew\s+1\s+word\s+brew\s+yes", out.decode())
    code, out, _ = orchil("stages", "--quantities")
    assert re.search(r"strength\s+nm\s+length of the word", out.decode())
    code, _, _ = orchil("stages", "--schema", "schemas")
    written = {path.name for path in (night.folder / "schemas").iterdir()}
    assert {"brew.schema.json", "brief.schema.json", "library_row.schema.json"} <= written
    assert json.loads((night.folder / "schemas/brew.schema.json").read_text())["properties"]["strength"]


def test_check(orchil):
    code, out, err = orchil("check")
    assert code == 0
    assert re.search(r"words are words\s+ok\s+they are", out.decode())
    assert err.endswith("ready\n")


def test_help_imports_nothing_heavy():
    heavy = ("numpy", "pandas", "sqlalchemy", "pydantic")
    script = f"import sys, orchil.cli; print([m for m in {heavy} if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (532.44, "532"),
        (41234.5, "41200"),
        (0.01234, "0.0123"),
        (1.0, "1.00"),
        (-2.5, "-2.50"),
        (1e-9, "1.00e-09"),
    ],
)
def test_digits(value, text):
    assert digits(value) == text


def test_interval_and_cells():
    assert interval(532.4, 505.2, 560.8) == "532 (505-561)"
    assert interval(532.4, None, float("nan")) == "532"
    assert interval(None, 1, 2) == ""
    assert cell_text("a\x1b[31mb") == "a\\x1b[31mb"


@pytest.mark.parametrize("text", ["=1", "+1", "-1", "@x", "\tx"])
def test_formulas_are_defused_in_text_only(text):
    assert defused(text) == "'" + text
    assert defused(-1.0) == -1.0
    assert defused("plain") == "plain"
