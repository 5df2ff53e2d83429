"""`orchil recompute`."""

from __future__ import annotations

from orchil.errors import RunError
from orchil.progress import for_stream
from orchil.recompute import recompute
from orchil.store import Store
from orchil.supervisor import Supervisor

from . import BROKE, DONE, SOME_FAILED
from .common import loaded_registry, remark
from .screen import GIB


def run_recompute(target: str, stage: str, top: int, workers: int, memory_gib: float) -> int:
    """Run a stage on request for the best; returns the exit code."""
    registry = loaded_registry()
    with Store.open(target, create=False) as store, Supervisor(workers, memory_bytes=int(memory_gib * GIB)) as pool:
        try:
            outcome = recompute(store, registry, stage, top, pool=pool, progress=for_stream())
        except KeyboardInterrupt:
            raise RunError("stopped at once; the same command continues") from None
        failures = _failures(store, stage)
    remark(failures)
    if outcome.left:
        return BROKE
    return SOME_FAILED if failures or outcome.failed else DONE


def _failures(store: Store, stage: str) -> list[str]:
    sql = "SELECT name AS candidate, reason FROM candidate WHERE failed_stage = ?"
    return [f"{row.candidate}: {row.reason}" for row in store.query(sql, (stage,)).itertuples()]
