"""`orchil screen` with the real stages on an ugly file: every row is accounted for, the good ones get numbers."""

from __future__ import annotations

import csv
import subprocess
import sys

import pandas as pd
import pytest
from orchil.store import Store

BRIEF = """title = "ugly file"
medium = "toluene"
[[want]]
quantity = "absorption_max_nm"
between = [300, 700]
"""
CHAIN_OF_300_ATOMS = "C=C" + "CC" * 48 + "C"
ROWS = {
    "good": ("CN(C)c1ccc(/N=N/c2ccccc2)cc1", None),
    "=HYPERLINK(1)": ("C1=CC=CC2=CC=CC=C12", None),
    "<script>alert(1)</script>": ("c1ccc2ccccc2c1", None),
    'quote " comma , and\nline end': ("O=Cc1ccccc1", None),
    "unclosed ring": ("CN(C)c1ccc(cc", "bad_input"),
    "no structure": ("", "bad_input"),
    "five bonds": ("CC(C)(C)(C)C", "bad_input"),
    "radical": ("[CH2]c1ccccc1", "out_of_scope"),
    "copper": ("c1ccccc1O[Cu]Oc1ccccc1", "out_of_scope"),
    "300 atoms": (CHAIN_OF_300_ATOMS + "CC" * 20, "out_of_scope"),
    "nowhere": ("c1ccccc1", "bad_input"),
}
MEDIA = {"nowhere": "unobtainium"}


@pytest.fixture(scope="module")
def ranking(tmp_path_factory: pytest.TempPathFactory) -> pd.DataFrame:
    folder = tmp_path_factory.mktemp("ugly")
    library, brief, store = (folder / name for name in ("list.csv", "brief.toml", "night.db"))
    with library.open("w", encoding="utf-16", newline="") as out:
        writer = csv.writer(out, delimiter=";")
        writer.writerow(("Name", "SMILES", "Solvent", "note"))
        writer.writerows((name, smiles, MEDIA.get(name, ""), "kept") for name, (smiles, _) in ROWS.items())
    brief.write_text(BRIEF, encoding="utf-8")
    command = [sys.executable, "-m", "orchil", "screen", str(library), "--brief", str(brief), "--store", str(store)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 1, done.stderr
    assert "Traceback" not in done.stderr
    with Store.open_read_only(store) as opened:
        return opened.query(
            "SELECT r.*, c.reason_code, c.extra FROM ranking r JOIN candidate c ON c.row_number = r.row_number"
        )


def test_every_row_is_there_once(ranking: pd.DataFrame) -> None:
    assert sorted(ranking["candidate"]) == sorted(ROWS)
    assert ranking["extra"].str.contains("kept").all()


@pytest.mark.parametrize("name", [name for name, (_, code) in ROWS.items() if code])
def test_bad_rows_fail_alone_with_a_typed_reason(name: str, ranking: pd.DataFrame) -> None:
    row = ranking.set_index("candidate").loc[name]
    assert (row["status"], row["reason_code"]) == ("failed", ROWS[name][1])
    assert len(row["reason"]) > 20
    assert pd.isna(row["rank"])


@pytest.mark.parametrize("name", [name for name, (_, code) in ROWS.items() if not code])
def test_good_rows_get_ranked_numbers(name: str, ranking: pd.DataFrame) -> None:
    row = ranking.set_index("candidate").loc[name]
    assert row["status"] == "done"
    assert row["medium"] == "toluene"
    assert row["absorption_low_nm"] < row["absorption_max_nm"] < row["absorption_high_nm"]
    assert row["molar_absorptivity"] > 0
    assert 0 < row["score"] <= 1


def test_two_drawings_of_naphthalene_are_one_species(ranking: pd.DataFrame) -> None:
    rows = ranking.set_index("candidate").loc[["=HYPERLINK(1)", "<script>alert(1)</script>"]]
    first, second = rows["absorption_max_nm"]
    assert first == second
    assert rows["duplicate_of"].notna().sum() == 1


def test_a_donor_on_azobenzene_absorbs_in_the_visible(ranking: pd.DataFrame) -> None:
    """4-(Dimethylamino)azobenzene: 408 nm (methanol), Griffiths et al., Chem. Sci. 2022."""
    found = ranking.set_index("candidate").loc["good", "absorption_max_nm"]
    assert found == pytest.approx(408, abs=45)
