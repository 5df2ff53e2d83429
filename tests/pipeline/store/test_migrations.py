"""The migrations make exactly the tables of the models, and leave filled stores as they are."""

from __future__ import annotations

import sqlite3

import pytest
import sqlalchemy as sa
from alembic.autogenerate import compare_metadata
from alembic.config import Config
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from orchil.store import Store, StoreError, migrate
from orchil.store.models import metadata
from sqlalchemy.dialects import postgresql
from sqlalchemy.schema import CreateTable

VIEWS = {"ranking", "states", "quantities", "failures", "timing"}


def test_a_fresh_store_has_the_tables_of_the_models(store):
    with store._engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, metadata) == []
        assert set(sa.inspect(connection).get_view_names()) == VIEWS


def test_keys_and_checks_agree_with_the_models(store):
    """What Alembic does not compare: primary keys, CHECKs, tables without rowid."""
    with store._engine.connect() as connection:
        inspector = sa.inspect(connection)
        for table in metadata.sorted_tables:
            key = inspector.get_pk_constraint(table.name)["constrained_columns"]
            assert key == [column.name for column in table.primary_key], table.name
            checks = {check["name"] for check in inspector.get_check_constraints(table.name)}
            assert checks == {c.name for c in table.constraints if isinstance(c, sa.CheckConstraint)}
            sql = connection.scalar(sa.text("SELECT sql FROM sqlite_master WHERE name = :n"), {"n": table.name})
            assert ("WITHOUT ROWID" in sql) is (table.dialect_options["sqlite"]["with_rowid"] is False)


def test_the_list_of_revisions_is_the_folder():
    config = Config()
    config.set_main_option("script_location", str(migrate._FOLDER))
    folder = ScriptDirectory.from_config(config)
    assert tuple(one.revision for one in reversed(list(folder.walk_revisions()))) == migrate.REVISIONS


def test_migrating_a_filled_store_again_changes_nothing(filled, path):
    before = filled.ranking()
    migrate.upgrade(filled.location)
    with Store.open(path, create=False) as again:
        assert again.ranking().equals(before)


def test_a_migration_that_fails_leaves_nothing(path, monkeypatch):
    monkeypatch.setattr(migrate, "_finish_file", lambda *_: (_ for _ in ()).throw(StoreError("stopped here")))
    with pytest.raises(StoreError, match="stopped here"):
        Store.open(path, create=True)
    monkeypatch.undo()
    with sqlite3.connect(path) as raw:
        assert raw.execute("SELECT count(*) FROM sqlite_master").fetchone() == (0,)
    raw.close()
    with Store.open(path, create=True) as store:
        assert store.candidates() == []


def test_a_store_of_a_newer_version_is_refused(store, path):
    with sqlite3.connect(path) as raw:
        raw.execute("UPDATE alembic_version SET version_num = '9999'")
    raw.close()
    for opening in (lambda: Store.open(path, create=False), lambda: Store.open_read_only(path)):
        with pytest.raises(StoreError, match="newer Orchil"):
            opening()


@pytest.mark.parametrize("table", metadata.sorted_tables, ids=lambda table: table.name)
def test_tables_can_be_written_for_postgresql(table):
    ddl = str(CreateTable(table).compile(dialect=postgresql.dialect()))
    assert "JSONB" in ddl if any(isinstance(c.type, sa.JSON) for c in table.columns) else "JSON" not in ddl
    assert "WITH TIME ZONE" in ddl or not any("DateTime" in type(c.type).__name__ for c in table.columns)
    assert " FLOAT" not in ddl  # single precision would lose digits; DOUBLE PRECISION is meant
