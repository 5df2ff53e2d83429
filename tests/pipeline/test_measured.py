"""Measured columns through the real commands: read, stored, anchored, ranked, shown, changed and taken back."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from orchil import registry as registry_module
from orchil.chain import resolve
from orchil.cli import run
from orchil.errors import RequestError
from orchil.library import read
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.screening import checked_brief
from orchil.store import Store
from orchil_schemas import Anchor, Availability, Brief, LibraryRow, NoSettings, QuantityInfo, Record, Want

PLUGIN = Path(__file__).with_name("measured_plugin.py")
BRIEF = 'title = "red"\nmedium = "ethanol"\n[[want]]\nquantity = "absorption_max_nm"\nbetween = [455, 520]\n'
HEADER = "id,smiles,medium,measured_absorption_max_nm,Measured_Emission_Max_nm"
RELATIVES = {
    "dimethyl": "CN(C)c1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1",
    "diethyl": "CCN(CC)c1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1",
}
STRANGER = "c1ccc2cc3ccccc3cc2c1"


# -- reading the columns


def parsed(tmp_path, text, name="list.csv"):
    (tmp_path / name).write_text(text)
    return list(read(tmp_path / name))


def test_measured_columns_are_read_as_numbers(tmp_path):
    first, second = parsed(tmp_path, f"{HEADER}\na,CC,,532.5,610 nm\nb,CCC,,,\n")
    assert first.measured == {"absorption_max_nm": 532.5, "emission_max_nm": 610.0}
    assert (first.extra, first.error) == ({}, None)
    assert (second.measured, second.error) == ({}, None)
    (comma,) = parsed(tmp_path, "smiles;measured absorption max nm\nCC;532,5\n")
    assert comma.measured == {"absorption_max_nm": 532.5}


@pytest.mark.parametrize("text", ["red", "-500", "0", "99", "5001", "nan", "inf", "530-540", "5e9", "0.53 um"])
def test_a_value_that_is_no_wavelength_is_the_error_of_its_row(tmp_path, text):
    bad, good = parsed(tmp_path, f"smiles,measured_absorption_max_nm\nCC,{text}\nCCC,500\n")
    assert bad.error.startswith(f'measured_absorption_max_nm "{text}" is no wavelength in nm from 100 to 5000')
    assert (bad.measured, good.error) == ({}, None)


def test_data_fields_of_mol_files_are_read_too(tmp_path):
    block = "m\n\n\n  1  0  0  0  0  0  0  0  0  0999 V2000\n    0.0 0.0 0.0 C   0  0\nM  END\n"
    (row,) = parsed(tmp_path, block + "> <MEASURED_ABSORPTION_MAX_NM>\n512\n\n$$$$\n", "list.sdf")
    assert row.measured == {"absorption_max_nm": 512.0}


def test_measured_values_leave_the_physics_alone(tmp_path):
    one, other = parsed(tmp_path, "smiles,measured_absorption_max_nm\nCC,500\nCC,\n")
    assert one.row == other.row


# -- whole screens


class Bench:
    """Commands in a folder of their own; ``runs`` counts how often anything was predicted."""

    def __init__(self, folder: Path, capture) -> None:
        self.folder, self._capture = folder, capture
        (folder / "marks").mkdir(exist_ok=True)
        (folder / "brief.toml").write_text(BRIEF)

    def library(self, dimethyl="473", diethyl="", stranger="", emission="", smiles=STRANGER) -> None:
        cells = [
            f"dimethyl,{RELATIVES['dimethyl']},,{dimethyl},{emission}",
            f"diethyl,{RELATIVES['diethyl']},,{diethyl},",
            f"stranger,{smiles},,{stranger},",
        ]
        (self.folder / "list.csv").write_text("\n".join([HEADER, *cells]) + "\n")

    def __call__(self, *arguments: str):
        code = run(list(arguments))
        out, err = self._capture.readouterr()
        return code, out, err

    def screen(self):
        return self("screen", "list.csv", "--brief", "brief.toml", "--store", "s.db", "--workers", "1")

    def rank(self, *more: str):
        return self("rank", "s.db", "--brief", "brief.toml", *more)

    def query(self, sql: str):
        with Store.open_read_only(self.folder / "s.db") as store:
            rows = store.query(sql).astype(object)
            return rows.where(rows.notna(), None).to_dict("records")

    def ranking(self):
        return {row["candidate"]: row for row in self.query("SELECT * FROM ranking")}

    @property
    def runs(self) -> int:
        return len(list((self.folder / "marks").iterdir()))


@pytest.fixture
def bench(tmp_path, monkeypatch, capfd):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("FAKE_RUNS", str(tmp_path / "marks"))
    monkeypatch.setenv(EXTRA_PLUGINS, str(PLUGIN))
    monkeypatch.setattr(registry_module, "_installed", lambda: iter(()))
    return Bench(tmp_path, capfd)


@pytest.fixture(scope="module")
def once(tmp_path_factory):
    """Filled by the first test that needs a screen; the others take a copy."""
    return tmp_path_factory.mktemp("screened")


@pytest.fixture
def screened(bench, once):
    bench.library()
    if not (once / "s.db").exists():
        code, _, err = bench.screen()
        assert code == 0, err
        assert bench.runs == 3
        shutil.copytree(bench.folder, once, dirs_exist_ok=True)
    shutil.copytree(once, bench.folder, dirs_exist_ok=True)
    return bench


def test_the_ranking_shows_what_measurements_moved_and_what_was_there_before(screened):
    rows = screened.ranking()
    assert rows["dimethyl"]["absorption_max_nm"] == pytest.approx(473, abs=1.5)
    assert rows["dimethyl"]["measured_absorption_max_nm"] == 473
    assert 435 < rows["diethyl"]["absorption_max_nm"] < 470
    assert rows["diethyl"]["unanchored_absorption_max_nm"] == 430
    assert rows["diethyl"]["absorption_high_nm"] - rows["diethyl"]["absorption_low_nm"] < 95
    assert rows["stranger"]["absorption_max_nm"] == 430
    assert rows["stranger"]["unanchored_absorption_max_nm"] is None
    assert [rows[name]["rank"] for name in ("dimethyl", "diethyl", "stranger")] == [1, 2, 3]
    assert {row["emission_max_nm"] for row in rows.values()} == {500.0}


def test_quantities_and_wants_use_the_moved_number(screened):
    found = {
        row["quantity"]: row
        for row in screened.query(
            "SELECT * FROM quantities WHERE candidate = 'diethyl' AND quantity LIKE '%absorption_max%'"
        )
    }
    now = found["absorption_max_nm"]
    assert found["unanchored_absorption_max_nm"]["value"] == 430
    assert (found["unanchored_absorption_max_nm"]["low"], found["unanchored_absorption_max_nm"]["high"]) == (390, 480)
    assert now["low"] < now["value"] < now["high"]
    assert (now["coverage"], now["unit"]) == (0.9, "nm")
    wants = screened.query("SELECT value FROM want_result ORDER BY candidate_id")
    assert wants[1]["value"] == now["value"]
    measured = screened.query("SELECT value FROM quantities WHERE quantity = 'measured_absorption_max_nm'")
    assert measured == [{"value": 473.0}]


def test_show_tells_what_moved_and_because_of_whom(screened):
    code, out, _ = screened("show", "s.db", "diethyl")
    assert code == 0
    assert "absorption_max_nm moved by measured dyes: 430 (390-480) became" in out
    assert "dimethyl" in out
    assert "473" in out
    assert "moved by" not in screened("show", "s.db", "stranger")[1]


def test_new_measurements_are_ranked_without_computing(screened):
    before = screened.ranking()
    screened.library(dimethyl="440", emission="560")
    code, _, err = screened.rank("--library", "list.csv")
    assert code == 0, err
    after = screened.ranking()
    assert after["diethyl"]["absorption_max_nm"] < before["diethyl"]["absorption_max_nm"]
    assert after["diethyl"]["unanchored_absorption_max_nm"] == 430
    assert after["diethyl"]["emission_max_nm"] > 500
    code, out, _ = screened("show", "s.db", "dimethyl")
    assert "560" in out
    assert screened.runs == 3


def test_ranking_twice_does_not_move_twice(screened):
    before = screened.ranking()
    assert screened.rank()[0] == 0
    assert screened.ranking() == before


def test_without_measurements_everything_is_as_predicted(screened):
    screened.library(dimethyl="")
    assert screened.rank("--library", "list.csv")[0] == 0
    rows = screened.ranking().values()
    assert {(row["absorption_max_nm"], row["absorption_low_nm"], row["absorption_high_nm"]) for row in rows} == {
        (430.0, 390.0, 480.0)
    }
    assert {row["unanchored_absorption_max_nm"] for row in rows} == {None}
    assert screened.query("SELECT count(*) AS n FROM candidate_record WHERE kind = 'anchor'") == [{"n": 0}]
    assert "moved by" not in screened("show", "s.db", "diethyl")[1]


def test_a_wild_value_is_cautioned_in_the_ranking(screened):
    screened.library(dimethyl="1900")
    _, _, err = screened.rank("--library", "list.csv")
    assert "standard errors from the predicted 430 nm" in screened.ranking()["dimethyl"]["cautions"]
    assert "standard errors from the predicted 430 nm" in err
    assert screened.ranking()["diethyl"]["cautions"] is None


def test_rank_refuses_a_bad_value_and_another_library(screened):
    before = screened.ranking()
    screened.library(dimethyl="red")
    code, _, err = screened.rank("--library", "list.csv")
    assert code == 2
    assert 'list.csv: row 1 (dimethyl): measured_absorption_max_nm "red" is no wavelength' in err
    screened.library(smiles="CC")
    code, _, err = screened.rank("--library", "list.csv")
    assert (code, "library changed" in err) == (2, True)
    assert screened.ranking() == before


def test_a_bad_value_fails_its_row_until_it_is_corrected(screened):
    screened.library(diethyl="47O")
    code, _, err = screened.screen()
    assert code == 1, err
    row = screened.ranking()["diethyl"]
    assert (row["status"], row["rank"]) == ("failed", None)
    assert row["reason"].startswith('reading: bad_input: measured_absorption_max_nm "47O"')
    screened.library(diethyl="470")
    code, _, err = screened.screen()
    assert code == 0, err
    assert screened.ranking()["diethyl"]["absorption_max_nm"] == pytest.approx(470, abs=2)
    assert screened.runs == 3


def test_anchoring_comes_before_the_ranking(bench):
    brief = bench.folder / "brief.toml"
    chain = checked_brief(brief, Registry.load())[1]
    assert [step.stage.name for step in chain.library_steps] == ["anchor", "score"]
    brief.write_text(BRIEF + "[stage.anchor]\nreading_nm = 0\n")
    with pytest.raises(RequestError, match="reading_nm"):
        checked_brief(brief, Registry.load())


def test_a_quantity_that_is_only_anchored_costs_no_candidate():
    registry = Registry()
    for stage in (made_up("peaks", (LibraryRow,), (Peak,)), made_up("sizes", (LibraryRow,), (Size,)), Moves()):
        registry.add(stage, "test")
    assert registry.problems == []
    steps = resolve(registry, Brief(title="t", want=(Want(quantity="size_nm", at_least=1),))).steps
    assert {step.stage.name: step.essential for step in steps} == {"peaks": False, "sizes": True}


class Peak(Record):
    kind = "peak"
    offers = (QuantityInfo(name="absorption_max_nm", unit="nm", meaning="a peak"),)


class Size(Record):
    kind = "size"
    offers = (QuantityInfo(name="size_nm", unit="nm", meaning="a size"),)


class Common:
    version, Settings, time_limit_seconds = "1", NoSettings, 1.0

    def found(self):
        return Availability(True)


def made_up(name, needs, makes):
    members = {"name": name, "needs": needs, "makes": makes, "run": lambda self, inputs, settings, context: ()}
    return type("MadeUp", (Common,), members)()


class Moves(Common):
    name, makes = "moves", (Anchor,)

    def reads(self, brief, settings):
        return ("absorption_max_nm", "measured_absorption_max_nm")

    def run(self, table, brief, settings):
        return ()
