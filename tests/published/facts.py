"""Reads the tables of published facts; each has its sources beside it, see ``facts/README.md``."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Any

import pandas as pd

FOLDER = Path(__file__).parent / "facts"
SERIES = ("polyenes", "cyanines", "acenes", "oligothiophenes")
TABLES = (
    "absorption_maxima",
    "azo_series",
    "quest_singlets",
    "dark_states",
    "transition_directions",
    "triplets",
    "radiative_rates",
    "solvent_slopes",
    *SERIES,
)
TEXT_COLUMNS = ("name", "medium", "note", "bright_state", "label")


@cache
def table(name: str) -> pd.DataFrame:
    """One table by its name; empty text is "", an empty number is NaN. Do not change what it returns."""
    frame = pd.read_csv(FOLDER / f"{name}.csv", keep_default_na=True)
    texts = [column for column in TEXT_COLUMNS if column in frame]
    frame[texts] = frame[texts].fillna("").astype(str)
    return frame


def rows(name: str) -> list[dict[str, Any]]:
    """The rows of one table as dictionaries."""
    return [{str(key): value for key, value in row.items()} for row in table(name).to_dict("records")]


def series(name: str, band: str) -> pd.DataFrame:
    """The members of a homologous series with one kind of number, shortest first."""
    frame = table(name)
    return frame[frame["band"] == band].sort_values("n").reset_index(drop=True)
