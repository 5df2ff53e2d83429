"""The migrations make exactly the tables of the models, and leave filled stores as they are."""

from __future__ import annotations

import json
import sqlite3

import pytest
import sqlalchemy as sa
from alembic import command
from alembic.autogenerate import compare_metadata
from alembic.config import Config
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from orchil.store import Store, StoreError, migrate
from orchil.store.engine import writable_engine, writer
from orchil.store.location import locate
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


EXTRA = {"batch": "A", "Measured Absorption max nm": "532,5 nm", "measured_emission_max_nm": "n/a"}
FILLED = f"""
INSERT INTO screen VALUES (1, '2025-01-01 00:00:00', '2025-01-01 00:00:00', 'a.csv', '{{}}', 'd', '{{}}');
INSERT INTO candidate (id, row_number, name, structure, format, extra, status, cautions)
    VALUES (7, 1, 'old', 'CC', 'smiles', '{json.dumps(EXTRA)}', 'done', 'look out');
INSERT INTO candidate (id, row_number, name, structure, format, extra, status)
    VALUES (8, 2, 'plain', 'CCC', 'smiles', '{{"batch": "B"}}', 'waiting');
INSERT INTO quantity VALUES ('absorption_max_nm', 7, 500, 450, 560, 0.9, 'nm');
INSERT INTO band VALUES (7, 1, 1, 1, 0.9, 500, 450, 560, 490, 500, 9e4, 5e4, 2e5, 0.3, 1, 9, 4, 1, NULL, NULL, NULL,
    'edge', 'rough');
INSERT INTO score VALUES (1, 7, 1, 0.8, 0.7, 1, 1);
"""


def test_a_store_of_the_first_revision_opens_with_all_it_holds(path):
    location = locate(path)
    config = Config()
    config.set_main_option("script_location", str(migrate._FOLDER))
    with writer(writable_engine(location, foreign_keys=False)).begin() as connection:
        config.attributes["connection"] = connection
        command.upgrade(config, "0001")
        migrate._finish_file(connection, location)
    with sqlite3.connect(path) as raw:
        raw.executescript(FILLED)
    raw.close()
    with pytest.raises(StoreError, match="older Orchil"):
        Store.open_read_only(path)
    with Store.open(path, create=False) as store:
        old, _ = store.query("SELECT * FROM ranking").to_dict("records")
        assert (old["candidate"], old["rank"], old["absorption_max_nm"]) == ("old", 1, 500)
        assert old["cautions"] == "look out; rough"
        assert old["measured_absorption_max_nm"] == 532.5
        assert store.measured_names() == {"absorption_max_nm"}
        assert store.candidate_page("old").extra == {"batch": "A"}
        assert store.candidate_page("plain").extra == {"batch": "B"}
        assert store.library_table(["absorption_max_nm"]).column("absorption_max_nm").high.tolist() == [560]


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
