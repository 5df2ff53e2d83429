"""Rows of a query as a pandas DataFrame that keeps whole numbers whole."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd


def frame(names: Sequence[str], rows: Sequence[Sequence[Any]]) -> pd.DataFrame:
    """One column per name; whole numbers with gaps become Int64, other numbers with gaps float64 with NaN."""
    columns = list(zip(*rows, strict=True)) if rows else [()] * len(names)
    series = [pd.Series(_typed(column), name=name) for name, column in zip(names, columns, strict=True)]
    return pd.concat(series, axis=1) if series else pd.DataFrame()


def _typed(values: Sequence[Any]) -> Any:
    kinds = set(map(type, values))
    if kinds == {int, type(None)}:
        return pd.array(list(values), dtype="Int64")
    if kinds == {float, type(None)} or kinds == {float, int, type(None)}:
        return np.array(values, dtype=np.float64)
    return list(values) if kinds else pd.array([], dtype="object")
