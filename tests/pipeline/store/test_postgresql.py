"""The same store on a server. Runs when ORCHIL_TEST_POSTGRESQL is the URL of an empty database."""

from __future__ import annotations

import os

import pytest
import sqlalchemy as sa
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from orchil.store import Store, StoreError
from orchil.store.models import metadata

from .conftest import fill

URL = os.environ.get("ORCHIL_TEST_POSTGRESQL")
pytestmark = pytest.mark.skipif(URL is None, reason="ORCHIL_TEST_POSTGRESQL is not set")


def test_a_store_on_a_server():
    with Store.open(URL, create=True) as store:
        with store._engine.connect() as connection:
            assert compare_metadata(MigrationContext.configure(connection), metadata) == []
        fill(store)
        assert store.ranking()["candidate"].tolist() == ["dye-1", "dye-2", "dye-3"]
        attempts = store.candidate_page("dye-1").attempts
        assert [one["stage"] for one in attempts] == ["intake", "excite", "calibrate"]
        assert store.library_table(["absorption_max_nm"]).column("absorption_max_nm").value.tolist() == [520]
        _second_coordinator_is_refused(store)


def _second_coordinator_is_refused(store):
    with (
        store.lock(),
        Store.open(URL, create=False) as second,
        pytest.raises(StoreError, match="another coordinator"),
        second.lock(),
    ):
        pass


def test_a_server_is_read_only_for_readers():
    with Store.open(URL, create=True), Store.open_read_only(URL) as reader:
        with reader._engine.connect() as connection, pytest.raises(sa.exc.DBAPIError, match="read-only"):
            connection.exec_driver_sql("DELETE FROM band")
        with pytest.raises(StoreError, match="store files"):
            reader.query("SELECT 1")
