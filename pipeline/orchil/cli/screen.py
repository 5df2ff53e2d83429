"""`orchil screen` and `orchil rank`."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from orchil.errors import OrchilError, RunError
from orchil.progress import for_stream
from orchil.runner import Outcome
from orchil.screening import Plan, checked_brief, plan, rescore, screen
from orchil.store import Store
from orchil.supervisor import Supervisor

from . import BROKE, DONE, SOME_FAILED
from .common import loaded_registry, remark
from .tables import console, missing, ranking_table

GIB = 1 << 30


@dataclass(frozen=True)
class Request:
    """What to screen, against what, and where to keep it."""

    library: Path
    brief: Path
    limit: int | None
    store: str


@dataclass(frozen=True)
class Effort:
    """Worker processes, GiB for each, and whether failures are tried again."""

    workers: int
    memory_gib: float
    retry_failed: bool


def run_screen(request: Request, effort: Effort, top: int) -> int:
    """Screen, rank, print the top; returns the exit code."""
    made = plan(request.library, request.brief, loaded_registry(), limit=request.limit)
    remark(made.chain.skipped)
    with Store.open(request.store, create=True) as store:
        outcome = _screen(made, store, effort)
        failed = sum(state.status == "failed" for state in store.candidates())
        _report(store, made.brief.medium, top)
    if outcome.stopped and outcome.left:
        remark([f"stopped with {outcome.left} candidates left; the same command continues"])
        return BROKE
    return SOME_FAILED if failed else DONE


def _screen(made: Plan, store: Store, effort: Effort) -> Outcome:
    with Supervisor(effort.workers, memory_bytes=int(effort.memory_gib * GIB)) as pool:
        try:
            return screen(made, store, pool=pool, progress=for_stream(), retry_failed=effort.retry_failed)
        except KeyboardInterrupt:
            raise RunError("stopped at once; the same command continues") from None


def run_rank(target: str, brief_path: Path, top: int) -> int:
    """Rank a store against another brief; returns the exit code."""
    brief, chain = checked_brief(brief_path, loaded_registry())
    with Store.open(target, create=False) as store:
        remark(rescore(store, brief, chain))
        _report(store, brief.medium, top)
    return DONE


def _report(store: Store, medium: str, top: int) -> None:
    """The best on stdout; failures and cautions on stderr."""
    ranking = store.ranking(limit=top) if top else store.ranking(limit=1)
    ranked = ranking[ranking["rank"].notna()].head(top)
    if len(ranked):
        out = console()
        out.print(ranking_table(ranked.assign(cautions=ranked["cautions"].map(_mark)), medium, out.width))
    remark(
        f"{row['candidate']}: {row['cautions']}" for row in ranked.to_dict("records") if not missing(row["cautions"])
    )
    remark(_failure_counts(store))


def _mark(cautions: object) -> str:
    return "" if missing(cautions) else "see below"


def _failure_counts(store: Store) -> list[str]:
    """Failed candidates by stage and reason, most frequent first."""
    sql = "SELECT failed_stage, reason_code, count(*) AS n FROM failures GROUP BY 1, 2 ORDER BY n DESC"
    try:
        counts = store.query(sql)
    except OrchilError:  # a database server answers its own client, not `query`
        return []
    return [f"{row.n} failed: {row.failed_stage}, {row.reason_code}" for row in counts.itertuples()]
