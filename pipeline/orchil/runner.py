"""Runs the per-candidate stages over a library: work goes from the board to workers, results to the store.

The only writer. Results are committed several times a second, so that a kill at any moment loses the work in
flight and little more. The first Ctrl-C (or SIGTERM) lets running stages finish; the second stops at once.
"""

from __future__ import annotations

import signal
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from types import FrameType

from orchil_schemas import Brief, LibraryRow

from .board import Board
from .chain import Chain
from .errors import RunError
from .progress import Progress
from .store import CandidateState, Store, StoreError
from .supervisor import Supervisor

COMMIT_SECONDS = 0.2
COMMIT_ROWS = 2000
ADMIT = 64
REMEMBER = 500


@dataclass(frozen=True)
class Outcome:
    """Counts of one run; ``stopped`` when it was ended before the last candidate."""

    done: int
    failed: int
    left: int
    stopped: bool


class Runner:
    """One run over those candidates that are still waiting."""

    def __init__(self, store: Store, chain: Chain, brief: Brief, pool: Supervisor, progress: Progress) -> None:
        self._store = store
        self._brief = brief
        self._pool = pool
        self._progress = progress
        self._board = Board(chain, store)
        self._stopping = False
        self._committed = time.monotonic()

    def run(self, candidates: Sequence[CandidateState], *, retry_failed: bool = False) -> Outcome:
        """Bring every waiting candidate to an outcome; earlier failures only with ``retry_failed``."""
        again = ("waiting", "failed") if retry_failed else ("waiting",)
        waiting = [state for state in candidates if state.status in again]
        finished = [state for state in candidates if state.status not in again]
        self._remember(finished)
        self._progress.start(len(waiting), len(finished))
        with self._signals():
            self._loop(iter(waiting))
        board = self._board
        left = len(waiting) - board.done - board.failed
        self._progress.end(board.done, board.failed, left)
        return Outcome(board.done, board.failed, left, self._stopping)

    def _loop(self, waiting: Iterator[CandidateState]) -> None:
        while True:
            if not self._stopping:
                self._fill(waiting)
            if not self._pool.busy:
                break
            for result in self._pool.wait(COMMIT_SECONDS):
                self._board.deliver(result.task, result.reply)
            if not self._stopping:
                self._submit()
            self._commit_if_due()
        self._commit()

    def _fill(self, waiting: Iterator[CandidateState]) -> None:
        """Keep every worker busy and one piece of work per worker in reserve."""
        self._submit()
        while self._board.ready < self._pool.workers and not self._stopping:
            some = [(state, self._row(state)) for state in islice(waiting, ADMIT)]
            if not some:
                return
            self._board.admit(some)
            self._submit()
            self._commit_if_due()

    def _submit(self) -> None:
        while self._pool.free and self._board.ready:
            self._pool.submit(self._board.next_task())

    def _commit_if_due(self) -> None:
        overdue = time.monotonic() - self._committed >= COMMIT_SECONDS
        if len(self._board.batch) and (overdue or len(self._board.batch) >= COMMIT_ROWS):
            self._commit()

    def _commit(self) -> None:
        if len(self._board.batch):
            try:
                self._store.commit(self._board.batch)
            except StoreError as error:
                raise RunError(f"results cannot be kept: {error}") from error
            self._board.written()
        self._committed = time.monotonic()
        self._progress.update(self._board.done, self._board.failed)

    def _remember(self, finished: Sequence[CandidateState]) -> None:
        for start in range(0, len(finished), REMEMBER):
            self._board.remember([(state, self._row(state)) for state in finished[start : start + REMEMBER]])

    def _row(self, state: CandidateState) -> LibraryRow:
        """The physics of a row; the medium of the brief holds where the library names none."""
        medium = state.medium or self._brief.medium
        return LibraryRow(structure=state.structure, format=state.format, medium=medium, charge=state.charge)

    @contextmanager
    def _signals(self) -> Iterator[None]:
        """Turn the first SIGINT or SIGTERM into an orderly stop, the second into KeyboardInterrupt."""
        names = (signal.SIGINT, signal.SIGTERM)
        before = [signal.signal(name, self._interrupted) for name in names]
        try:
            yield
        finally:
            for name, handler in zip(names, before, strict=True):
                signal.signal(name, handler)

    def _interrupted(self, number: int, frame: FrameType | None) -> None:
        if self._stopping:
            raise KeyboardInterrupt
        self._stopping = True
        self._progress.say("stopping: running stages finish and are kept; once more to stop at once")
