"""The board of a run: which candidates are under way, which work is ready, what each result means.

Work is named by digest: equal work in flight is done once and shared, known work comes from the store. Later
stages go first, so that candidates are finished early. The board runs and writes nothing; it fills a batch.
"""

from __future__ import annotations

import heapq
import platform
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from orchil_schemas import LibraryRow, Record, content_digest
from pydantic import ValidationError

from .chain import Chain, Kind, Step
from .digests import work_digest, work_seed
from .messages import Reply, Task
from .promise import Glance
from .store import AttemptRow, Batch, CandidateOutcome, CandidateState, WorkRow

ATTEMPTS = 2
DISTURBANCES = 5
"""So often work begins again whose worker was killed from outside, before that counts as its own failure."""
HOST = platform.node()


class Cache(Protocol):
    """The part of the store that knows finished work."""

    def known_work(self, digests: Iterable[str]) -> dict[str, tuple[str, ...]]:
        """Digests of the records of those works that are finished."""
        ...

    def load_records(self, digests: Iterable[str]) -> dict[str, tuple[str, str]]:
        """(kind, JSON text) of records by digest."""
        ...


@dataclass(frozen=True, slots=True)
class Made:
    """A record with the JSON it was read from, parsed once."""

    record: Record
    payload: str
    digest: str

    @classmethod
    def read(cls, kind: Kind, payload: str) -> Made:
        """Parse and check a payload; ``ValidationError`` when it does not fit."""
        record = kind.model_validate_json(payload)
        # The payload is the canonical JSON already: put it where the record would otherwise work it out anew.
        record.__dict__["canonical_json"] = payload
        return cls(record, payload, record.digest)


@dataclass(frozen=True, slots=True)
class Failure:
    """Why a stage failed for a piece of work."""

    code: str
    reason: str


@dataclass(eq=False, slots=True)
class Active:
    """A candidate under way: what it has, which steps it has not begun, how many it waits for.

    ``place`` counts candidates as they came in. One at which the board only glances gets no outcome; ``glance`` names
    the quantities to look at.
    """

    id: int
    row_number: int
    place: int
    glance: frozenset[str] | None
    made: dict[Kind, Made]
    todo: list[Step]
    waiting: int = 0
    failures: dict[int, Failure] = field(default_factory=dict)
    species: str | None = None


@dataclass(eq=False, slots=True)
class Work:
    """One run of one step, for all candidates that share it."""

    digest: str
    step: Step
    inputs: list[Made]
    seed: int
    shared_by: list[Active]
    attempt: int = 1
    disturbed: int = 0

    def __lt__(self, other: Work) -> bool:
        return self.urgency < other.urgency

    @property
    def urgency(self) -> tuple[int, int]:
        """Late steps first, then candidates as they came in."""
        return -self.step.position, self.shared_by[0].place

    def task(self) -> Task:
        """The work as it is sent to a worker."""
        stage = self.step.stage
        inputs = [(made.record.kind, made.payload) for made in self.inputs]
        limit = stage.time_limit_seconds
        return Task(self.digest, stage.name, self.step.settings_json, inputs, self.seed, self.attempt, limit)


class Board:
    """Candidates under way and the work they need; :attr:`batch` collects what is to be written."""

    def __init__(self, chain: Chain, cache: Cache) -> None:
        self._chain = chain
        self._cache = cache
        self._works: dict[str, Work] = {}
        self._ready: list[Work] = []
        self._unresolved: list[Work] = []
        self._unwritten: dict[str, tuple[Made, ...]] = {}
        self._failed: dict[str, Failure] = {}
        self._first: dict[str, tuple[int, int]] = {}
        self._settled: set[str] = set()
        self._admitted = 0
        self.batch = Batch()
        self.glances: list[Glance] = []
        self.done = 0
        self.failed = 0

    @property
    def ready(self) -> int:
        """How much work could be handed out now."""
        return len(self._ready)

    # Candidates come in

    def remember(self, finished: Iterable[tuple[CandidateState, LibraryRow]]) -> None:
        """Learn which species earlier runs have finished, so that later twins are marked as duplicates."""
        rows = [(state, self._row(row)) for state, row in finished]
        steps = self._chain.entry_steps
        works = {(made.digest, step.position): self._digest(step, [made]) for _, made in rows for step in steps}
        known = self._cache.known_work(list(works.values()))
        for state, row in rows:
            digests: dict[Kind, str] = {LibraryRow: row.digest}
            for step in steps:
                made = zip(step.stage.makes, known.get(works[row.digest, step.position], ()), strict=False)
                digests.update((kind, digest) for kind, digest in made if kind in step.gives)
            self._note_species(digests, (state.row_number, state.id), settled=True)

    def admit(self, candidates: Iterable[tuple[CandidateState, LibraryRow]]) -> None:
        """Take candidates on and find out what they need."""
        self._take_on(candidates, self._chain.steps, None)

    def glance(
        self, candidates: Iterable[tuple[CandidateState, LibraryRow]], steps: Sequence[Step], wanted: frozenset[str]
    ) -> None:
        """Run these steps alone and leave wanted quantities in :attr:`glances`; the work is kept, no outcome is."""
        self._take_on(candidates, steps, wanted)

    def _take_on(
        self,
        candidates: Iterable[tuple[CandidateState, LibraryRow]],
        steps: Sequence[Step],
        glance: frozenset[str] | None,
    ) -> None:
        for state, row in candidates:
            self._admitted += 1
            made: dict[Kind, Made] = {LibraryRow: self._row(row)}
            self._advance(Active(state.id, state.row_number, self._admitted, glance, made, list(steps)))
        self._resolve()

    def next_task(self) -> Task:
        """The most urgent work that is ready."""
        return heapq.heappop(self._ready).task()

    # Results come in

    def deliver(self, task: Task, reply: Reply) -> None:
        """Book one result: pass records on, try once more, or fail."""
        work = self._works[task.key]
        reply, made = self._read(work, reply)
        self.batch.attempts.append(self._attempt_row(work, reply))
        if reply.ok:
            self._keep(work, made)
            self._complete(work, made)
        elif reply.disturbed and work.disturbed < DISTURBANCES:
            work.disturbed += 1
            heapq.heappush(self._ready, work)
        elif reply.recoverable and work.attempt < ATTEMPTS:
            work.attempt += 1
            heapq.heappush(self._ready, work)
        else:
            self._fail(work, Failure(reply.code, reply.message))
        self._resolve()

    def written(self) -> None:
        """The batch is in the store: begin a new one."""
        self.batch = Batch()
        self._unwritten.clear()

    def _read(self, work: Work, reply: Reply) -> tuple[Reply, tuple[Made, ...]]:
        if not reply.ok:
            return reply, ()
        try:
            return reply, tuple(Made.read(self._chain.kinds[kind], payload) for kind, payload in reply.records)
        except ValidationError as error:
            fault = error.errors(include_url=False)[0]
            place = ".".join(map(str, fault["loc"]))
            message = f"the stage returned a record that is not valid: {place}: {fault['msg']}"
            bad = Reply(False, [], "bad_output", message, False, reply.seconds, reply.cpu_seconds, reply.versions)
            return bad, ()

    def _attempt_row(self, work: Work, reply: Reply) -> AttemptRow:
        return AttemptRow(
            work_digest=work.digest,
            stage=work.step.stage.name,
            version=work.step.stage.version,
            attempt=work.attempt,
            ok=reply.ok,
            seconds=reply.seconds,
            cpu_seconds=reply.cpu_seconds,
            reason_code=reply.code or None,
            reason=reply.message or None,
            versions=reply.versions,
            host=HOST,
            candidate_id=work.shared_by[0].id,
        )

    def _keep(self, work: Work, made: tuple[Made, ...]) -> None:
        stage = work.step.stage
        digests = tuple(one.digest for one in made)
        self.batch.records += [(one.digest, one.record.kind, one.payload) for one in made]
        self.batch.works.append(WorkRow(work.digest, stage.name, stage.version, work.step.settings_json, digests))
        self._unwritten[work.digest] = made

    def _complete(self, work: Work, made: tuple[Made, ...]) -> None:
        del self._works[work.digest]
        for active in work.shared_by:
            active.waiting -= 1
            active.made.update((type(one.record), one) for one in made if type(one.record) in work.step.gives)
            self._advance(active)

    def _fail(self, work: Work, failure: Failure) -> None:
        del self._works[work.digest]
        self._failed[work.digest] = failure
        for active in work.shared_by:
            active.waiting -= 1
            active.failures[work.step.position] = failure
            self._advance(active)

    # Candidates move on

    def _advance(self, active: Active) -> None:
        """Begin every step whose needs are met; finish the candidate when nothing is left to wait for."""
        if active.species is None:
            digests = {kind: one.digest for kind, one in active.made.items()}
            active.species = self._note_species(digests, (active.row_number, active.id), settled=False)
        for step in [step for step in active.todo if active.made.keys() >= set(step.stage.needs)]:
            active.todo.remove(step)
            self._begin(active, step)
        if not active.waiting:
            self._finish(active)

    def _begin(self, active: Active, step: Step) -> None:
        inputs = [active.made[kind] for kind in step.stage.needs]
        digest = self._digest(step, inputs)
        if digest in self._failed:
            active.failures[step.position] = self._failed[digest]
            return
        active.waiting += 1
        if digest in self._works:
            self._works[digest].shared_by.append(active)
            return
        seed = work_seed((made.record.kind, made.digest) for made in inputs)
        work = self._works[digest] = Work(digest, step, inputs, seed, [active])
        self._unresolved.append(work)

    def _resolve(self) -> None:
        """Take what is known from this run or from the store; the rest becomes ready."""
        while self._unresolved:
            works, self._unresolved = self._unresolved, []
            found = self._known(works)
            for work in works:
                if work.digest in found:
                    self._complete(work, found[work.digest])
                else:
                    heapq.heappush(self._ready, work)

    def _known(self, works: list[Work]) -> dict[str, tuple[Made, ...]]:
        found = {work.digest: made for work in works if (made := self._unwritten.get(work.digest))}
        known = self._cache.known_work([work.digest for work in works if work.digest not in found])
        payloads = self._cache.load_records([digest for records in known.values() for digest in records])
        for digest, records in known.items():
            made = self._read_known([payloads[record] for record in records if record in payloads])
            if made is not None and len(made) == len(records):
                found[digest] = made
        return found

    def _read_known(self, payloads: list[tuple[str, str]]) -> tuple[Made, ...] | None:
        """Records from the store, or None when they no longer fit their type and must be made again."""
        try:
            return tuple(Made.read(self._chain.kinds[kind], payload) for kind, payload in payloads)
        except (ValidationError, KeyError):
            return None

    # Candidates go out

    def _finish(self, active: Active) -> None:
        root = self._root_cause(active)
        essential = root is not None and self._chain.steps[root].essential
        if active.glance is not None:
            records = [one.record for one in active.made.values()]
            self.glances.append(Glance.at(active.id, records, active.glance, failed=essential))
            return
        failure = active.failures[root] if root is not None else None
        self.batch.links += [(active.id, one.record) for kind, one in active.made.items() if kind is not LibraryRow]
        self.batch.outcomes.append(
            CandidateOutcome(
                candidate_id=active.id,
                status="failed" if essential else "done",
                failed_stage=None if root is None else self._chain.steps[root].stage.name,
                reason_code=failure.code if failure else None,
                reason=failure.reason if failure else None,
                duplicate_of=self._duplicate_of(active),
            )
        )
        self.done += not essential
        self.failed += essential

    def _root_cause(self, active: Active) -> int | None:
        """Position of the failure to report: the first that costs a wanted quantity, else the first."""
        essential = [position for position in active.failures if self._chain.steps[position].essential]
        return min(essential or active.failures, default=None)

    def _duplicate_of(self, active: Active) -> int | None:
        """Id of the first row with the same species, unless this is the one."""
        if active.species is None:
            return None
        self._settled.add(active.species)
        first = self._first[active.species][1]
        return first if first != active.id else None

    def _note_species(self, digests: Mapping[Kind, str], who: tuple[int, int], *, settled: bool) -> str | None:
        """Digest of what later steps take from the entry steps, None while that is not complete.

        The lowest row is the first of its species, except that one whose outcome is written stays the first.
        """
        needed = self._chain.species_kinds
        if not needed or not all(kind in digests for kind in needed):
            return None
        species = content_digest(*(digests[kind] for kind in needed))
        first = self._first.setdefault(species, who)
        if species not in self._settled:
            self._first[species] = min(first, who)
        if settled:
            self._settled.add(species)
        return species

    # Names

    def _row(self, row: LibraryRow) -> Made:
        return Made(row, row.canonical_json, row.digest)

    def _digest(self, step: Step, inputs: Iterable[Made]) -> str:
        named = [(made.record.kind, made.digest) for made in inputs]
        return work_digest(step.stage.name, step.stage.version, step.settings_json, named)
