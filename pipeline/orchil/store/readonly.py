"""A person's SQL on the store, which can read and do nothing else.

Three locks, one behind the other: the file is opened read-only, SQLite is told to refuse writes, and every
statement is asked what it would do before it runs (sqlite.org/c3ref/set_authorizer.html).
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterable, Mapping, Sequence
from contextlib import closing
from typing import Any

import pandas as pd
from orchil_schemas.panel import SqlFunction

from .engine import connect_read_only
from .errors import StoreError
from .frames import frame
from .location import Location

# Numbers from sqlite3.h ("Authorizer Action Codes"); Python names SQLITE_RECURSIVE only since 3.11.
_RECURSIVE = 33
_ALLOWED = {sqlite3.SQLITE_SELECT, sqlite3.SQLITE_READ, sqlite3.SQLITE_FUNCTION, _RECURSIVE}
_DESCRIPTIONS = {"table_info", "table_xinfo", "table_list", "index_list", "index_info", "foreign_key_list"}
_FORBIDDEN_FUNCTIONS = {"load_extension", "fts3_tokenizer"}
_TABLE_FUNCTIONS = (
    "json_each('[]')",
    "json_tree('[]')",
    *(f"pragma_{name}" for name in sorted(_DESCRIPTIONS)),
)
_NAMES = {getattr(sqlite3, name): name for name in ("SQLITE_ATTACH", "SQLITE_DETACH", "SQLITE_PRAGMA")}

Parameters = Sequence[Any] | Mapping[str, Any]


def run_query(
    location: Location, sql: str, parameters: Parameters = (), functions: Iterable[SqlFunction] = ()
) -> pd.DataFrame:
    """The rows of one SELECT; :class:`StoreError` says what is wrong with the statement.

    ``functions`` can be called in it beside those of SQLite.
    """
    if location.path is None:
        raise StoreError("queries run on store files; on a server use its own client with a role that may only read")
    with closing(connect_read_only(location.path)) as connection:
        connection.execute("PRAGMA query_only = ON")
        connection.execute("PRAGMA busy_timeout = 30000")
        for function in _TABLE_FUNCTIONS:
            # At first use SQLite declares the columns of such a table, which the gate would take for a write.
            connection.execute(f"SELECT 1 FROM {function} LIMIT 0")
        gate = _Gate()
        for lent in functions:
            connection.create_function(lent.name, lent.arguments, gate.listening(lent.call), deterministic=True)
        connection.set_authorizer(gate)
        return _rows(connection, sql, parameters, gate)


class _Gate:
    """SQLite asks it about every action of a statement; it remembers the first refusal and the first complaint."""

    def __init__(self) -> None:
        self.refused: str | None = None
        self.complaint: str | None = None

    def __call__(self, action: int, first: str | None, second: str | None, *_: str | None) -> int:
        if self._allowed(action, first, second):
            return sqlite3.SQLITE_OK
        name = _NAMES.get(action, "")
        self.refused = self.refused or name.removeprefix("SQLITE_") or second or first or "this statement"
        return sqlite3.SQLITE_DENY

    def listening(self, call: Callable[..., Any]) -> Callable[..., Any]:
        """The function, with what it complains of remembered: SQLite says only that it raised."""

        def called(*arguments: Any) -> Any:
            try:
                return call(*arguments)
            except Exception as error:
                self.complaint = self.complaint or str(error)
                raise

        return called

    @staticmethod
    def _allowed(action: int, first: str | None, second: str | None) -> bool:
        if action == sqlite3.SQLITE_PRAGMA:
            return (first or "").lower() in _DESCRIPTIONS
        if action == sqlite3.SQLITE_FUNCTION:
            return (second or "").lower() not in _FORBIDDEN_FUNCTIONS
        return action in _ALLOWED


def _rows(connection: sqlite3.Connection, sql: str, parameters: Parameters, gate: _Gate) -> pd.DataFrame:
    try:
        cursor = connection.execute(sql, parameters)
        rows = cursor.fetchall()
    except (sqlite3.Error, sqlite3.Warning, ValueError, OverflowError) as error:
        raise StoreError(_explain(error, gate)) from error
    if cursor.description is None:
        raise StoreError("the query gives no rows: write one SELECT, for example SELECT * FROM ranking LIMIT 10")
    return frame([column[0] for column in cursor.description], rows)


def _explain(error: Exception, gate: _Gate) -> str:
    if gate.refused is not None:
        return f"a query can only read, and may not use {gate.refused}: write one SELECT"
    if gate.complaint is not None:
        return f"the query cannot run: {gate.complaint}"
    if "one statement" in str(error):
        return "one statement at a time: remove everything after the first semicolon"
    return f"the query cannot run: {error}"
