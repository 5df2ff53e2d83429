"""Runs a stage on request for the best candidates of a finished screen; ranking and results stay as they are."""

from __future__ import annotations

from dataclasses import replace

from .asked import with_stage
from .chain import Chain, resolve
from .errors import RequestError
from .progress import Progress
from .registry import Registry
from .runner import Outcome, Runner
from .screening import COMPUTATION
from .store import CandidateState, ScreenInfo, Store
from .supervisor import Supervisor


def recompute(
    store: Store, registry: Registry, stage: str, top: int, *, pool: Supervisor, progress: Progress
) -> Outcome:
    """Run ``stage`` for the ``top`` best of the active screen; everything before it comes from the store.

    :class:`RequestError` for a stage that is not on request or not usable, and where the stages have changed since the
    screen: its results would then stand beside others.
    """
    with store.lock():
        active = store.active_screen()
        if active is None:
            raise RequestError("this store holds no screen yet: run `orchil screen` first")
        chain = _chain(registry, active, stage)
        candidates = _best_anew(store, top)
        runner = Runner(store, chain, with_stage(active.brief, stage), pool, progress)
        return runner.run(candidates)


def _chain(registry: Registry, active: ScreenInfo, stage: str) -> Chain:
    known = [name for name, found in registry.stages.items() if getattr(found, "on_request", False)]
    if stage not in known:
        raise RequestError(f'"{stage}" is no stage on request; there is {", ".join(known) or "none"}')
    brief = active.brief
    if resolve(registry, brief).computation(brief.medium) != active.versions.get(COMPUTATION):
        raise RequestError("stages or settings have changed since the screen: run `orchil screen` again first")
    chain = resolve(registry, with_stage(brief, stage))
    if stage not in [step.stage.name for step in chain.steps]:
        raise RequestError(
            f"stage {stage} cannot run here: {'; '.join(chain.skipped) or 'a record it needs is missing'}"
        )
    return chain


def _best_anew(store: Store, top: int) -> list[CandidateState]:
    """The best as waiting, and those that are finished, which a run must know of to tell duplicates."""
    ranking = store.ranking(limit=top)
    rows = {int(row) for row in ranking.loc[ranking["rank"].notna(), "row_number"]}
    states = [state for state in store.candidates() if state.status != "waiting"]
    return [replace(state, status="waiting") if state.row_number in rows else state for state in states]
