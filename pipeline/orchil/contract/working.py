"""Checks of a stage at work, in a worker of the engine."""

from __future__ import annotations

import math
import pickle
from dataclasses import replace
from typing import TYPE_CHECKING

from orchil_schemas import Quantity, QuantityInfo, Record

if TYPE_CHECKING:
    from .kit import Kit, Run

UNTYPED = ("unexpected", "bad_output", "crashed", "timeout", "out_of_memory")
"""Reasons that the engine gives for faults which the stage did not foresee."""
CUT_OFF_SECONDS = 0.01


def works_on_the_molecules_of_the_kit(kit: Kit) -> None:
    """Records or a typed reason on every molecule that comes to the stage, records on one at least."""
    assert kit.runs, f"no molecule of the kit comes as far as {kit.stage.name}"
    for name, run in kit.runs.items():
        _assert_typed(name, run)
    reasons = {name: run.reply.message for name, run in kit.runs.items()}
    assert kit.successes, f"not one record: {reasons}"


def fails_typed(kit: Kit) -> None:
    """Odd rows, as far as they come to the stage, end in records or in a StageError with a sentence."""
    for name, run in kit.odd_runs.items():
        _assert_typed(name, run)


def gives_sound_quantities(kit: Kit) -> None:
    """Numbers are finite, in the declared unit, and inside their interval."""
    for name, run in kit.successes.items():
        for record in kit.records(run):
            infos = {info.name: info for info in record.offers}
            for one in record.quantities():
                _assert_sound(name, one, infos[one.name])


def is_deterministic(kit: Kit) -> None:
    """The same task gives the same records once more."""
    assert kit.successes, "no run came to records"
    for name, run in kit.successes.items():
        assert kit.bench.run(run.task).records == run.reply.records, f"{name}: other records at the second time"


def makes_records_that_keep(kit: Kit) -> None:
    """Records come back the same from JSON and from pickle."""
    for run in kit.successes.values():
        for record, (_, text) in zip(kit.records(run), run.reply.records, strict=True):
            assert record.canonical_json == text, f"{record.kind} does not come back the same from JSON"
            assert _unpickled(record) == record, f"{record.kind} does not come back the same from pickle"


def keeps_its_time_limit(kit: Kit) -> None:
    """No molecule of the kit takes half of the time limit."""
    for name, run in kit.runs.items():
        limit = kit.stage.time_limit_seconds
        assert run.reply.seconds < limit / 2, f"{name} took {run.reply.seconds:.1f} s of {limit:g} s"


def can_be_cut_off(kit: Kit) -> None:
    """Killed at a deadline, the stage leaves nothing behind that changes the next run, in a new process."""
    for name, run in list(kit.successes.items())[:1]:
        cut = kit.bench.run(replace(run.task, time_limit=CUT_OFF_SECONDS))
        assert cut.ok or cut.code == "timeout" or cut.code not in UNTYPED, f"{name}: {cut.code}: {cut.message}"
        kit.bench.renew()
        again = kit.bench.run(run.task)
        assert again.records == run.reply.records, f"{name}: other records in a new process after it was cut off"


def writes_nothing_outside_scratch(kit: Kit) -> None:
    """No file has appeared in the home or in the temporary folder of the worker."""
    assert kit.runs, f"no molecule of the kit comes as far as {kit.stage.name}"
    assert not kit.strange_files, f"files outside context.scratch: {', '.join(sorted(kit.strange_files))}"


def _assert_typed(name: str, run: Run) -> None:
    reply = run.reply
    assert reply.ok or reply.code not in UNTYPED, f"{name}: {reply.code}: {reply.message}; raise a StageError instead"
    assert reply.ok or len(reply.message.split()) > 2, f'{name}: "{reply.message}" is no sentence that helps'


def _assert_sound(name: str, one: Quantity, info: QuantityInfo) -> None:
    assert math.isfinite(one.value), f"{name}: {one.name} is not finite"
    assert one.unit == info.unit, f"{name}: {one.name} is in {one.unit}, but offered in {info.unit}"
    low = one.value if one.low is None else one.low
    high = one.value if one.high is None else one.high
    assert low <= one.value <= high, f"{name}: {one.name} lies outside its interval"
    assert 0 < one.coverage < 1, f"{name}: coverage of {one.name} must lie between 0 and 1"


def _unpickled(record: Record) -> Record:
    again = pickle.loads(pickle.dumps(record))
    assert isinstance(again, Record)
    return again


CHECKS = (
    works_on_the_molecules_of_the_kit,
    fails_typed,
    gives_sound_quantities,
    is_deterministic,
    makes_records_that_keep,
    keeps_its_time_limit,
    can_be_cut_off,
    writes_nothing_outside_scratch,
)
