"""Disturbs a screen by SIGKILL at random moments, and compares its store with that of an undisturbed run."""

from __future__ import annotations

import os
import random
import signal
import sqlite3
import subprocess
import time
from collections import Counter
from collections.abc import Callable
from contextlib import closing, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

PATIENCE = 600.0
CONTENT = {
    "candidate": "row_number, name, structure, status, failed_stage, reason_code, smiles, medium_used, duplicate_of",
    "record": "digest, kind, payload",
    "work": "digest, stage, stage_version, settings, outputs",
    "candidate_record": "*",
    "quantity": "*",
    "transition": "*",
    "band": "*",
    "score": "*",
    "want_result": "*",
}
"""What must be equal bit for bit; the rest of the store is times and tries."""


class Kill(NamedTuple):
    """Who was killed, and how much work was in flight with it."""

    target: str
    in_flight: int


@dataclass(frozen=True)
class Disturbance:
    """Kills the coordinator or a worker, so many times in all, each time some ``progress`` after the last time."""

    kills: int
    generator: random.Random
    progress: Callable[[], int]
    stride: int

    def run(self, start: Callable[[], subprocess.Popen[bytes]], lost: Callable[[], int]) -> tuple[int, list[Kill]]:
        """Start the screen as often as it needs; returns its last exit code and the kills.

        ``lost`` counts the work that is begun and not in the store when the coordinator and its workers are gone.
        """
        done: list[Kill] = []
        while True:
            process = start()
            while len(done) < self.kills and self._moment(process):
                if self.generator.random() < 0.5:
                    kill_all(process)
                    done.append(Kill("coordinator", lost()))
                    break
                done += self._kill_a_worker(process)
            else:
                return process.wait(PATIENCE), done

    def _moment(self, process: subprocess.Popen[bytes]) -> bool:
        """Wait for a random moment; False when the process has ended before it."""
        goal = self.progress() + self.generator.randint(0, self.stride)
        while self.progress() < goal and process.poll() is None:
            time.sleep(0.01)
        time.sleep(self.generator.uniform(0, 0.2))
        return process.poll() is None

    def _kill_a_worker(self, process: subprocess.Popen[bytes]) -> list[Kill]:
        workers = children(process.pid)
        if not workers:
            return []
        with suppress(ProcessLookupError):
            os.kill(self.generator.choice(workers), signal.SIGKILL)
        return [Kill("worker", 1)]


def children(pid: int) -> list[int]:
    """Process ids of the children."""
    try:
        return sorted(map(int, Path(f"/proc/{pid}/task/{pid}/children").read_text().split()))
    except OSError:
        return []


def kill_all(process: subprocess.Popen[bytes]) -> None:
    """Kill a coordinator and wait until its workers, which nobody kills, are gone too."""
    workers = children(process.pid)
    process.kill()
    process.wait()
    until = time.monotonic() + 30
    while any(map(_runs, workers)):
        assert time.monotonic() < until, "workers outlive their coordinator"
        time.sleep(0.01)


def _runs(pid: int) -> bool:
    try:
        return "State:\tZ" not in Path(f"/proc/{pid}/status").read_text()
    except OSError:
        return False


def rows(store: Path, sql: str) -> list[tuple[object, ...]]:
    """What a query finds; nothing as long as there is no such store or table."""
    try:
        with closing(sqlite3.connect(f"file:{store}?mode=ro", uri=True)) as connection:
            return connection.execute(sql).fetchall()
    except sqlite3.OperationalError:
        return []


def is_sound(store: Path) -> bool:
    """Does SQLite find no fault in the file, and no reference to what is not there?"""
    return rows(store, "PRAGMA integrity_check") == [("ok",)] and rows(store, "PRAGMA foreign_key_check") == []


def differences(one: Path, other: Path) -> list[str]:
    """Tables whose content is not the same in two stores."""
    queries = {table: f"SELECT {columns} FROM {table}" for table, columns in CONTENT.items()}
    found = {table: (Counter(rows(one, sql)), Counter(rows(other, sql))) for table, sql in queries.items()}
    return [table for table, (left, right) in found.items() if left != right]


def done_more_than_once(store: Path) -> list[tuple[object, ...]]:
    """Work that was finished and kept, and then done again."""
    return rows(store, "SELECT work_digest, count(*) FROM attempt WHERE ok GROUP BY work_digest HAVING count(*) > 1")
