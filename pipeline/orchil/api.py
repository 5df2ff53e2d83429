"""A night for notebooks: every number as pandas, from Python.

::

    from orchil.api import Night

    with Night("night.db") as night:
        best = night.ranking().head(20)
        wide = night.quantities()

Everything is read-only and works while a screen is running. Errors are :class:`orchil.errors.OrchilError`.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from types import TracebackType
from typing import Any

import pandas as pd
from typing_extensions import Self

from .questions import find
from .registry import Registry
from .store import CandidatePage, ScreenInfo, Store
from .store.readonly import Parameters


class Night:
    """One store, read only: ``Night("night.db")``. Close it, or use it in a ``with`` block."""

    def __init__(self, store: str | Path) -> None:
        self._store = Store.open_read_only(store)
        self._functions = Registry.load().offers.sql_functions

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Let the file go."""
        self._store.close()

    def query(self, sql: str, parameters: Parameters = ()) -> pd.DataFrame:
        """The rows of one SELECT; ``?`` and ``:name`` stand for parameters."""
        return self._store.query(sql, parameters, self._functions.values())

    def ask(self, question: str, **parameters: object) -> pd.DataFrame:
        """The answer to a ready-made question: ``night.ask("sure", low_nm=500, high_nm=570)``."""
        found = find(question)
        return self.query(found.sql, found.values({name: str(value) for name, value in parameters.items()}))

    def ranking(self) -> pd.DataFrame:
        """The view ``ranking``, best first."""
        return self.query("SELECT * FROM ranking")

    def quantities(self) -> pd.DataFrame:
        """One row for each row of the library that has numbers, by ``row_number``, and a column for each quantity.

        Ends of intervals are the columns ``NAME_low`` and ``NAME_high``, where a quantity has any.
        """
        long = self.query(_QUANTITIES)
        sides = {"value": "", "low": "_low", "high": "_high"}
        wide = [
            long.pivot_table(index="row_number", columns="name", values=side, sort=True).add_suffix(end)
            for side, end in sides.items()
            if long[side].notna().any()
        ]
        names = self.query("SELECT row_number, name AS candidate FROM candidate").set_index("row_number")
        return names.join(pd.concat(wide, axis=1), how="inner") if wide else names.head(0)

    def candidate(self, name: str | int) -> CandidatePage:
        """All there is about one candidate, by name or by id; ``KeyError`` when there is none."""
        page = self._store.candidate_page(name)
        if page is None:
            raise KeyError(name)
        return page

    def records(self, kind: str) -> dict[int, dict[str, Any]]:
        """The records of one kind as dictionaries by row number: ``night.records("transitions")``."""
        found = self.query(_RECORDS, (kind,))
        return {int(row): json.loads(text) for row, text in zip(found["row_number"], found["payload"], strict=True)}

    @property
    def screen(self) -> ScreenInfo | None:
        """Brief, library, versions and begin of the screen."""
        return self._store.active_screen()

    @property
    def functions(self) -> Mapping[str, str]:
        """What can be called in SQL beside the functions of SQLite."""
        return {name: one.meaning for name, one in self._functions.items()}


_QUANTITIES = """
SELECT c.row_number, q.name, q.value, q.low, q.high FROM quantity q JOIN candidate c ON c.id = q.candidate_id
"""
_RECORDS = """
SELECT c.row_number, r.payload FROM candidate_record l
JOIN record r ON r.digest = l.record_digest JOIN candidate c ON c.id = l.candidate_id
WHERE l.kind = ? ORDER BY c.row_number
"""
