"""A hundred SIGKILLs over one screen of the demo library: ``python tests/bench/kill_test.py [--kills 100] [--seed 1]``.

Screens the demo library undisturbed, then once more while coordinator or a worker is killed at random moments, each a
little progress after the last, and prints what was killed, lost and repeated. Ends with code 1 where a candidate
is not done once, a number differs in a single bit, finished work was done again, or the store is damaged.
"""

from __future__ import annotations

import argparse
import os
import random
import subprocess
import sys
import tempfile
import time
from collections import Counter
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[2]))

from tests.kill import Disturbance, Kill, differences, done_more_than_once, is_sound, rows

DEMO = Path(__file__).parents[2] / "demo_library"
COMMAND = "from orchil.cli import main; main()"
TASK_MARKS = "ORCHIL_KILL_TEST_MARKS"
MARKING = f"""
import os, sys, time
from pathlib import Path
import pluggy

folder = Path(os.environ["{TASK_MARKS}"])
Bench = getattr(sys.modules["__main__"], "Bench", None)

if Bench is not None:  # in a worker, which is its own main module
    run = Bench.run

    def marked(bench, task):
        (folder / f"{{task.key}}-{{task.attempt}}-{{time.time_ns()}}").touch()
        return run(bench, task)

    Bench.run = marked


@pluggy.HookimplMarker("orchil")
def orchil_checks():
    return []
"""
"""A plugin that has workers leave a mark when they begin a task, so that work which is lost can be counted."""


class Screen:
    """One screen of the demo library in a folder of its own; each task leaves a mark when it begins."""

    def __init__(self, folder: Path, workers: int, limit: int) -> None:
        self.store, self._marks, self._folder, self._workers = folder / "night.db", folder / "marks", folder, workers
        self._limit = limit
        self._before: tuple[list[str], int] = ([], 0)
        self._marks.mkdir(parents=True)
        folder.joinpath("plugin_marks.py").write_text(MARKING)

    def start(self) -> subprocess.Popen[bytes]:
        """Begin, or go on."""
        files = [str(DEMO / "candidates.csv"), "--brief", str(DEMO / "green_stop.toml"), "--store", str(self.store)]
        words = ["screen", *files, "--workers", str(self._workers), "--limit", str(self._limit), "--top", "0"]
        self._before = self.begun(), self._attempts()
        plugins = {"ORCHIL_EXTRA_PLUGINS": str(self._folder / "plugin_marks.py"), TASK_MARKS: str(self._marks)}
        with self._folder.joinpath("said").open("ab") as said:
            return subprocess.Popen(
                [sys.executable, "-c", COMMAND, *words], env=os.environ | plugins, stdout=said, stderr=said
            )

    def begun(self) -> list[str]:
        """Work by digest and attempt, each time it began."""
        return [path.name.rpartition("-")[0] for path in self._marks.iterdir()]

    def lost(self) -> int:
        """Tries that have begun since the last start and are not in the store."""
        marks, attempts = self._before
        kept = rows(self.store, f"SELECT work_digest || '-' || attempt FROM attempt WHERE id > {attempts}")
        return (Counter(self.begun()) - Counter(marks) - Counter(str(row[0]) for row in kept)).total()

    def _attempts(self) -> int:
        ((newest,),) = rows(self.store, "SELECT coalesce(max(id), 0) FROM attempt") or [(0,)]
        return int(str(newest))

    def said(self) -> str:
        """The end of what the screen has said."""
        return self._folder.joinpath("said").read_text()[-2000:]


def main() -> None:
    """Run both screens and compare."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--kills", type=int, default=100)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--stride", type=int, default=5, help="tasks between two kills, at most")
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--limit", type=int, default=1000, help="only the first rows of the demo library")
    wanted = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        calm, disturbed = (Screen(Path(folder, name), wanted.workers, wanted.limit) for name in ("calm", "disturbed"))
        expected = calm.start().wait()
        began = time.monotonic()
        generator = random.Random(wanted.seed)
        disturbance = Disturbance(wanted.kills, generator, lambda: len(disturbed.begun()), wanted.stride)
        code, kills = disturbance.run(disturbed.start, disturbed.lost)
        print(f"{time.monotonic() - began:.0f} s, exit code {code} (undisturbed {expected})")
        faults = judge(calm, disturbed, kills, wanted.kills)
        if code != expected:
            faults.append(f"the exit code differs; the last words: {disturbed.said()}")
    for fault in faults:
        print(f"FAULT: {fault}")
    sys.exit(bool(faults))


def judge(calm: Screen, disturbed: Screen, kills: list[Kill], wanted: int) -> list[str]:
    """Print the figures; returns a sentence for each fault."""
    in_flight = sum(kill.in_flight for kill in kills)
    repeated = len(disturbed.begun()) - len(set(disturbed.begun()))
    print(f"{dict(Counter(kill.target for kill in kills))} killed; {in_flight} tasks in flight, {repeated} done again")
    faults = [f"the content of {table} differs" for table in differences(disturbed.store, calm.store)]
    faults += [f"{digest} was finished {times} times" for digest, times in done_more_than_once(disturbed.store)]
    if len(kills) < wanted:
        faults.append(f"the screen was over after {len(kills)} kills: choose a smaller --stride")
    if repeated > in_flight:
        faults.append("more was done again than was in flight")
    if not is_sound(disturbed.store):
        faults.append("the store is damaged")
    if rows(disturbed.store, "SELECT count(*) FROM candidate WHERE status = 'waiting'") != [(0,)]:
        faults.append("not every candidate has an outcome")
    return faults


if __name__ == "__main__":
    main()
