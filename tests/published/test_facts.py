"""The tables of published facts are well formed: structures, sources, units and duplicates."""

from __future__ import annotations

import re

import numpy as np
import pandas as pd
import pytest
from orchil_schemas import HC_EV_NM
from rdkit import Chem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from .facts import FOLDER, SERIES, TABLES, series, table

# Crossref: "DOIs and matching regular expressions", the pattern that covers nearly all DOIs in use
DOI = re.compile(r"^10\.\d{4,9}/[-._;()/:A-Za-z0-9\[\]<>+]+$")
LEAST_MAXIMA, MOST_MAXIMA, LEAST_FAMILIES = 130, 200, 12


@pytest.mark.parametrize("name", TABLES)
def test_structures_parse_to_themselves(name: str) -> None:
    for smiles in table(name)["smiles"].unique():
        molecule = Chem.MolFromSmiles(smiles)
        assert molecule is not None, smiles
        again = Chem.MolFromSmiles(Chem.MolToSmiles(molecule))
        assert CalcMolFormula(again) == CalcMolFormula(molecule), smiles
        assert len(Chem.GetMolFrags(molecule)) == 1, smiles
        assert not any(atom.GetNumRadicalElectrons() for atom in molecule.GetAtoms()), smiles


@pytest.mark.parametrize("name", TABLES)
def test_every_row_has_a_source(name: str) -> None:
    frame = table(name)
    column = "doi" if "doi" in frame else "source"
    if name != "quest_singlets":  # one source for all of it, in the README of the folder
        assert frame[column].notna().all()
        assert (frame[column].str.len() > 7).all()
    for doi in frame.get("doi", pd.Series(dtype=str)):
        assert DOI.match(doi), doi


def test_readme_names_every_table() -> None:
    text = (FOLDER / "README.md").read_text(encoding="utf-8")
    assert all(f"`{name}.csv`" in text for name in TABLES)
    assert {path.stem for path in FOLDER.glob("*.csv")} == set(TABLES)


def test_absorption_maxima_are_broad_and_free_of_duplicates() -> None:
    frame = table("absorption_maxima")
    assert LEAST_MAXIMA <= len(frame) <= MOST_MAXIMA
    assert frame["absorption_max_nm"].between(300, 800).all()
    assert frame["family"].nunique() >= LEAST_FAMILIES
    charges = [Chem.GetFormalCharge(Chem.MolFromSmiles(smiles)) for smiles in frame["smiles"]]
    assert {-1, 0, 1} <= {int(np.sign(charge)) for charge in charges}
    assert frame["medium"].nunique() >= 10
    keys = [Chem.MolToInchiKey(Chem.MolFromSmiles(smiles)) for smiles in frame["smiles"]]
    assert not pd.DataFrame({"key": keys, "medium": frame["medium"]}).duplicated().any()
    assert frame.groupby("name")["smiles"].nunique().max() == 1


def test_azo_series_reddens_with_push_and_pull() -> None:
    """Rau's classes in numbers: amino and nitro groups together move the pi-pi* band by more than 100 nm."""
    azo = table("azo_series").set_index("name")["absorption_max_nm"]
    assert azo["4-amino-4'-nitroazobenzene"] - azo["azobenzene"] > 100
    assert azo.between(300, 700).all()


@pytest.mark.parametrize("name", SERIES)
def test_longer_members_absorb_further_to_the_red(name: str) -> None:
    for band in table(name)["band"].unique():
        members = series(name, band)
        assert members["n"].is_unique
        assert members["absorption_max_nm"].is_monotonic_increasing, (name, band)


def test_singlets_have_one_state_per_role_and_plausible_energies() -> None:
    frame = table("quest_singlets")
    assert not frame.duplicated(["set", "name", "role"]).any()
    assert frame["energy_ev"].between(0.5, 10).all()
    assert set(frame["role"]) == {"bright", "dark", "undetermined"}
    assert (frame.loc[frame["role"] == "bright", "f"] >= 0.01).all()
    assert (frame.loc[frame["forbidden"] == "yes", "f"] == 0).all()
    assert frame.loc[frame["set"] == "chromophores", "name"].nunique() == 18
    other = frame[["cc2_ev", "adc2_ev", "wb97xd_ev"]].sub(frame["energy_ev"], axis=0).abs()
    assert np.nanmax(other.to_numpy()) < 0.7  # no approximate method is further off for valence singlets


def test_dark_states_agree_with_the_table_of_singlets() -> None:
    dark = table("dark_states")
    assert set(dark["reason"]) == {"forbidden", "overlap", "cancelling"}
    singlets = table("quest_singlets").set_index(["name", "state"])["energy_ev"]
    shared = [row for row in dark.itertuples() if (row.name, row.state) in singlets.index]
    assert len(shared) >= 15
    for row in shared:
        assert row.energy_ev == pytest.approx(singlets[(row.name, row.state)], abs=5e-4), row.name


def test_directions_name_a_known_frame_and_window() -> None:
    frame = table("transition_directions")
    assert set(frame["axis"]) <= {"long", "short", "along", "across", "across 1B2u"}
    assert (frame["energy_low_ev"] < frame["energy_high_ev"]).all()
    assert frame["tolerance_deg"].between(1, 20).all()
    assert not frame.duplicated(["name", "state"]).any()


def test_vertical_wavelengths_follow_from_their_energies() -> None:
    """1 eV is 1239.84 nm (CODATA 2018): ethylene's 7.897 eV is 157.0 nm."""
    polyenes = series("polyenes", "vertical 1Bu")
    assert HC_EV_NM / polyenes["absorption_max_nm"].iloc[0] == pytest.approx(7.897, abs=3e-3)
