"""The child process: loads the plugins by itself, runs one stage at a time, answers on its pipe.

It never outlives its parent, ignores Ctrl-C (the parent decides), and works in a private folder, under a
memory limit.
"""

from __future__ import annotations

import ctypes
import os
import resource
import shutil
import signal
import sys
import time
from collections.abc import Iterable, Mapping
from contextlib import contextmanager, suppress
from functools import lru_cache
from multiprocessing.connection import Connection
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .messages import READY, Payload, Reply, Setup, Task

if TYPE_CHECKING:
    from collections.abc import Iterator

    from orchil_schemas import Record, Stage

PR_SET_PDEATHSIG = 1
STACK_BYTES = 512 << 20
"""Large molecules need a deep stack in compiled code."""


def main() -> None:
    """Entry of the child: ``argv[1]`` is the inherited file descriptor of its pipe."""
    pipe = Connection(int(sys.argv[1]))
    os.set_inheritable(pipe.fileno(), False)
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    setup = Setup.decode(pipe.recv_bytes())
    _die_with(setup.parent)
    sys.path[:] = [*sys.path, *(entry for entry in setup.sys_path if entry not in sys.path)]
    bench = Bench(setup.memory_bytes)
    pipe.send_bytes(READY)
    with suppress(EOFError, BrokenPipeError, ConnectionResetError):
        while True:
            pipe.send_bytes(bench.run(Task.decode(pipe.recv_bytes())).encode())


class Bench:
    """The stages of this child and the means to run them."""

    def __init__(self, memory_bytes: int) -> None:
        from .registry import Registry

        self._stages = Registry.load().stages
        self._settings = lru_cache(maxsize=64)(self._read_settings)
        self._versions = lru_cache(maxsize=64)(self._found_versions)
        address_space, _ = _memory()
        self._fresh: int | None = None
        _limit(resource.RLIMIT_AS, address_space + memory_bytes)
        _limit(resource.RLIMIT_STACK, STACK_BYTES)

    def run(self, task: Task) -> Reply:
        """Do one task; whatever goes wrong becomes a reply with a reason."""
        started, cpu = time.monotonic(), time.process_time()
        fields = self._attempt(task, started)
        resident = _memory()[1]
        self._fresh = resident if self._fresh is None else self._fresh
        return Reply(
            **fields,
            seconds=time.monotonic() - started,
            cpu_seconds=time.process_time() - cpu,
            versions=dict(self._versions(task.stage)),
            grown_bytes=resident - self._fresh,
        )

    def _attempt(self, task: Task, started: float) -> dict[str, Any]:
        from orchil_schemas import StageError

        try:
            return {"ok": True, "records": self._records(task, started)}
        except StageError as error:
            return _failure(error.reason_code, str(error), recoverable=error.recoverable)
        except MemoryError:
            return _failure("out_of_memory", "the stage asked for more memory than a worker may take", recoverable=True)
        except BadOutputError as error:
            return _failure("bad_output", str(error))
        except Exception as error:
            return _failure("unexpected", f"{type(error).__name__}: {error}")

    def _records(self, task: Task, started: float) -> list[Payload]:
        from orchil_schemas import Context, Inputs

        stage = self._stages[task.stage]
        kinds = {kind.kind: kind for kind in stage.needs}
        inputs = Inputs(kinds[kind].model_validate_json(payload) for kind, payload in task.inputs)
        settings = self._settings(task.stage, task.settings_json)
        with _inside(Path(task.scratch)) as scratch:
            context = Context(scratch, task.seed, task.attempt, started + task.time_limit)
            return _checked(stage, stage.run(inputs, settings, context))

    def _read_settings(self, stage: str, settings_json: str) -> Any:
        return self._stages[stage].Settings.model_validate_json(settings_json)

    def _found_versions(self, stage: str) -> Mapping[str, str]:
        try:
            return self._stages[stage].found().versions
        except Exception:
            return {}


class BadOutputError(Exception):
    """A stage returned something else than the records it promised."""


def _checked(stage: Stage, made: Iterable[Record]) -> list[Payload]:
    """The records in the order of ``makes``; :class:`BadOutputError` when they are not exactly those."""
    by_kind: dict[type, Record] = {}
    for record in made:
        if type(record) not in stage.makes:
            raise BadOutputError(f"the stage returned a {type(record).__name__}, which is not among its makes")
        if type(record) in by_kind:
            raise BadOutputError(f"the stage returned two {record.kind} records; one is allowed")
        by_kind[type(record)] = record
    missing = [kind.kind for kind in stage.makes if kind not in by_kind]
    if missing:
        raise BadOutputError(f"the stage did not return {' and '.join(missing)}")
    try:
        payloads = [(kind.kind, by_kind[kind].canonical_json) for kind in stage.makes]
    except (ValueError, TypeError) as error:
        raise BadOutputError(f"a record cannot be written as JSON: {error}") from error
    for record in by_kind.values():
        _check_quantities(record)
    return payloads


def _check_quantities(record: Record) -> None:
    """Ask for the quantities here, where a fault costs one candidate, and not first in the coordinator."""
    try:
        names = {one.name for one in record.quantities()}
    except Exception as error:
        raise BadOutputError(
            f"the quantities of {record.kind} cannot be read: {type(error).__name__}: {error}"
        ) from error
    if strange := names - {one.name for one in record.offers}:
        raise BadOutputError(f"{record.kind} has quantities it does not offer: {', '.join(sorted(strange))}")


def _failure(code: str, message: str, *, recoverable: bool = False) -> dict[str, Any]:
    return {"ok": False, "code": code, "message": message, "recoverable": recoverable}


@contextmanager
def _inside(folder: Path) -> Iterator[Path]:
    """Work in a new folder that is gone afterwards, so that files left by compiled code never meet."""
    folder.mkdir(parents=True)
    os.chdir(folder)
    try:
        yield folder
    finally:
        os.chdir(folder.parent)
        shutil.rmtree(folder, ignore_errors=True)


def _die_with(parent: int) -> None:
    """Have the kernel end this process when the parent is gone (Linux), also if that was just now."""
    if sys.platform == "linux":
        ctypes.CDLL(None, use_errno=True).prctl(PR_SET_PDEATHSIG, signal.SIGKILL)
    if os.getppid() != parent:
        raise SystemExit(1)


def _limit(which: int, wanted: int) -> None:
    _, hard = resource.getrlimit(which)
    resource.setrlimit(which, (wanted if hard == resource.RLIM_INFINITY else min(wanted, hard), hard))


def _memory() -> tuple[int, int]:
    """Bytes of address space and of resident memory of this process, zeros where the system does not tell."""
    try:
        size, resident = Path("/proc/self/statm").read_text().split()[:2]
    except OSError:
        return 0, 0
    return int(size) * resource.getpagesize(), int(resident) * resource.getpagesize()


if __name__ == "__main__":
    main()
