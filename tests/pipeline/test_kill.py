"""SIGKILL at random moments: a short form of ``tests/bench/kill_test.py`` with quick made-up stages."""

from __future__ import annotations

import math
import os
import random
import subprocess
import sys
from pathlib import Path

import pytest
from orchil.registry import EXTRA_PLUGINS
from orchil.runner import COMMIT_SECONDS
from orchil.supervisor import memory_kills

from tests.kill import Disturbance, differences, done_more_than_once, is_sound, rows

PLUGIN = Path(__file__).with_name("night_plugin.py")
COMMAND = "import orchil.registry as r; r._installed = lambda: iter(()); import orchil.cli as c; c.main()"
BRIEF = 'title = "Words"\n[[want]]\nquantity = "height"\nat_least = 0\n'
WORDS = [f"word{'x' * at}-{at}-60" for at in range(14)] + ["WORD-0-60", "Wordxx-2-60"]
WORKERS, KILLS, STRIDE = 2, 5, 6
SHORTEST_SECONDS = 0.02


class Screen:
    """One screen of the words in a folder of its own."""

    def __init__(self, folder: Path, struck: str = "") -> None:
        self._struck = struck
        self.store, self.marks, self._folder = folder / "night.db", folder / "runs", folder
        self.marks.mkdir(parents=True)
        folder.joinpath("words.csv").write_text("\n".join(["smiles", *WORDS]) + "\n")
        folder.joinpath("brief.toml").write_text(BRIEF)

    def start(self) -> subprocess.Popen[bytes]:
        words = ["screen", "words.csv", "-b", "brief.toml", "-s", "night.db", "--workers", str(WORKERS), "--top", "0"]
        environment = os.environ | {
            EXTRA_PLUGINS: str(PLUGIN),
            "FAKE_RUNS": str(self.marks),
            "FAKE_STRUCK": self._struck,
        }
        with self._folder.joinpath("said").open("ab") as said:
            return subprocess.Popen(
                [sys.executable, "-c", COMMAND, *words], cwd=self._folder, env=environment, stdout=said, stderr=said
            )

    def begun(self) -> list[str]:
        """Stage and word, each time a stage began."""
        return [path.name.rpartition("-")[0] for path in self.marks.iterdir()]

    def lost(self) -> int:
        ((kept,),) = rows(self.store, "SELECT count(*) FROM work") or [(0,)]
        return len(set(self.begun())) - kept

    def said(self) -> str:
        return self._folder.joinpath("said").read_text()


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory) -> Screen:
    screen = Screen(tmp_path_factory.mktemp("undisturbed") / "night")
    assert screen.start().wait(60) == 0, screen.said()
    assert screen.lost() == 0
    return screen


def test_kills_at_random_moments_change_nothing(undisturbed, tmp_path):
    struck = "" if memory_kills() is None else WORDS[4]  # a worker that is killed for certain while it works
    screen = Screen(tmp_path / "night", struck)
    disturbance = Disturbance(KILLS, random.Random(5), lambda: len(screen.begun()), STRIDE)
    code, kills = disturbance.run(screen.start, screen.lost)
    assert code == 0, screen.said()
    assert len(kills) == KILLS
    assert {kill.target for kill in kills} == {"coordinator", "worker"}
    assert is_sound(screen.store)
    assert differences(screen.store, undisturbed.store) == []
    assert rows(screen.store, "SELECT count(*) FROM candidate WHERE status = 'done'") == [(len(WORDS),)]
    assert done_more_than_once(screen.store) == []
    repeated = len(screen.begun()) - len(set(screen.begun()))
    assert repeated <= sum(kill.in_flight for kill in kills) + bool(struck)
    # In flight is what workers hold, and what they may have finished since results were last written.
    assert max(kill.in_flight for kill in kills) <= WORKERS * (2 + math.ceil(COMMIT_SECONDS / SHORTEST_SECONDS))


def test_the_comparison_sees_a_single_bit(undisturbed, tmp_path):
    import shutil
    import sqlite3

    copy = tmp_path / "copy.db"
    shutil.copy(undisturbed.store, copy)
    assert differences(copy, undisturbed.store) == []
    connection = sqlite3.connect(copy)
    ((value,),) = connection.execute("SELECT max(value) FROM quantity WHERE name = 'height'").fetchall()
    connection.execute("UPDATE quantity SET value = ? WHERE value = ?", (math.nextafter(value, math.inf), value))
    connection.commit()
    connection.close()
    assert differences(copy, undisturbed.store) == ["quantity"]
