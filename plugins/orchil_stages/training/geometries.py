"""Relaxed geometries of the training dyes, kept in a cache folder so that a second run goes on where the first stopped."""

from __future__ import annotations

import json
import multiprocessing
import os
import tempfile
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import asdict, dataclass
from pathlib import Path

from orchil_schemas import Context, Geometry, Inputs, LibraryRow, Record, StageError

CACHE_NAME = "geometries.jsonl"


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
    """The chain intake, embed, relax for one dye, exactly as a screen runs it."""
    from ..embed import Embed
    from ..intake import Intake
    from ..relax import Relax

    smiles, medium = dye
    start = time.process_time()
    records: list[Record] = [LibraryRow(structure=smiles, medium=medium)]
    reason = None
    try:
        for stage in (Intake(), Embed(), Relax()):
            with chain_context(smiles) as context:
                records.extend(stage.run(Inputs(records), stage.Settings(), context))
    except StageError as error:
        reason = f"{error.reason_code}: {error}"
    except Exception as error:
        reason = f"unexpected: {type(error).__name__}: {error}"
    found = next((record for record in records if isinstance(record, Geometry)), None)
    text = found.canonical_json if found else None
    return Relaxed(smiles, medium, text, reason, time.process_time() - start)


@contextmanager
def chain_context(smiles: str) -> Iterator[Context]:
    """A context for running a stage by hand."""
    with tempfile.TemporaryDirectory() as scratch:
        yield Context(scratch=Path(scratch), seed=chain_seed(smiles))


def chain_seed(smiles: str) -> int:
    """A positive seed that depends on the dye alone."""
    import hashlib

    return int(hashlib.sha256(smiles.encode()).hexdigest()[:7], 16) + 1
