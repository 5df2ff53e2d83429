"""Keeps the workers: starts them, hands out tasks, kills what overruns, names crashes, replaces worn ones.

One child per slot, one pipe per child, so that a dying child can hurt nobody else's result.
"""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Mapping
from contextlib import suppress
from dataclasses import dataclass, field, replace
from multiprocessing import Pipe
from multiprocessing.connection import Connection, wait
from pathlib import Path
from typing import IO

from .blas import kernel_choice
from .errors import RunError
from .messages import READY, Reply, Setup, Task

MEMORY_BYTES = 4 << 30
TASKS_PER_WORKER = 1000
STARTUP_SECONDS = 180.0
STARTS_WITHOUT_SUCCESS = 3
ONE_THREAD = {
    "OMP_NUM_THREADS": "1",
    "OPENBLAS_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
    "NUMEXPR_NUM_THREADS": "1",
    "OMP_STACKSIZE": "512M",
}
"""Set for every worker before it starts: numerical libraries read them once, at import."""


@dataclass(frozen=True)
class Result:
    """A task and what came of it."""

    task: Task
    reply: Reply


@dataclass
class _Slot:
    """One child: its process, its end of the pipe, and the task it holds."""

    process: subprocess.Popen[bytes]
    pipe: Connection
    words: IO[bytes]
    until: float
    ready: bool = False
    task: Task | None = None
    started: float = 0.0
    done: int = 0
    memory_kills: int | None = None

    @property
    def disturbed(self) -> bool:
        """The child, now dead, was killed from outside, and not by the system for lack of memory."""
        known = self.memory_kills is not None and self.memory_kills == memory_kills()
        return known and self.process.returncode == -signal.SIGKILL

    def kill(self) -> None:
        """End the child and everything it started, at once."""
        with suppress(ProcessLookupError, PermissionError):
            os.killpg(self.process.pid, signal.SIGKILL)
        self.process.kill()
        self.process.wait()
        self.pipe.close()
        self.words.close()

    def last_words(self) -> str:
        """The end of what the child wrote to its error stream."""
        self.words.seek(max(0, self.words.seek(0, os.SEEK_END) - 2000))
        return self.words.read().decode(errors="replace").strip()


@dataclass
class Supervisor:
    """A set of up to ``workers`` children. Use as a context manager; nothing is left running afterwards.

    ``memory_bytes`` is what a task may take above a fresh child. A child is replaced after
    ``tasks_per_worker`` tasks, after any crash, and once it holds on to half of its memory.
    """

    workers: int
    memory_bytes: int = MEMORY_BYTES
    tasks_per_worker: int = TASKS_PER_WORKER
    environment: Mapping[str, str] = field(default_factory=dict)
    _slots: list[_Slot] = field(default_factory=list)
    _base: Path = field(default_factory=lambda: Path(tempfile.mkdtemp(prefix="orchil-")))
    _failed_starts: int = 0
    _task_number: int = 0

    def __enter__(self) -> Supervisor:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    @property
    def free(self) -> int:
        """How many more tasks can be taken now."""
        return self.workers - self.busy

    @property
    def busy(self) -> int:
        """How many tasks are held."""
        return sum(slot.task is not None for slot in self._slots)

    @property
    def pids(self) -> list[int]:
        """Process ids of the children."""
        return [slot.process.pid for slot in self._slots]

    def submit(self, task: Task) -> None:
        """Give a task to an idle child, or to a new one while there are fewer than ``workers``."""
        idle = [slot for slot in self._slots if slot.task is None]
        slot = next((slot for slot in idle if slot.ready), None) or next(iter(idle), None) or self._start()
        self._task_number += 1
        slot.task = replace(task, scratch=str(self._base / f"task-{self._task_number}"))
        if slot.ready:
            self._send(slot)

    def wait(self, timeout: float) -> list[Result]:
        """The results that are there within ``timeout`` seconds; also enforces the deadlines."""
        nearest = min((slot.until for slot in self._slots), default=float("inf"))
        pipes = [slot.pipe for slot in self._slots]
        patience = max(0.0, min(timeout, nearest - time.monotonic()))
        heard = wait(pipes, patience) if pipes else []
        results = [self._hear(slot) for slot in list(self._slots) if slot.pipe in heard]
        now = time.monotonic()
        results += [self._overrun(slot) for slot in list(self._slots) if slot.until <= now]
        return [result for result in results if result is not None]

    def close(self) -> None:
        """Kill every child and remove the scratch folders."""
        for slot in self._slots:
            slot.kill()
        self._slots.clear()
        shutil.rmtree(self._base, ignore_errors=True)

    def _start(self) -> _Slot:
        ours, theirs = Pipe()
        words = tempfile.TemporaryFile(dir=self._base)  # noqa: SIM115 (closed with its slot)
        process = subprocess.Popen(
            [sys.executable, "-m", "orchil.worker", str(theirs.fileno())],
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=words,
            env={**os.environ, **ONE_THREAD, **kernel_choice(), **self.environment},
            pass_fds=[theirs.fileno()],
            start_new_session=True,
        )
        theirs.close()
        slot = _Slot(process, ours, words, time.monotonic() + STARTUP_SECONDS, memory_kills=memory_kills())
        self._slots.append(slot)
        with suppress(BrokenPipeError, ConnectionResetError):
            setup = Setup([str(Path(entry).absolute()) for entry in sys.path], os.getpid(), self.memory_bytes)
            ours.send_bytes(setup.encode())
        return slot

    def _send(self, slot: _Slot) -> None:
        assert slot.task is not None
        slot.started, slot.memory_kills = time.monotonic(), memory_kills()
        slot.until = slot.started + slot.task.time_limit
        with suppress(BrokenPipeError, ConnectionResetError):  # a dead child is noticed in wait
            slot.pipe.send_bytes(slot.task.encode())

    def _hear(self, slot: _Slot) -> Result | None:
        try:
            data = slot.pipe.recv_bytes()
        except (EOFError, ConnectionResetError, OSError):
            return self._crashed(slot)
        if data == READY:
            self._failed_starts = 0
            slot.ready, slot.until = True, float("inf")
            if slot.task is not None:
                self._send(slot)
            return None
        return self._answered(slot, Reply.decode(data))

    def _answered(self, slot: _Slot, reply: Reply) -> Result:
        assert slot.task is not None
        task, slot.task, slot.until = slot.task, None, float("inf")
        slot.done += 1
        worn = reply.grown_bytes > self.memory_bytes // 2 or slot.done >= self.tasks_per_worker
        if worn or reply.code == "out_of_memory":
            self._drop(slot)
            self._start()
        return Result(task, reply)

    def _crashed(self, slot: _Slot) -> Result | None:
        slot.process.wait()
        words, status = slot.last_words(), slot.process.returncode
        if not slot.ready:
            self._stillborn(slot, words)
            return None
        code, message = death(status, words)
        if slot.disturbed:
            code, message = "crashed", "the worker was killed from outside, not by the system for lack of memory"
        return self._lost(slot, code, message, recoverable=True)

    def _overrun(self, slot: _Slot) -> Result | None:
        if not slot.ready:
            self._stillborn(slot, f"it was not ready after {STARTUP_SECONDS:g} s\n{slot.last_words()}")
            return None
        limit = slot.task.time_limit if slot.task else 0.0
        return self._lost(slot, "timeout", f"stopped at the time limit of {limit:g} s", recoverable=False)

    def _lost(self, slot: _Slot, code: str, message: str, *, recoverable: bool) -> Result | None:
        task, seconds, disturbed = slot.task, time.monotonic() - slot.started, slot.disturbed
        self._drop(slot)
        self._start()
        if task is None:
            return None
        shutil.rmtree(task.scratch, ignore_errors=True)
        reply = Reply(False, code=code, message=message, recoverable=recoverable, seconds=seconds, disturbed=disturbed)
        return Result(task, reply)

    def _stillborn(self, slot: _Slot, words: str) -> None:
        """A child that died before it was ready: try again a few times, then give the run up."""
        self._failed_starts += not slot.disturbed
        if self._failed_starts >= STARTS_WITHOUT_SUCCESS:
            raise RunError(f"no worker process starts; the last one said: {words or 'nothing'}")
        task = slot.task
        self._drop(slot)
        self._start().task = task

    def _drop(self, slot: _Slot) -> None:
        self._slots.remove(slot)
        slot.kill()


def death(status: int, words: str) -> tuple[str, str]:
    """(reason code, sentence) for a child that ended by itself with ``status`` as of subprocess."""
    last = words.splitlines()[-1][:200] if words else ""
    said = f"; it last said: {last}" if last else ""
    if "bad_alloc" in words or "MemoryError" in words:
        return "out_of_memory", "the worker ended for lack of memory"
    if status == -signal.SIGKILL:
        return (
            "out_of_memory",
            "the worker was killed from outside, most likely by the system for lack of memory",
        )
    if status < 0:
        return "crashed", f"the worker crashed with {signal_name(-status)}{said}"
    return "crashed", f"the worker ended with exit code {status}{said}"


def memory_kills() -> int | None:
    """How many processes the system has killed for lack of memory since it runs; None where it does not tell."""
    with suppress(OSError):
        for line in Path("/proc/vmstat").read_text().splitlines():
            if line.startswith("oom_kill "):
                return int(line.split()[1])
    return None


def signal_name(number: int) -> str:
    """``SIGSEGV`` for 11, also for numbers that have no name."""
    try:
        return signal.Signals(number).name
    except ValueError:
        return f"signal {number}"
