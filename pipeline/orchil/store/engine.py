"""Connections: one writer that begins IMMEDIATE, readers that never wait for it, and read-only files."""

from __future__ import annotations

import json
import os
import sqlite3
from functools import partial
from pathlib import Path
from typing import Any
from urllib.parse import quote

import sqlalchemy as sa
from sqlalchemy import event

from .errors import StoreError
from .location import Location

_PRAGMAS = ("busy_timeout = 30000", "synchronous = NORMAL", "temp_store = MEMORY", "cache_size = -65536")
_strict_json = json.JSONEncoder(allow_nan=False, ensure_ascii=False, separators=(",", ":")).encode


def writable_engine(location: Location, *, foreign_keys: bool = True) -> sa.Engine:
    """An engine whose transactions are plain reads; give it the option ``orchil_writes`` to write.

    A transaction that starts as a read and then writes cannot wait for a busy database, so a writer must
    say so at the start: that is what BEGIN IMMEDIATE does.
    """
    engine = _engine(location.url)
    if location.path is not None:
        _set_pragmas(engine, "journal_mode = WAL", f"foreign_keys = {'ON' if foreign_keys else 'OFF'}", *_PRAGMAS)
        event.listen(engine, "begin", _begin)
    return engine


def writer(engine: sa.Engine) -> sa.Engine:
    """The same pool of connections, for transactions that write."""
    return engine.execution_options(orchil_writes=True)


def read_only_engine(location: Location) -> sa.Engine:
    """An engine that cannot write."""
    if location.path is None:
        return _engine(location.url, execution_options={"postgresql_readonly": True})
    engine = _engine(location.url, creator=partial(connect_read_only, location.path))
    _set_pragmas(engine, "query_only = ON", *_PRAGMAS)
    event.listen(engine, "begin", _begin)
    return engine


def connect_read_only(path: Path) -> sqlite3.Connection:
    """A connection to the file that cannot write; several statements see one another's state only by luck."""
    return sqlite3.connect(read_only_uri(path), uri=True, isolation_level=None, check_same_thread=False)


def read_only_uri(path: Path) -> str:
    """URI of the file for reading.

    A file with a write-ahead log needs a writable folder even for reading, unless it is declared immutable,
    which is true of a file in a folder that may not be written and that has no log beside it.
    """
    log = path.with_name(path.name + "-wal")
    fixed = not os.access(path.absolute().parent, os.W_OK) and not log.exists()
    return f"file:{quote(str(path.absolute()))}?mode=ro" + ("&immutable=1" if fixed else "")


def check_log(engine: sa.Engine, location: Location) -> None:
    """Write once with the write-ahead log on; :class:`StoreError` where the disk cannot have one."""
    if location.path is None:
        return
    with writer(engine).begin() as connection:
        mode = connection.exec_driver_sql("PRAGMA journal_mode").scalar_one()
        if mode != "wal":
            raise StoreError(f"{location} is on a disk without a write-ahead log: keep the store on a local disk")
        version = connection.exec_driver_sql("PRAGMA user_version").scalar_one()
        connection.exec_driver_sql(f"PRAGMA user_version = {int(version)}")


def _engine(url: sa.URL, **options: Any) -> sa.Engine:
    try:
        return sa.create_engine(url, json_serializer=_strict_json, **options)
    except (ImportError, sa.exc.NoSuchModuleError) as error:
        raise StoreError(f"no driver for {url.drivername} is installed: {error}") from error


def _set_pragmas(engine: sa.Engine, *pragmas: str) -> None:
    def connected(connection: sqlite3.Connection, _: object) -> None:
        # Python's own handling of transactions sends no BEGIN before SELECT or DDL; ours does.
        connection.isolation_level = None
        for pragma in pragmas:
            connection.execute(f"PRAGMA {pragma}")

    event.listen(engine, "connect", connected)


def _begin(connection: sa.Connection) -> None:
    writes = connection.get_execution_options().get("orchil_writes", False)
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")
