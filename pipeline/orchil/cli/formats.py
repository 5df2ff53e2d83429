"""How the rows of a question are written."""

from __future__ import annotations

import io
import sys
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import IO

import pandas as pd
from orchil_schemas.panel import TableFormat
from pandas.api.types import is_numeric_dtype
from rich.table import Table

from orchil.errors import RequestError

from .common import remark
from .tables import console, missing, table

FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")
"""A spreadsheet takes text that begins like this for a formula; the last four are the wide signs of CJK keyboards."""


def write(rows: pd.DataFrame, form: str, output: Path | None, lent: Mapping[str, TableFormat]) -> None:
    """Write to a file, or to stdout; :class:`RequestError` for a format that is not there or needs a file."""
    if form in lent:
        _write_lent(rows, lent[form], output)
    elif output is None:
        WRITERS[form](rows, sys.stdout.buffer)
        sys.stdout.flush()
    else:
        _write_file(rows, form, output)


def check(form: str, output: Path | None, lent: Mapping[str, TableFormat]) -> None:
    """:class:`RequestError` before anything runs: no such format, or one that is no text for a terminal."""
    if form not in WRITERS and form not in lent:
        raise RequestError(f'there is no format "{form}": use {", ".join([*WRITERS, *lent])}')
    if form in lent and output is None:
        raise RequestError(f"{form} is written to a file: name one with --output")
    if form == "parquet" and output is None and sys.stdout.isatty():
        raise RequestError("parquet is no text for a terminal: name a file with --output")


def _write_file(rows: pd.DataFrame, form: str, output: Path) -> None:
    try:
        with output.open("wb") as file:
            WRITERS[form](rows, file)
    except OSError as error:
        raise RequestError(f"{output} cannot be written: {error.strerror}") from error


def _write_lent(rows: pd.DataFrame, form: TableFormat, output: Path | None) -> None:
    assert output is not None
    try:
        left_out = form.write(rows, output)
    except ValueError as error:
        raise RequestError(str(error)) from error
    except OSError as error:
        raise RequestError(f"{output} cannot be written: {error}") from error
    if left_out:
        remark([f"{left_out} rows left out: no structure that can be read"])


def _write_table(rows: pd.DataFrame, file: IO[bytes]) -> None:
    if file is sys.stdout.buffer:
        sys.stdout.flush()
        console().print(_table(rows))
        return
    text = io.StringIO()
    console(text).print(_table(rows))
    file.write(text.getvalue().encode())


def _table(rows: pd.DataFrame) -> Table:
    return table([str(name) for name in rows.columns], rows.itertuples(index=False))


def _write_csv(rows: pd.DataFrame, file: IO[bytes]) -> None:
    safe = rows.apply(lambda column: column if is_numeric_dtype(column) else column.map(defused))
    file.write(safe.rename(columns=defused).to_csv(index=False).encode())


def _write_json(rows: pd.DataFrame, file: IO[bytes]) -> None:
    import json

    records = [{key: plain(value) for key, value in row.items()} for row in rows.to_dict("records")]
    file.write(json.dumps(records, indent=1, ensure_ascii=False, allow_nan=False).encode() + b"\n")


def _write_parquet(rows: pd.DataFrame, file: IO[bytes]) -> None:
    rows.to_parquet(file, index=False)


def defused(value: object) -> object:
    """Text that a spreadsheet would run as a formula gets an apostrophe before it; numbers stay numbers."""
    return f"'{value}" if isinstance(value, str) and value.lstrip(" ").startswith(FORMULA_STARTS) else value


def plain(value: object) -> object:
    """A value that JSON knows; a missing one is null."""
    if missing(value):
        return None
    if isinstance(value, bytes):
        return value.hex()
    item = getattr(value, "item", None)
    return item() if callable(item) else value


WRITERS: dict[str, Callable[[pd.DataFrame, IO[bytes]], None]] = {
    "table": _write_table,
    "csv": _write_csv,
    "json": _write_json,
    "parquet": _write_parquet,
}
