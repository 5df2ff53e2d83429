"""Bring a store to the tables of this version, in one transaction; one query if it is up to date."""

from __future__ import annotations

from pathlib import Path

import sqlalchemy as sa

from .engine import writable_engine, writer
from .errors import StoreError
from .location import Location

REVISIONS = ("0001", "0002")
"""All revisions, oldest first; the last is what this version reads and writes."""

APPLICATION_ID = int.from_bytes(b"Orch", "big")
"""Marks a SQLite file as a store (PRAGMA application_id)."""

_FOLDER = Path(__file__).parent / "migrations"


def revision(engine: sa.Engine, location: Location) -> str | None:
    """Revision of the tables, None for an empty database; :class:`StoreError` for someone else's."""
    with engine.connect() as connection:
        names = sa.inspect(connection).get_table_names()
        if not names:
            return None
        if "alembic_version" not in names or not _marked(connection, location):
            raise StoreError(f"{location} is not an Orchil store: it is a database made by something else")
        found: str | None = connection.scalar(sa.text("SELECT version_num FROM alembic_version"))
    if found not in REVISIONS:
        raise StoreError(f"{location} was made by a newer Orchil (revision {found}): update Orchil to open it")
    return found


def _marked(connection: sa.Connection, location: Location) -> bool:
    if location.path is None:
        return sa.inspect(connection).has_table("candidate_record")
    return bool(connection.exec_driver_sql("PRAGMA application_id").scalar_one() == APPLICATION_ID)


def upgrade(location: Location) -> None:
    """Run all migrations that are missing; all of them take effect, or none."""
    from alembic import command
    from alembic.config import Config

    # SQLite copies a table to alter it, which foreign keys would forbid; they can only be off from the start.
    engine = writable_engine(location, foreign_keys=False)
    config = Config()
    config.set_main_option("script_location", str(_FOLDER).replace("%", "%%"))
    try:
        with writer(engine).begin() as connection:
            config.attributes["connection"] = connection
            command.upgrade(config, "head")
            if location.path is not None:
                _finish_file(connection, location)
    finally:
        engine.dispose()


def _finish_file(connection: sa.Connection, location: Location) -> None:
    if connection.exec_driver_sql("PRAGMA foreign_key_check").first() is not None:
        raise StoreError(f"{location} has rows that point nowhere: restore a copy, or start a new store")
    connection.exec_driver_sql(f"PRAGMA application_id = {APPLICATION_ID}")
