"""One stage on the bench: what it was given, what it made of it, and the checks it has to pass."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from orchil_schemas import LibraryRow, LibraryStage, Record, Stage, canonical_json

from orchil.briefs import suggestion
from orchil.errors import RequestError
from orchil.messages import Reply, Task
from orchil.registry import Registry

from . import declared, library, working
from .bench import Bench, bench, chain_before, task_for
from .molecules import MOLECULES, ODD

Check = Callable[["Kit"], None]


@dataclass(frozen=True)
class Run:
    """A task that the stage was given and what it answered."""

    task: Task
    reply: Reply


class Kit:
    """The stage called ``stage`` with what the checks need; ``settings`` as a brief would give them.

    ``molecules`` are the names of those that a dear stage is run on, all of :data:`MOLECULES` where it is left out.
    :class:`RequestError` when no plugin offers such a stage; it says which plugins were left out and why.
    """

    def __init__(
        self, stage: str, settings: Mapping[str, Any] | None = None, *, molecules: Iterable[str] = tuple(MOLECULES)
    ) -> None:
        self.registry = Registry.load()
        known: dict[str, Stage | LibraryStage] = {**self.registry.stages, **self.registry.library_stages}
        if stage not in known:
            raise RequestError(
                f'no stage "{stage}", {suggestion(stage, known) or "is its plugin installed?"}',
                *map(str, self.registry.problems),
            )
        self.stage: Any = known[stage]
        self.settings = self.stage.Settings(**(settings or {}))
        self.strange_files: set[str] = set()
        self._molecules = {name: MOLECULES[name] for name in molecules}

    @property
    def checks(self) -> tuple[Check, ...]:
        """The checks for this sort of stage."""
        return (*declared.CHECKS, *(working.CHECKS if isinstance(self.stage, Stage) else library.CHECKS))

    @property
    def settings_json(self) -> str:
        """The settings as they enter the name of work."""
        return canonical_json(self.settings.model_dump(mode="json"))

    @property
    def bench(self) -> Bench:
        """Where the stage is run."""
        return bench()

    @cached_property
    def runs(self) -> dict[str, Run]:
        """The stage on the molecules of the kit; on those at least that the stages before it could use."""
        return self._runs(self._molecules)

    @cached_property
    def odd_runs(self) -> dict[str, Run]:
        """The stage on odd rows, as far as they come to it."""
        return self._runs(ODD)

    @property
    def successes(self) -> dict[str, Run]:
        """Those runs that came to records."""
        return {name: run for name, run in self.runs.items() if run.reply.ok}

    def records(self, run: Run) -> list[Record]:
        """The records of a run, read as the engine reads them."""
        kinds = {kind.kind: kind for kind in self.stage.makes}
        return [kinds[kind].model_validate_json(text) for kind, text in run.reply.records]

    def _runs(self, rows: Mapping[str, LibraryRow]) -> dict[str, Run]:
        made = self.bench.records(chain_before(self.registry, self.stage), rows)
        tasks = {
            name: task_for(self.stage, self.settings_json, [records[kind] for kind in self.stage.needs])
            for name, records in made.items()
            if records.keys() >= set(self.stage.needs)
        }
        before = self.bench.files()
        runs = {name: Run(task, self.bench.run(task)) for name, task in tasks.items()}
        self.strange_files |= {path.name for path in self.bench.files() - before}
        return runs
