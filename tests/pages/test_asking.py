"""The manual's ten questions, the formats, the Python interface: asked of a small real night."""

from __future__ import annotations

import csv
import json
import re
import shlex
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from orchil import cli
from orchil.api import Night
from orchil.questions import questions
from rdkit import Chem

from ..demo import FORMULA, SCRIPT

README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
TEN = re.findall(r"^\| \d+ \| (.+?\?) \| `(orchil query .+?)` \|$", README, flags=re.MULTILINE)


@pytest.fixture(scope="module")
def night(demo_store):
    with Night(demo_store) as opened:
        yield opened


def run(capfd, *words):
    code = cli.run(list(words))
    out, err = capfd.readouterr()
    return code, out, err


def test_the_manual_has_ten_questions_and_all_ready_made_ones():
    assert len(TEN) == 10
    for name in questions():
        assert f"`{name}`" in README or f"--ask {name} " in README or f"--ask {name}`" in README, name


@pytest.mark.parametrize(("question", "command"), TEN, ids=[str(at) for at in range(1, len(TEN) + 1)])
def test_each_is_answered(question, command, demo_store, capfd):
    words = shlex.split(command.replace("\\|", "|"))
    words[words.index("night.db")] = str(demo_store)
    code, out, err = run(capfd, *words[1:], "--format", "csv")
    assert code == 0, err
    answer = list(csv.DictReader(out.splitlines()))
    assert answer, f"no row answers: {question}"


# Answers that can be told beforehand


def test_picks_come_from_the_top(night):
    picks = night.ask("picks")
    assert picks["pick"].tolist() == list(range(1, len(picks) + 1))
    assert picks["rank"].is_monotonic_increasing


def test_the_failed_row_is_named(night):
    (row,) = night.ask("failures").to_dict("records")
    assert (row["failed_stage"], row["candidates"]) == ("intake", 1)


def test_the_twin_and_the_two_media(night):
    assert night.ask("twins")[["candidate", "duplicate_of"]].to_numpy().tolist() == [["OB-067", "OB-064"]]
    (pair,) = night.ask("media").to_dict("records")
    assert {pair["one"], pair["other"]} == {"polyethylene", "acetonitrile"}
    assert pair["shift_nm"] == pytest.approx(pair["other_nm"] - pair["one_nm"])


def test_groups_agree_with_another_reading_of_the_structures(night):
    """The same pattern through RDKit's own Python interface."""
    nitro = Chem.MolFromSmarts("[N+](=O)[O-]")
    ranking = night.ranking().dropna(subset="smiles")
    expected = {
        name
        for name, smiles in zip(ranking["candidate"], ranking["smiles"], strict=True)
        if Chem.MolFromSmiles(smiles).HasSubstructMatch(nitro)
    }
    found = night.ask("with", smarts="[N+](=O)[O-]")
    assert set(found["candidate"]) == expected
    assert SCRIPT in expected


def test_the_most_alike_is_the_thing_itself(night):
    found = night.ask("like", smiles="CN(C)c1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1", count=3)
    assert found["candidate"].tolist()[0] == "OB-001"
    assert found["similarity"].tolist()[0] == 1.0
    assert len(found) == 3


def test_all_ready_made_questions_run(night):
    for name in questions():
        assert len(night.ask(name).columns), name


# Formats


def test_names_that_are_formulas_are_defused_in_csv_and_kept_elsewhere(demo_store, capfd, tmp_path):
    sql = "SELECT candidate, smiles FROM ranking"
    code, out, _ = run(capfd, "query", str(demo_store), sql, "--format", "csv")
    cells = [row["candidate"] for row in csv.DictReader(out.splitlines())]
    assert code == 0
    assert "'" + FORMULA in cells
    assert not any(cell.startswith(("=", "+", "-", "@")) for cell in cells)
    _, out, _ = run(capfd, "query", str(demo_store), sql, "--format", "json")
    assert FORMULA in [row["candidate"] for row in json.loads(out)]
    path = tmp_path / "out.parquet"
    run(capfd, "query", str(demo_store), sql, "-f", "parquet", "-o", str(path))
    assert FORMULA in pd.read_parquet(path)["candidate"].tolist()


def test_sdf_holds_every_structure_and_says_what_it_left_out(demo_store, night, capfd, tmp_path):
    path = tmp_path / "out.sdf"
    code, _, err = run(capfd, "query", str(demo_store), "SELECT * FROM ranking", "-f", "sdf", "-o", str(path))
    assert (code, "1 rows left out" in err) == (0, True)
    expected = night.ranking().dropna(subset="smiles")
    read = list(Chem.SDMolSupplier(str(path)))
    assert [Chem.MolToSmiles(one) for one in read] == [Chem.CanonSmiles(smiles) for smiles in expected["smiles"]]
    assert float(read[0].GetProp("absorption_max_nm")) == pytest.approx(expected["absorption_max_nm"].iloc[0])


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--ask", "nothing"], "there is no question"),
        (["SELECT 1", "--ask", "picks"], "not both"),
        (["SELECT 1", "--set", "a=1"], "--set goes with --ask"),
        (["--ask", "picks", "--set", "best"], "is not NAME=VALUE"),
        (["--ask", "with", "--set", "smarts=[["], "is no SMARTS pattern"),
        (["SELECT 1", "-f", "sdf"], "name one with --output"),
        (["SELECT 1 AS a", "-f", "sdf", "-o", "x.sdf"], "needs a column named smiles"),
        (["SELECT 1", "-f", "xlsx"], "table, csv, json, parquet, sdf"),
    ],
)
def test_wrong_requests_say_what_would_be_right(words, said, demo_store, capfd, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    code, _, err = run(capfd, "query", str(demo_store), *words)
    assert code == cli.WRONG_REQUEST
    assert said in err


def test_without_a_question_the_questions_are_listed(demo_store, capfd):
    code, out, _ = run(capfd, "query", str(demo_store))
    assert code == 0
    assert all(name in out for name in questions())


# Python


def test_quantities_are_wide_and_agree_with_the_ranking(night):
    wide = night.quantities()
    ranking = night.ranking().set_index("row_number").loc[wide.index]
    assert wide["absorption_max_nm"].to_numpy() == pytest.approx(ranking["absorption_max_nm"].to_numpy(dtype=float))
    assert wide["absorption_max_nm_low"].to_numpy() == pytest.approx(ranking["absorption_low_nm"].to_numpy(dtype=float))
    assert (wide["absorption_max_nm_low"] < wide["absorption_max_nm_high"]).all()


def test_records_and_pages(night):
    bands = night.records("band")
    assert len(bands) == len(night.quantities())
    assert night.candidate("OB-049").row["absorption_max_nm"] == pytest.approx(
        bands[night.candidate("OB-049").candidate.row_number]["absorption_max_nm"]
    )
    with pytest.raises(KeyError):
        night.candidate("nobody")
    assert night.screen is not None
    assert "similarity" in night.functions


def test_the_example_of_the_manual_runs(demo_store, tmp_path, monkeypatch):
    (code,) = [block for block in re.findall(r"^```python\n(.*?)^```$", README, flags=re.M | re.S) if "Night(" in block]
    monkeypatch.chdir(tmp_path)
    (tmp_path / "night.db").symlink_to(demo_store)
    names: dict[str, object] = {}
    exec(compile(code, "README.md", "exec"), names)
    assert isinstance(names["sure"], pd.DataFrame)
    assert np.isfinite(names["rank_correlation"])
