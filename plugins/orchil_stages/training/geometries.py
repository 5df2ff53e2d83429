"""Relaxed geometries of the training dyes, kept in a cache folder so that a second run goes on where the
first stopped.
"""

from __future__ import annotations

import json
import multiprocessing
import os
import time
from collections.abc import Iterable, Iterator
from dataclasses import asdict, dataclass
from pathlib import Path

from orchil_schemas import Geometry, LibraryRow, StageError

from orchil_stages.by_hand import run_stages

CACHE_NAME = "geometries.jsonl"
LOOSE = {"gradient_norm": 3e-3, "energy_left_hartree": 5e-5, "max_gradients": 60}
"""Relaxation for training: a third of the gradients of a screen; the levels move by a few hundredths of an eV."""


@dataclass(frozen=True)
class Relaxed:
    """One dye relaxed in one medium, or the reason why it is not; ``geometry`` is the JSON of the record."""

    smiles: str
    medium: str
    geometry: str | None
    reason: str | None
    cpu_seconds: float


def relax_dyes(dyes: Iterable[tuple[str, str]], cache: Path, workers: int) -> Iterator[Relaxed]:
    """Relax (smiles, medium) pairs that the cache does not hold yet, writing each result as it comes."""
    cache.mkdir(parents=True, exist_ok=True)
    known = {(done.smiles, done.medium) for done in read_cache(cache)}
    todo = [dye for dye in dyes if dye not in known]
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ[name] = "1"
    with (
        multiprocessing.get_context("spawn").Pool(workers) as pool,
        (cache / CACHE_NAME).open("a", encoding="utf-8") as out,
    ):
        for done in pool.imap_unordered(relax_one, todo):
            out.write(json.dumps(asdict(done)) + "\n")
            out.flush()
            yield done


def read_cache(cache: Path) -> list[Relaxed]:
    """All results kept so far."""
    path = cache / CACHE_NAME
    if not path.exists():
        return []
    with path.open(encoding="utf-8") as lines:
        return [Relaxed(**json.loads(line)) for line in lines]


def relax_one(dye: tuple[str, str]) -> Relaxed:
    """The chain intake, embed, relax for one dye, as a screen runs it but for the looser end of the relaxation."""
    from orchil_stages.embed import Embed
    from orchil_stages.intake import Intake
    from orchil_stages.relax import Relax, RelaxSettings

    smiles, medium = dye
    start = time.process_time()
    geometry, reason = None, None
    try:
        row = LibraryRow(structure=smiles, medium=medium)
        made = run_stages(row, (Intake(), Embed(), Relax()), {"relax": RelaxSettings(**LOOSE)})
        geometry = made[Geometry].canonical_json
    except StageError as error:
        reason = f"{error.reason_code}: {error}"
    except Exception as error:
        reason = f"unexpected: {type(error).__name__}: {error}"
    return Relaxed(smiles, medium, geometry, reason, time.process_time() - start)
