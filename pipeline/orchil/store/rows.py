"""What goes into the store and what comes out of it, as plain frozen rows."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from datetime import datetime, timezone
from typing import Any, Literal

from orchil_schemas import Brief, Record

Status = Literal["waiting", "done", "failed"]


def now() -> datetime:
    """The present moment in UTC."""
    return datetime.now(timezone.utc)


@dataclass(frozen=True, slots=True)
class CandidateRow:
    """One row of the library file; ``name`` is the user's id, ``extra`` every column Orchil does not know.

    ``measured`` is the user's own value by the name of the predicted quantity; it alone may change later.
    """

    row_number: int
    name: str
    structure: str
    format: str = "smiles"
    medium: str | None = None
    charge: int | None = None
    extra: Mapping[str, str] = field(default_factory=dict)
    measured: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class CandidateState:
    """A candidate and how far it is; ``failed_stage`` is also set where the failure cost no wanted quantity."""

    id: int
    row_number: int
    name: str
    structure: str
    format: str
    medium: str | None
    charge: int | None
    status: Status
    failed_stage: str | None = None


@dataclass(frozen=True, slots=True)
class ScreenInfo:
    """One screen: a brief over the library of this store."""

    id: int
    brief: Brief
    library: str
    versions: Mapping[str, str]
    created: datetime


@dataclass(frozen=True, slots=True)
class AttemptRow:
    """One try of a stage; ``candidate_id`` is the candidate it was run for (others may share the work).

    ``seconds`` is wall time; an unknown time is None.
    """

    work_digest: str
    stage: str
    version: str
    attempt: int
    ok: bool
    seconds: float | None
    cpu_seconds: float | None
    reason_code: str | None = None
    reason: str | None = None
    versions: Mapping[str, str] = field(default_factory=dict)
    host: str = ""
    finished_at: datetime = field(default_factory=now)
    candidate_id: int | None = None


@dataclass(frozen=True, slots=True)
class WorkRow:
    """Finished work: digest of (stage, version, settings, inputs), and digests of what it made, in order."""

    digest: str
    stage: str
    version: str
    settings_json: str
    records: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class CandidateOutcome:
    """Where a candidate ended; ``duplicate_of`` is the id of the earlier candidate it repeats."""

    candidate_id: int
    status: Status
    failed_stage: str | None = None
    reason_code: str | None = None
    reason: str | None = None
    duplicate_of: int | None = None


@dataclass(slots=True)
class Batch:
    """What one transaction writes; records are (digest, kind, payload JSON), links (candidate id, record)."""

    attempts: list[AttemptRow] = field(default_factory=list)
    works: list[WorkRow] = field(default_factory=list)
    records: list[tuple[str, str, str]] = field(default_factory=list)
    links: list[tuple[int, Record]] = field(default_factory=list)
    outcomes: list[CandidateOutcome] = field(default_factory=list)

    def __len__(self) -> int:
        return sum(len(getattr(self, part.name)) for part in fields(self))


@dataclass(frozen=True, slots=True)
class CandidatePage:
    """Everything known of one candidate, for display.

    ``row`` is its line of the view ``ranking``; ``records`` the payloads by kind; ``attempts`` and ``wants``
    are rows as dictionaries; ``repeated_by`` names the candidates marked as duplicates of this one;
    ``same_name`` are the ids of other candidates of the same name (for example in another medium).
    """

    candidate: CandidateState
    extra: Mapping[str, str]
    row: Mapping[str, Any]
    records: Mapping[str, dict[str, Any]]
    attempts: tuple[dict[str, Any], ...]
    wants: tuple[dict[str, Any], ...]
    repeated_by: tuple[str, ...]
    same_name: tuple[int, ...]

    @property
    def score(self) -> dict[str, Any] | None:
        """Rank, score, hit probability, Pareto front and pick in the active screen; None when not scored."""
        if self.row["rank"] is None:
            return None
        return {key: self.row[key] for key in ("rank", "score", "hit_probability", "pareto_front", "pick")}

    @property
    def duplicate_of(self) -> str | None:
        """Name of the earlier candidate this one repeats."""
        name: str | None = self.row["duplicate_of"]
        return name
