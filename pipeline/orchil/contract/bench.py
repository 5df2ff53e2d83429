"""Runs stages for the contract kit with the engine's own board, supervisor and workers, without a store."""

from __future__ import annotations

import atexit
import os
import tempfile
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property, lru_cache
from pathlib import Path

from orchil_schemas import Brief, LibraryRow, Pick, Record, Stage

from orchil.board import Board
from orchil.chain import Chain, Kind, Step, resolve
from orchil.digests import work_digest, work_seed
from orchil.errors import RequestError
from orchil.messages import Payload, Reply, Task
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.store import CandidateState
from orchil.supervisor import Supervisor

PATIENCE = 1.0


@dataclass
class Finished:
    """Work that is done, by digest, for the board to find again."""

    works: dict[str, tuple[str, ...]] = field(default_factory=dict)
    records: dict[str, tuple[str, str]] = field(default_factory=dict)

    def known_work(self, digests: Iterable[str]) -> dict[str, tuple[str, ...]]:
        """Digests of the records of those works that are finished."""
        return {digest: self.works[digest] for digest in digests if digest in self.works}

    def load_records(self, digests: Iterable[str]) -> dict[str, tuple[str, str]]:
        """(kind, JSON text) of records by digest."""
        return {digest: self.records[digest] for digest in digests if digest in self.records}


class Bench:
    """One worker and what it has done so far; its home and its temporary folder are watched for strange files.

    What libraries keep in the user's folder for caches is theirs: that folder is not watched.
    """

    def __init__(self) -> None:
        self._folder = tempfile.TemporaryDirectory(prefix="orchil-contract-")
        self._home, self._cache = (Path(self._folder.name, name) for name in ("home", "cache"))
        self._home.mkdir()
        self._cache.mkdir()
        self.finished = Finished()

    @cached_property
    def pool(self) -> Supervisor:
        """The worker, started when it is first needed."""
        places = dict.fromkeys(("HOME", "TMPDIR"), str(self._home))
        return Supervisor(1, environment={**places, "XDG_CACHE_HOME": str(self._cache)})

    def close(self) -> None:
        """End the worker and remove its home."""
        self.pool.close()
        self._folder.cleanup()

    def renew(self) -> None:
        """Go on with a new worker, which remembers nothing."""
        self.pool.close()
        del self.pool

    def files(self) -> set[Path]:
        """Files in the home and in the temporary folder of the worker."""
        return {path for path in self._home.rglob("*") if path.is_file()}

    def run(self, task: Task) -> Reply:
        """One task as in a screen, with its hard deadline."""
        self.pool.submit(task)
        while True:
            for result in self.pool.wait(PATIENCE):
                return result.reply

    def records(self, chain: Chain, rows: Mapping[str, LibraryRow]) -> dict[str, dict[Kind, Record]]:
        """What the steps of ``chain`` make of each row, by the name of the row."""
        board = Board(chain, self.finished)
        names = list(rows)
        states = [
            (CandidateState(at, at, name, row.structure, row.format, row.medium, row.charge, "waiting"), row)
            for at, (name, row) in enumerate(rows.items())
        ]
        board.admit(states)
        while board.ready:
            task = board.next_task()
            board.deliver(task, self.run(task))
        self.finished.works.update((work.digest, tuple(work.records)) for work in board.batch.works)
        self.finished.records.update((digest, (kind, text)) for digest, kind, text in board.batch.records)
        made: dict[str, dict[Kind, Record]] = {name: {LibraryRow: row} for name, row in rows.items()}
        for at, record in board.batch.links:
            made[names[at]][type(record)] = record
        return made


@lru_cache(maxsize=1)
def shared(plugins: str) -> Bench:
    """The bench for one choice of plugins; workers load them once, when they start."""
    bench = Bench()
    atexit.register(bench.close)
    return bench


def bench() -> Bench:
    """The bench for the plugins of now."""
    return shared(os.environ.get(EXTRA_PLUGINS, ""))


def chain_before(registry: Registry, stage: Stage) -> Chain:
    """The steps that lead to the needs of ``stage``; :class:`RequestError` when a need cannot be made."""
    use = {kind.kind: stage.name for kind in stage.makes}
    brief = Brief.model_construct(title="contract kit", medium="gas phase", want=(), pick=Pick(), use=use, stage={})
    resolved = resolve(registry, brief)
    if stage.name not in [step.stage.name for step in resolved.steps]:
        raise RequestError(f"stage {stage.name} has no place in the chain", *resolved.skipped)
    needed, steps = set(stage.needs), list[Step]()
    for step in reversed(resolved.steps):
        if step.stage.name != stage.name and needed.intersection(step.gives):
            needed.update(step.stage.needs)
            steps.insert(0, step)
    return Chain(tuple(replace(step, position=at, essential=True) for at, step in enumerate(steps)), ())


def task_for(stage: Stage, settings_json: str, inputs: Sequence[Record], *, seconds: float | None = None) -> Task:
    """The task that the engine would send to a worker."""
    payloads: list[Payload] = [(record.kind, record.canonical_json) for record in inputs]
    named = [(record.kind, record.digest) for record in inputs]
    limit = stage.time_limit_seconds if seconds is None else seconds
    digest = work_digest(stage.name, stage.version, settings_json, named)
    return Task(digest, stage.name, settings_json, payloads, work_seed(named), 1, limit)
