"""The contract between the engine and a stage. Write a stage against this module alone."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol, TypeVar, runtime_checkable

import numpy as np

from .arrays import FloatArray
from .base import Frozen, Record
from .brief import Brief

R = TypeVar("R", bound=Record)


class NoSettings(Frozen):
    """Settings of a stage that has none."""


@dataclass(frozen=True)
class Availability:
    """Is what a stage depends on installed? ``hint`` says how to get it; ``versions`` go into provenance."""

    ok: bool
    versions: Mapping[str, str] = field(default_factory=dict)
    hint: str = ""


class Inputs:
    """The records a stage asked for, by type: ``inputs[Geometry]``."""

    def __init__(self, records: Iterable[Record]) -> None:
        self._records = {type(record): record for record in records}

    def __getitem__(self, kind: type[R]) -> R:
        record = self._records[kind]
        assert isinstance(record, kind)
        return record


@dataclass(frozen=True)
class Context:
    """What a stage may use besides its inputs.

    ``seed`` (> 0) is derived from the inputs, so the same work has the same seed; ``attempt`` is 2 on the one retry
    after a recoverable failure; ``scratch`` is an empty private directory, removed afterwards.
    """

    scratch: Path
    seed: int
    attempt: int = 1
    deadline: float = float("inf")

    def seconds_left(self) -> float:
        """Seconds until the hard deadline of this stage (``time.monotonic`` based); stop before it."""
        return self.deadline - time.monotonic()


@dataclass(frozen=True)
class CheckResult:
    """What one check of `orchil check` found; ``detail`` is one line with the figures."""

    ok: bool
    detail: str = ""


@dataclass(frozen=True)
class Check:
    """A short check that this machine works as it should (a published value comes out, a part answers)."""

    name: str
    run: Callable[[], CheckResult]


@runtime_checkable
class Stage(Protocol):
    """One step of the chain for one candidate. Pure: same inputs, settings and seed, same records.

    Optional: a method ``check_brief(brief: Brief) -> list[str]`` that returns problems with the brief (an unknown
    medium, say) as sentences; the engine asks it before the first candidate and refuses the brief on any. Optional:
    ``on_request = True`` for a stage too dear for every candidate, which runs only where a brief names it or wants
    what it offers.
    """

    name: str
    version: str
    needs: tuple[type[Record], ...]
    makes: tuple[type[Record], ...]
    Settings: type[Frozen]
    time_limit_seconds: float

    def found(self) -> Availability:
        """Report whether the stage can run here; must not raise."""
        ...

    def run(self, inputs: Inputs, settings: Any, context: Context) -> Iterable[Record]:
        """Make the records named in ``makes``; raise :class:`orchil_schemas.errors.StageError` with a reason."""
        ...


@dataclass(frozen=True)
class Column:
    """One quantity over the library: arrays of length n, NaN where a candidate lacks it (or its interval)."""

    value: FloatArray
    low: FloatArray
    high: FloatArray
    coverage: FloatArray


@dataclass(frozen=True)
class LibraryTable:
    """The whole library as a library stage sees it: parallel sequences of length n.

    The user's measured values are columns too: ``measured_absorption_max_nm`` goes with ``absorption_max_nm``.
    ``medium`` is empty where a row names none and no stage has settled it.
    """

    candidate: Sequence[int]
    smiles: Sequence[str]
    columns: Mapping[str, Column]
    name: Sequence[str] = ()
    medium: Sequence[str] = ()

    def column(self, name: str) -> Column:
        """The column of one quantity; all NaN when no candidate has it."""
        if name in self.columns:
            return self.columns[name]
        empty = np.full(len(self.candidate), np.nan)
        return Column(empty, empty, empty, empty)


@runtime_checkable
class LibraryStage(Protocol):
    """A step that looks at the whole library at once, after the per-candidate stages (ranking, clustering).

    ``reads`` names the quantities it needs as columns, given the brief.
    """

    name: str
    version: str
    makes: tuple[type[Record], ...]
    Settings: type[Frozen]

    def found(self) -> Availability:
        """Report whether the stage can run here; must not raise."""
        ...

    def reads(self, brief: Brief, settings: Any) -> tuple[str, ...]:
        """Names of the quantities that must be in the table."""
        ...

    def run(self, table: LibraryTable, brief: Brief, settings: Any) -> Iterable[tuple[int, Record]]:
        """Yield (candidate, record) pairs."""
        ...
