"""The stages of the main path in process, as a screen runs them, with what they made kept in a folder.

Run as a script it fills that folder: ``python prediction.py FOLDER`` reads JSON pairs [smiles, medium] from
standard input. A failed pair leaves nothing behind, so that asking for it again raises the reason.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Iterable, Sequence
from functools import cache, cached_property
from importlib.resources import files
from pathlib import Path
from typing import Any

import orchil_stages
from orchil.digests import work_seed
from orchil_schemas import (
    Band,
    Context,
    Geometry,
    Identity,
    Inputs,
    LibraryRow,
    Medium,
    Orbitals,
    Record,
    Stage,
    StageError,
    StateAnalysis,
    Transitions,
    Triplets,
    all_records,
    content_digest,
)
from orchil_stages.calibrate import Calibrate
from orchil_stages.embed import Embed
from orchil_stages.excite import Excite
from orchil_stages.intake import Intake
from orchil_stages.relax import Relax

STATES = 24
"""The Bb bands of acenes lie high: more states than a screen keeps."""
KINDS = {kind.kind: kind for kind in all_records()}
FEW = 6
"""So many missing predictions are made in this process; starting others costs more."""
SOURCES = {
    "intake": ("intake", "medium"),
    "embed": ("embed",),
    "relax": ("relax", "ground_state"),
    "excite": ("excite", "electron", "darkness", "ground_state"),
    "calibrate": ("calibrate", "medium"),
}
"""Folders whose code and data decide what a stage makes: no forgotten version bump may hide a change."""
ONE_THREAD = {f"{name}_NUM_THREADS": "1" for name in ("OMP", "OPENBLAS", "MKL")}
WORKER_SECONDS = 1500


class Prediction:
    """What the stages say about one pair; each stage runs when something of it is first asked for."""

    def __init__(self, smiles: str, medium: str, folder: Path) -> None:
        self._row = LibraryRow(structure=smiles, medium=medium)
        self._folder = folder

    @cached_property
    def _intake(self) -> dict[type[Record], Record]:
        return run_stage(Intake(), {LibraryRow: self._row}, {}, self._folder)

    @cached_property
    def _relaxed(self) -> dict[type[Record], Record]:
        embedded = run_stage(Embed(), self._intake, {}, self._folder)
        return run_stage(Relax(), embedded, {}, self._folder)

    @cached_property
    def _excited(self) -> dict[type[Record], Record]:
        return run_stage(Excite(), self._relaxed, {"states": STATES}, self._folder)

    @cached_property
    def _calibrated(self) -> dict[type[Record], Record]:
        return run_stage(Calibrate(), self._excited, {}, self._folder)

    @property
    def identity(self) -> Identity:
        return _the(Identity, self._intake)

    @property
    def medium(self) -> Medium:
        return _the(Medium, self._intake)

    @property
    def geometry(self) -> Geometry:
        return _the(Geometry, self._relaxed)

    @property
    def orbitals(self) -> Orbitals:
        return _the(Orbitals, self._excited)

    @property
    def transitions(self) -> Transitions:
        return _the(Transitions, self._excited)

    @property
    def analysis(self) -> StateAnalysis:
        return _the(StateAnalysis, self._excited)

    @property
    def triplets(self) -> Triplets:
        return _the(Triplets, self._excited)

    @property
    def band(self) -> Band:
        return _the(Band, self._calibrated)


def _the(kind: type[Any], records: dict[type[Record], Record]) -> Any:
    return records[kind]


class Predictor:
    """``predictor(smiles, medium)`` gives the prediction, made once."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        self._made: dict[tuple[str, str], Prediction] = {}

    def __call__(self, smiles: str, medium: str) -> Prediction:
        return self._made.setdefault((smiles, medium), Prediction(smiles, medium, self._folder))

    def many(self, pairs: Iterable[tuple[str, str]], processes: int = 2) -> list[Prediction]:
        """The predictions of all pairs in order; what is missing is made by several processes."""
        wanted = list(pairs)
        missing = sorted({pair for pair in wanted if pair not in self._made}, key=lambda pair: -len(pair[0]))
        if len(missing) > FEW:
            fill(self._folder, missing, processes)
        return [self(smiles, medium) for smiles, medium in wanted]


def run_stage(
    stage: Stage, records: dict[type[Record], Record], given: dict[str, Any], folder: Path
) -> dict[type[Record], Record]:
    """The records with those of the stage added, read from the folder where it ran before."""
    settings = stage.Settings(**given)
    inputs = [records[kind] for kind in stage.needs]
    path = folder / f"{stage.name}-{_work_name(stage, settings.model_dump_json(), inputs)}.json"
    if path.exists():
        made = [KINDS[kind](**fields) for kind, fields in json.loads(path.read_text(encoding="utf-8"))]
    else:
        made = _run_twice_if_needed(stage, inputs, settings)
        _write(path, json.dumps([[record.kind, record.model_dump(mode="json")] for record in made]))
    return records | {type(record): record for record in made}


def _run_twice_if_needed(stage: Stage, inputs: list[Record], settings: Any) -> list[Record]:
    """The records; a recoverable failure is tried once more, as a screen does."""
    seed = work_seed((record.kind, record.digest) for record in inputs)
    with tempfile.TemporaryDirectory() as scratch:
        try:
            return list(stage.run(Inputs(inputs), settings, Context(Path(scratch), seed)))
        except StageError as error:
            if not error.recoverable:
                raise
            return list(stage.run(Inputs(inputs), settings, Context(Path(scratch), seed, attempt=2)))


def _work_name(stage: Stage, settings: str, inputs: Sequence[Record]) -> str:
    versions = json.dumps(dict(stage.found().versions), sort_keys=True)
    digests = [record.digest for record in inputs]
    return content_digest(stage.name, stage.version, settings, versions, code_digest(stage.name), *digests)[:40]


@cache
def code_digest(stage: str) -> str:
    """Digest of the code, tables and trained numbers behind a stage."""
    room = files(orchil_stages)
    paths = [path for folder in SOURCES[stage] for path in Path(str(room / folder)).rglob("*")]
    kept = sorted(path for path in paths if path.suffix in {".py", ".csv", ".json"})
    return content_digest(*(path.read_text(encoding="utf-8") for path in kept))


def _write(path: Path, text: str) -> None:
    """Whole or not at all: other processes read the folder."""
    with tempfile.NamedTemporaryFile("w", dir=path.parent, delete=False, encoding="utf-8") as out:
        out.write(text)
    Path(out.name).replace(path)


def fill(folder: Path, pairs: Sequence[tuple[str, str]], processes: int) -> None:
    """Make the predictions of the pairs in the folder with fresh processes of one thread each."""
    command = [sys.executable, str(Path(__file__).resolve()), str(folder)]
    running = [
        subprocess.Popen(
            command, stdin=subprocess.PIPE, stdout=subprocess.DEVNULL, env=os.environ | ONE_THREAD, text=True
        )
        for _ in range(processes)
    ]
    for number, process in enumerate(running):
        assert process.stdin is not None
        process.stdin.write(json.dumps(pairs[number::processes]))
        process.stdin.close()
    for process in running:
        assert process.wait(WORKER_SECONDS) == 0, "a process that makes predictions broke; its error is above"


def fill_quietly(folder: Path, pairs: Iterable[Sequence[str]]) -> None:
    """Every pair up to its band; typed failures are left for the one who asks."""
    for smiles, medium in pairs:
        prediction = Prediction(smiles, medium, folder)
        try:
            _ = prediction.band
        except (StageError, FileNotFoundError):
            continue


if __name__ == "__main__":
    fill_quietly(Path(sys.argv[1]), json.load(sys.stdin))
