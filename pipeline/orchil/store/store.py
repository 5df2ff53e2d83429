"""The store as the rest of the engine sees it."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from contextlib import AbstractContextManager, contextmanager
from datetime import datetime, timedelta
from pathlib import Path
from types import TracebackType
from typing import TypeVar

import pandas as pd
import sqlalchemy as sa
from orchil_schemas import Anchor, Brief, LibraryTable, Record, Score, content_digest
from orchil_schemas.base import canonical_json
from orchil_schemas.panel import SqlFunction
from typing_extensions import Self

from . import anchors, reader, writer
from .engine import check_log, read_only_engine, writable_engine
from .engine import writer as for_writing
from .errors import StoreError, plain_errors
from .library import add_candidates, update_measured
from .location import Location, locate, refuse_shared_disk
from .lock import coordinator_lock
from .migrate import REVISIONS, revision, upgrade
from .models import screen
from .readonly import Parameters, run_query
from .rows import Batch, CandidatePage, CandidateRow, CandidateState, ScreenInfo, now

T = TypeVar("T")


class Store:
    """One store. Make it with :meth:`open` or :meth:`open_read_only`; every method is one transaction.

    Errors are :class:`StoreError`: one sentence that names the store and says what would be right.
    """

    def __init__(self, location: Location, engine: sa.Engine, *, writable: bool) -> None:
        self.location = location
        self._engine = engine
        self._writable = writable

    # -- opening

    @classmethod
    def open(cls, target: str | Path, *, create: bool) -> Store:
        """Open for writing, bring the tables up to date, and check that the disk can hold a store."""
        location = locate(target)
        _check_place(location, create=create)
        if location.exists:
            _check_owner(location)
        engine = writable_engine(location)
        try:
            with plain_errors(location):
                check_log(engine, location)
                if revision(engine, location) != REVISIONS[-1]:
                    with coordinator_lock(location, engine):
                        upgrade(location)
        except BaseException:
            engine.dispose()
            raise
        return cls(location, engine, writable=True)

    @classmethod
    def open_read_only(cls, target: str | Path) -> Store:
        """Open for reading, at any time, also while a screen is running."""
        location = locate(target)
        _check_place(location, create=False)
        if _check_owner(location) != REVISIONS[-1]:
            raise StoreError(f"{location} is empty or of an older Orchil: run `orchil screen` on it once")
        return cls(location, read_only_engine(location), writable=False)

    def close(self) -> None:
        """Close all connections; nothing is pending, because every method commits."""
        self._engine.dispose()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def lock(self) -> AbstractContextManager[None]:
        """Hold the store as its one coordinator; released by the operating system even after kill -9."""
        return coordinator_lock(self.location, self._engine)

    @contextmanager
    def _writing(self) -> Iterator[sa.Connection]:
        if not self._writable:
            raise StoreError(f"{self.location} was opened for reading only")
        with plain_errors(self.location), for_writing(self._engine).begin() as connection:
            yield connection

    def _read(self, function: Callable[..., T], *arguments: object) -> T:
        with plain_errors(self.location), self._engine.connect() as connection:
            return function(connection, *arguments)

    # -- screens and candidates

    def begin_screen(self, *, library: str, brief: Brief, versions: Mapping[str, str]) -> int:
        """Make the screen of this brief the active one; the same brief is the same screen."""
        content = brief.model_dump(mode="json")
        digest = content_digest("brief", canonical_json(content))
        with self._writing() as connection:
            changes = {"active_at": _next_moment(connection), "library": library, "versions": dict(versions)}
            same = connection.scalar(sa.select(screen.c.id).where(screen.c.brief_digest == digest))
            if same is not None:
                connection.execute(sa.update(screen).where(screen.c.id == same).values(changes))
                return int(same)
            new = sa.insert(screen).values(created=changes["active_at"], brief=content, brief_digest=digest, **changes)
            key = connection.execute(new).inserted_primary_key
            assert key is not None
            return int(key[0])

    def active_screen(self) -> ScreenInfo | None:
        """The screen activated last, None before the first."""
        return self._read(reader.active_screen)

    def add_candidates(self, rows: Sequence[CandidateRow]) -> None:
        """Add rows of the library; the same rows again change nothing but what was measured, others are refused."""
        with self._writing() as connection:
            add_candidates(connection, rows)

    def update_measured(self, rows: Sequence[CandidateRow]) -> int:
        """Take the measured values of rows that are there, unchanged; returns how many rows are not there."""
        with self._writing() as connection:
            return update_measured(connection, rows)

    def candidates(self) -> list[CandidateState]:
        """Every candidate in the order of the library."""
        return self._read(reader.all_candidates)

    def forget_results(self, candidates: Iterable[int]) -> None:
        """Set candidates back to waiting, without results; finished work stays in the cache.

        For a brief that changes how things are computed: what another brief made must not stand beside it.
        """
        with self._writing() as connection:
            writer.forget(connection, list(candidates))

    # -- cache and results

    def known_work(self, digests: Iterable[str]) -> dict[str, tuple[str, ...]]:
        """Digests of the records that finished work made, by digest of the work; unknown work is absent."""
        return self._read(reader.known_work, digests)

    def load_records(self, digests: Iterable[str]) -> dict[str, tuple[str, str]]:
        """(kind, payload JSON) by digest; unknown records are left out."""
        return self._read(reader.load_records, digests)

    def recent_seconds(self, stages: Sequence[str], count: int) -> dict[str, list[float]]:
        """Wall seconds of the last ``count`` successful attempts of each stage, oldest first."""
        return self._read(reader.recent_seconds, stages, count)

    def commit(self, batch: Batch) -> None:
        """Write all of the batch or nothing; written twice, only its attempts are there twice."""
        with self._writing() as connection:
            writer.write_batch(connection, batch)

    def measured_names(self) -> set[str]:
        """The quantities of which the user has measured some."""
        return self._read(reader.measured_names)

    def library_table(self, names: Sequence[str], *, anchored: bool = True) -> LibraryTable:
        """The named quantities over all candidates that are done; not ``anchored``: as they were predicted."""
        return self._read(reader.library_table, names, anchored)

    def put_library_records(
        self, screen_id: int, made: Iterable[tuple[int, Record]], kinds: Sequence[type[Record]] = ()
    ) -> None:
        """Keep what library stages made: scores replace those of the screen, other records are linked.

        What a stage that makes anchors (``kinds``) moved before goes back first; what it moves now is shown moved.
        """
        scores: list[tuple[int, Score]] = []
        others: list[tuple[int, Record]] = []
        for owner, found in made:
            scores.append((owner, found)) if isinstance(found, Score) else others.append((owner, found))
        with self._writing() as connection:
            if Anchor in kinds:
                anchors.withdraw(connection)
            writer.write_batch(connection, Batch(links=others))
            anchors.apply(connection, [(owner, one) for owner, one in others if isinstance(one, Anchor)])
            if scores:
                writer.write_scores(connection, screen_id, scores)

    # -- reading

    def ranking(self, *, limit: int | None = None) -> pd.DataFrame:
        """The view ``ranking``: best first, then the unranked in the order of the library."""
        return self._read(reader.ranking, limit)

    def candidate_page(self, name_or_id: str | int) -> CandidatePage | None:
        """Everything about one candidate; None when there is none of that name or id. A number is an id."""
        return self._read(reader.candidate_page, name_or_id)

    def query(self, sql: str, parameters: Parameters = (), functions: Iterable[SqlFunction] = ()) -> pd.DataFrame:
        """The rows of one SELECT, which cannot change anything; it may call ``functions``."""
        return run_query(self.location, sql, parameters, functions)


def _check_place(location: Location, *, create: bool) -> None:
    if location.path is None:
        return
    if not location.path.absolute().parent.is_dir():
        raise StoreError(f"the folder of {location} does not exist: make it first, or check the name")
    if not create and not location.exists:
        raise StoreError(f"there is no store at {location}: `orchil screen` makes one, or check the name")
    refuse_shared_disk(location.path)


def _check_owner(location: Location) -> str | None:
    """Revision of the tables, found without changing a file that may be someone else's."""
    engine = read_only_engine(location)
    try:
        with plain_errors(location):
            return revision(engine, location)
    finally:
        engine.dispose()


def _next_moment(connection: sa.Connection) -> datetime:
    """Now, but later than any earlier activation, also when the clock of the machine was set back."""
    last = connection.scalar(sa.select(sa.func.max(screen.c.active_at)))
    return max(now(), last + timedelta(microseconds=1)) if last else now()
