"""`orchil screen` and `orchil rank`."""

from __future__ import annotations

import shlex
from dataclasses import dataclass
from pathlib import Path

from orchil.budget import Budget, budget_of
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
    """Worker processes, GiB for each, whether failures are tried again, and when the night ends."""

    workers: int
    memory_gib: float
    retry_failed: bool
    until: str | None = None
    hours: float | None = None


def run_screen(request: Request, effort: Effort, top: int) -> int:
    """Screen, rank, print the top; returns the exit code."""
    budget = budget_of(effort.until, effort.hours)
    made = plan(request.library, request.brief, loaded_registry(), limit=request.limit)
    remark(made.chain.skipped)
    with Store.open(request.store, create=True) as store:
        outcome = _screen(made, store, effort, budget)
        failed = sum(state.status == "failed" for state in store.candidates())
        _report(store, made.brief.medium, top)
        continuation = _command(request, effort, top, str(store.location))
    if outcome.time_up and not outcome.stopped:
        remark(_left(outcome, continuation))
        return BROKE
    if outcome.stopped and outcome.left:
        remark([f"stopped with {outcome.left} candidates left; the same command continues"])
        return BROKE
    return SOME_FAILED if failed else DONE


def _left(outcome: Outcome, continuation: str) -> list[str]:
    """The last words of a night that was too short."""
    finished = outcome.done + outcome.failed
    return [
        f"the time is up: {finished} of {finished + outcome.left} candidates were finished, the most promising first; "
        f"{outcome.left} are left, waiting",
        f"to continue: {continuation}",
    ]


def _command(request: Request, effort: Effort, top: int, store: str) -> str:
    """The command that continues; ``store`` shows no password."""
    options = {"--brief": request.brief, "--store": store, "--workers": effort.workers, "--memory": effort.memory_gib}
    options |= {"--limit": request.limit, "--until": effort.until, "--hours": effort.hours, "--top": top}
    words = [str(word) for name, value in options.items() if value is not None for word in (name, value)]
    again = ["--retry-failed"] if effort.retry_failed else []
    return shlex.join(["orchil", "screen", str(request.library), *words, *again])


def _screen(made: Plan, store: Store, effort: Effort, budget: Budget | None) -> Outcome:
    with Supervisor(effort.workers, memory_bytes=int(effort.memory_gib * GIB)) as pool:
        try:
            progress, again = for_stream(), effort.retry_failed
            return screen(made, store, pool=pool, progress=progress, retry_failed=again, budget=budget)
        except KeyboardInterrupt:
            raise RunError("stopped at once; the same command continues") from None


def run_rank(target: str, brief_path: Path, library: Path | None, top: int) -> int:
    """Rank a store against another brief or with the measured columns of a library; returns the exit code."""
    brief, chain = checked_brief(brief_path, loaded_registry())
    with Store.open(target, create=False) as store:
        remark(rescore(store, brief, chain, library))
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
