"""Runs the per-candidate stages over a library: work goes from the board to workers, results to the store.

The only writer. Results are committed several times a second, so that a kill at any moment loses the work in
flight and little more. The first Ctrl-C (or SIGTERM) lets running stages finish; the second stops at once.
"""

from __future__ import annotations

import signal
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from types import FrameType

from orchil_schemas import Brief, LibraryRow

from .board import Board
from .budget import REMEMBERED, Budget, Durations
from .chain import Chain
from .errors import RunError
from .messages import Task
from .progress import Progress
from .promise import cheap_steps, most_promising
from .store import CandidateState, Store, StoreError
from .supervisor import Supervisor

COMMIT_SECONDS = 0.2
COMMIT_ROWS = 2000
ADMIT = 64
REMEMBER = 500


@dataclass(frozen=True)
class Outcome:
    """Counts of one run; ``stopped`` when it was ended before the last candidate, ``time_up`` by its budget."""

    done: int
    failed: int
    left: int
    stopped: bool
    time_up: bool = False


Waiting = Iterator[CandidateState]
Admit = Callable[[list[tuple[CandidateState, LibraryRow]]], None]


class Runner:
    """One run over those candidates that are still waiting."""

    def __init__(
        self,
        store: Store,
        chain: Chain,
        brief: Brief,
        pool: Supervisor,
        progress: Progress,
        *,
        budget: Budget | None = None,
    ) -> None:
        self._store = store
        self._chain = chain
        self._budget = budget
        self._durations = Durations(store.recent_seconds(_names(chain), REMEMBERED) if budget else {})
        self._brief = brief
        self._pool = pool
        self._progress = progress
        self._board = Board(chain, store)
        self._stopping = False
        self._time_up = self._dropped = False
        self._committed = time.monotonic()

    def run(self, candidates: Sequence[CandidateState], *, retry_failed: bool = False) -> Outcome:
        """Bring every waiting candidate to an outcome; earlier failures only with ``retry_failed``.

        With a budget the most promising come first, and no work begins that cannot end in time.
        """
        again = ("waiting", "failed") if retry_failed else ("waiting",)
        waiting = [state for state in candidates if state.status in again]
        finished = [state for state in candidates if state.status not in again]
        self._remember(finished)
        self._progress.start(len(waiting), len(finished))
        with self._signals():
            self._loop(iter(self._in_order(waiting)), self._board.admit)
        board = self._board
        left = len(waiting) - board.done - board.failed
        self._progress.end(board.done, board.failed, left)
        return Outcome(board.done, board.failed, left, self._stopping, left > 0 and (self._time_up or self._dropped))

    def _in_order(self, waiting: list[CandidateState]) -> list[CandidateState]:
        """Under a budget: have the cheap stages look at everyone, then the most promising first."""
        if self._budget is None:
            return waiting
        self._progress.say(f"until {self._budget}: a look at the whole library first, then the most promising")
        cheap, wanted = cheap_steps(self._chain), frozenset(want.quantity for want in self._brief.want)
        self._loop(iter(waiting), lambda some: self._board.glance(some, cheap, wanted))
        states = {state.id: state for state in waiting}
        try:
            order = most_promising(self._board.glances, self._chain, self._brief)
        except Exception as error:  # a plugin judges here, and the night can do without
            self._progress.say(f"the most promising cannot be told ({type(error).__name__}: {error})")
            order = list(states)
        self._board.glances.clear()
        return [states[one] for one in order]

    def _loop(self, waiting: Waiting, admit: Admit) -> None:
        while True:
            self._watch_the_clock()
            if not self._closing:
                self._fill(waiting, admit)
            if not self._pool.busy:
                break
            for result in self._pool.wait(COMMIT_SECONDS):
                if result.reply.ok:
                    self._durations.note(result.task.stage, result.reply.seconds)
                self._board.deliver(result.task, result.reply)
            if not self._closing:
                self._submit()
            self._commit_if_due()
        self._commit()

    @property
    def _closing(self) -> bool:
        """Nothing new is begun."""
        return self._stopping or (self._budget is not None and self._budget.left() <= 0)

    def _watch_the_clock(self) -> None:
        """When the time is up, let running stages finish for a while, then stop them; their candidates wait on."""
        if self._budget is None or self._budget.left() > 0:
            return
        grace = self._budget.grace_seconds
        if not self._time_up and self._pool.busy:
            self._progress.say(f"the time is up: running stages have {grace:g} s to finish")
        self._time_up = True
        if self._budget.left() <= -grace:
            self._pool.close()

    def _fill(self, waiting: Waiting, admit: Admit) -> None:
        """Keep every worker busy and one piece of work per worker in reserve."""
        self._submit()
        while self._board.ready < self._pool.workers and not self._closing:
            some = [(state, self._row(state)) for state in islice(waiting, ADMIT)]
            if not some:
                return
            admit(some)
            futile = not self._submit()
            self._commit_if_due()
            if futile:
                return

    def _submit(self) -> bool:
        """Hand out work that can end in time, and drop the rest; False when there was nothing but such a rest."""
        handed = dropped = 0
        while self._pool.free and self._board.ready:
            task = self._board.next_task()
            if self._ends_in_time(task):
                self._pool.submit(task)
                handed += 1
            else:
                self._dropped = True
                dropped += 1
        return bool(handed or not dropped)

    def _ends_in_time(self, task: Task) -> bool:
        return self._budget is None or self._durations.expected(task.stage) <= self._budget.left()

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


def _names(chain: Chain) -> list[str]:
    return [step.stage.name for step in chain.steps]
