"""The whole of `orchil screen` and `orchil rank`: from files to a ranking in the store."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import islice
from pathlib import Path

from orchil_schemas import MEASURED, Brief, Record, Score

from . import briefs
from .budget import Budget
from .chain import Chain, LibraryStep, resolve
from .errors import RequestError, RunError
from .library import ParsedRow, read
from .progress import Progress
from .registry import Registry
from .runner import Outcome, Runner
from .store import Batch, CandidateOutcome, CandidateRow, CandidateState, Store
from .supervisor import Supervisor

READING = "reading"
"""Stands for the stage in the outcome of a row that could not be read."""
COMPUTATION = "computation"
"""Among the versions of a screen: names the medium, stages and settings that its results come from."""
ROWS_AT_ONCE = 5000


@dataclass(frozen=True)
class Plan:
    """A checked request: nothing in it can fail any more for a reason that was visible beforehand."""

    brief: Brief
    chain: Chain
    library: Path
    limit: int | None = None

    def rows(self) -> Iterator[ParsedRow]:
        """The rows of the library, read anew."""
        return islice(read(self.library), self.limit)


def plan(library_path: Path, brief_path: Path, registry: Registry, *, limit: int | None = None) -> Plan:
    """Read and check everything that can be wrong with a request; :class:`RequestError` lists it."""
    brief, chain = checked_brief(brief_path, registry)
    made = Plan(brief, chain, library_path, limit)
    for _ in made.rows():  # a fault in the last line shall stop the request before anything is stored
        pass
    return made


def checked_brief(path: Path, registry: Registry) -> tuple[Brief, Chain]:
    """A brief and its chain; every problem names the file."""
    brief = briefs.load(path)
    try:
        return brief, resolve(registry, brief)
    except RequestError as error:
        raise RequestError(*(f"{path.name}: {problem}" for problem in error.problems)) from error


def screen(
    made: Plan,
    store: Store,
    *,
    pool: Supervisor,
    progress: Progress,
    retry_failed: bool = False,
    budget: Budget | None = None,
) -> Outcome:
    """Run a plan to its end, or to that of its budget, and rank. Run again with the same store, it continues."""
    with store.lock():
        screen_id = _begin(store, made)
        unreadable = _add_rows(store, made.rows())
        _reopen_readable(store, _chosen(store, made.limit), unreadable)
        candidates = _chosen(store, made.limit)
        _fail_unreadable(store, candidates, unreadable)
        runnable = [state for state in candidates if state.row_number not in unreadable]
        runner = Runner(store, made.chain, made.brief, pool, progress, budget=budget)
        outcome = runner.run(runnable, retry_failed=retry_failed)
        for remark in rank(store, made.chain, made.brief, screen_id):
            progress.say(remark)
    return outcome


def rank(store: Store, chain: Chain, brief: Brief, screen_id: int) -> list[str]:
    """Run the library stages over what is in the store.

    Returns a sentence for each stage that failed; :class:`RunError` where that leaves the library without a ranking.
    """
    remarks: list[str] = []
    for step in chain.library_steps:
        try:
            made = _library_records(store, step, brief) if _has_work(store, step) else []
        except RunError as error:
            if Score in step.stage.makes:
                raise
            made, remarks = [], [*remarks, f"{error}: everything else is there"]
        store.put_library_records(screen_id, made, step.stage.makes)
    return remarks


def rescore(store: Store, brief: Brief, chain: Chain, library: Path | None = None) -> list[str]:
    """Rank a finished library against another brief; computes nothing physical. Returns remarks.

    The measured values of ``library`` take the place of those in the store.
    """
    rows = [] if library is None else _measured_rows(library)
    with store.lock():
        before = store.active_screen()
        if before is None:
            raise RequestError("this store holds no screen yet: run `orchil screen` first")
        computed = before.versions.get(COMPUTATION, "")
        new = store.update_measured(rows)
        versions = chain.versions() | {COMPUTATION: computed}
        screen_id = store.begin_screen(library=before.library, brief=brief, versions=versions)
        remarks = rank(store, chain, brief, screen_id)
    if new:
        remarks.append(f"{new} rows of the library are not in the store: `orchil screen` computes them")
    if computed == chain.computation(brief.medium):
        return remarks
    return [
        *remarks,
        "the medium, the stage settings or the stage versions differ from those of the stored results, which "
        "are ranked as they are: run `orchil screen` with this brief to compute them anew",
    ]


def _begin(store: Store, made: Plan) -> int:
    """Make the screen of the plan the active one; results of another computation go back to waiting first."""
    computation = made.chain.computation(made.brief.medium)
    before = store.active_screen()
    if before is not None and before.versions.get(COMPUTATION) != computation:
        store.forget_results(state.id for state in store.candidates() if state.status != "waiting")
    versions = made.chain.versions() | {COMPUTATION: computation}
    return store.begin_screen(library=made.library.name, brief=made.brief, versions=versions)


def _has_work(store: Store, step: LibraryStep) -> bool:
    """False for a stage that works with measured values where there are none."""
    needed = {name.removeprefix(MEASURED) for name in step.reads if name.startswith(MEASURED)}
    return not needed or bool(needed & store.measured_names())


def _measured_rows(library: Path) -> list[CandidateRow]:
    """The rows of a library for their measured values; :class:`RequestError` names each value that is none."""
    rows = list(read(library))
    faults = [f"{library.name}: row {row.row_number} ({row.name}): {row.error}" for row in rows if _bad_value(row)]
    if faults:
        raise RequestError(*faults)
    return [_candidate_row(row) for row in rows]


def _bad_value(row: ParsedRow) -> bool:
    return row.error is not None and row.error.startswith(MEASURED)


def _library_records(store: Store, step: LibraryStep, brief: Brief) -> list[tuple[int, Record]]:
    name = step.stage.name
    try:
        table = store.library_table(step.reads, anchored=not step.anchors)
        made = list(step.stage.run(table, brief, step.settings))
    except Exception as error:
        raise RunError(f"the library stage {name} failed: {type(error).__name__}: {error}") from error
    strange = next((record for _, record in made if type(record) not in step.stage.makes), None)
    if strange is not None:
        raise RunError(f"the library stage {name} returned a {type(strange).__name__}, which is not among its makes")
    return made


def _add_rows(store: Store, rows: Iterator[ParsedRow]) -> dict[int, str]:
    """Put the rows into the store (known ones stay); returns the reasons of unreadable ones by row number."""
    unreadable: dict[int, str] = {}
    while some := list(islice(rows, ROWS_AT_ONCE)):
        store.add_candidates([_candidate_row(row) for row in some])
        unreadable.update((row.row_number, row.error) for row in some if row.error)
    return unreadable


def _candidate_row(row: ParsedRow) -> CandidateRow:
    extra = row.extra | ({"reading note": row.note} if row.note else {})
    return CandidateRow(
        row.row_number, row.name, row.structure, row.format, row.medium, row.charge, extra, row.measured
    )


def _chosen(store: Store, limit: int | None) -> list[CandidateState]:
    candidates = store.candidates()
    return candidates if limit is None else [state for state in candidates if state.row_number <= limit]


def _reopen_readable(store: Store, candidates: Sequence[CandidateState], unreadable: dict[int, str]) -> None:
    """Rows that could not be read and now can wait again: a measured value may be corrected in the file."""
    store.forget_results(
        state.id
        for state in candidates
        if state.status == "failed" and state.failed_stage == READING and state.row_number not in unreadable
    )


def _fail_unreadable(store: Store, candidates: Sequence[CandidateState], unreadable: dict[int, str]) -> None:
    outcomes = [
        CandidateOutcome(state.id, "failed", READING, "bad_input", unreadable[state.row_number])
        for state in candidates
        if state.row_number in unreadable and state.status != "failed"
    ]
    if outcomes:
        store.commit(Batch(outcomes=outcomes))
