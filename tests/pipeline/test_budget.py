"""Nights that end at a given time: the options, the order of the candidates, the end, and going on."""

from __future__ import annotations

import re
import shlex
import sys
import time
from datetime import datetime
from importlib import import_module
from pathlib import Path

import pytest
from orchil import registry as registry_module
from orchil.briefs import load
from orchil.budget import Budget, Durations, budget_of
from orchil.chain import resolve
from orchil.cli import run
from orchil.errors import RequestError
from orchil.progress import PlainProgress
from orchil.promise import Glance, cheap_steps, most_promising
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.screening import plan, screen
from orchil.store import Store
from orchil.supervisor import Supervisor

PLUGIN = Path(__file__).with_name("night_plugin.py")
BRIEF = """title = "Words"
[[want]]
quantity = "molar_mass_g_mol"
at_most = 50
[[want]]
quantity = "heavy_atoms"
at_most = 10
must = true
[[want]]
quantity = "height"
at_least = 0
"""


# The options


@pytest.mark.parametrize(
    ("until", "hours", "end"),
    [
        ("07:00", None, datetime(2026, 3, 5, 7, 0)),
        ("7:05", None, datetime(2026, 3, 5, 7, 5)),
        ("23:30", None, datetime(2026, 3, 4, 23, 30)),
        ("22:15", None, datetime(2026, 3, 5, 22, 15)),  # this very minute is past: the next time is tomorrow
        (None, 8, datetime(2026, 3, 5, 6, 15)),
        (None, 0.5, datetime(2026, 3, 4, 22, 45)),
    ],
)
def test_the_end_is_the_next_time_of_that_name(until, hours, end):
    made = budget_of(until, hours, datetime(2026, 3, 4, 22, 15))
    assert datetime.fromtimestamp(made.ends_at) == end
    assert str(made) == f"{end:%Y-%m-%d %H:%M}"


def test_the_clock_on_the_wall_holds_also_when_it_is_put_forward(monkeypatch):
    # Central European summer time began on 29 March 2026 at 2:00 (EU directive 2000/84/EC: last Sunday of March).
    monkeypatch.setenv("TZ", "Europe/Berlin")
    time.tzset()
    try:
        now = datetime(2026, 3, 28, 23, 0)
        assert budget_of("07:00", None, now).ends_at - now.timestamp() == 7 * 3600
        assert budget_of(None, 8, now).ends_at - now.timestamp() == 8 * 3600
    finally:
        monkeypatch.undo()
        time.tzset()


def test_without_options_there_is_no_end():
    assert budget_of(None, None) is None


@pytest.mark.parametrize(
    ("until", "hours", "part"),
    [
        ("07:00", 8.0, "exclude each other"),
        ("25:00", None, 'like "07:00"'),
        ("seven", None, 'like "07:00"'),
        ("", None, 'like "07:00"'),
        (None, 0.0, "above 0"),
        (None, -1.0, "above 0"),
        (None, float("nan"), "above 0"),
        (None, float("inf"), "up to 8760"),
    ],
)
def test_nonsense_is_refused_with_what_would_be_right(until, hours, part):
    with pytest.raises(RequestError, match=re.escape(part)):
        budget_of(until, hours)


def test_expected_seconds_are_cautious_and_outliers_do_not_rule():
    durations = Durations({"relax": [1.0] * 9 + [600.0]})
    assert durations.expected("relax") == 1.0
    assert durations.expected("never seen") == 0.0
    for _ in range(200):
        durations.note("relax", 5.0)
    assert durations.expected("relax") == 5.0


# The order


@pytest.fixture
def registry(monkeypatch):
    monkeypatch.setenv(EXTRA_PLUGINS, str(PLUGIN))
    monkeypatch.setattr(registry_module, "_installed", lambda: iter(()))
    made = Registry.load()
    assert not made.problems
    yield made
    sys.modules.pop("night_plugin", None)


@pytest.fixture
def brief(tmp_path):
    path = tmp_path / "brief.toml"
    path.write_text(BRIEF)
    return load(path)


def test_only_what_needs_nothing_dear_is_cheap(registry, brief):
    assert [step.stage.name for step in cheap_steps(resolve(registry, brief))] == ["weigh"]


def test_of_our_own_stages_intake_is_cheap_and_relaxing_is_not(tmp_path):
    path = tmp_path / "brief.toml"
    path.write_text('title = "t"\n[[want]]\nquantity = "absorption_max_nm"\nat_least = 400\n')
    names = {step.stage.name for step in cheap_steps(resolve(Registry.load(), load(path)))}
    assert "intake" in names
    assert not names & {"embed", "relax", "excite", "calibrate"}


def glance(at: int, mass: float | None, size: float, failed: bool = False) -> Glance:
    found = {"heavy_atoms": (size, None, None, None)}
    if mass is not None:
        found["molar_mass_g_mol"] = (mass, None, None, None)
    return Glance(at, size, found, failed)


def test_the_most_promising_come_first(registry, brief):
    glances = [
        glance(1, 900.0, 4),  # too heavy
        glance(2, 10.0, 80),  # misses the must, though light
        glance(3, 10.0, 9),
        glance(4, 10.0, 5),  # as good and smaller
        glance(5, 51.0, 3),  # just beside the limit
        glance(6, None, 0, failed=True),  # is finished at no cost
        glance(7, 20.0, 5),  # as 4, but later
    ]
    assert most_promising(glances, resolve(registry, brief), brief) == [6, 4, 7, 3, 5, 1, 2]


def test_where_no_want_is_known_the_small_come_first(registry, brief):
    chain = resolve(registry, brief)
    glances = [Glance(at, size, {}, False) for at, size in ((1, 9.0), (2, 3.0), (3, 5.0))]
    assert most_promising(glances, chain, brief) == [2, 3, 1]


# The night


@pytest.fixture
def night(registry, tmp_path, monkeypatch):
    marks = tmp_path / "runs"
    marks.mkdir()
    monkeypatch.setenv("FAKE_RUNS", str(marks))
    (tmp_path / "brief.toml").write_text(BRIEF)

    class Night:
        said = ""
        folder = tmp_path
        store = tmp_path / "night.db"

        def run(self, *words, budget=None, brief="brief.toml"):
            (tmp_path / "words.csv").write_text("\n".join(["smiles", *words]) + "\n")
            made = plan(tmp_path / "words.csv", tmp_path / brief, registry)
            with (
                (tmp_path / "said").open("w+") as stream,
                Store.open(self.store, create=True) as store,
                Supervisor(1) as pool,
            ):
                outcome = screen(made, store, pool=pool, progress=PlainProgress(stream), budget=budget)
                stream.seek(0)
                self.said = stream.read()
            return outcome

        def query(self, sql):
            with Store.open_read_only(self.store) as store:
                return store.query(sql).to_dict("records")

        def begun(self, stage):
            """Words in the order in which the stage began with them."""
            found = sorted(
                (int(path.name.rpartition("-")[2]), path.name)
                for path in marks.iterdir()
                if path.name.startswith(stage)
            )
            return [name.split(" ")[1].rpartition("-")[0] for _, name in found]

    return Night()


def soon(seconds: float) -> Budget:
    return Budget(time.time() + seconds)


class AlwaysLeft(Budget):
    """A clock that stands still: so many seconds are left for ever."""

    def left(self):
        return self.ends_at


class UpWhenBegun(Budget):
    """The time is up as soon as a stage has begun with so many words, so that no slow machine spoils the test."""

    def __init__(self, night, stage, count, grace):
        super().__init__(0.0, grace)
        self.__dict__.update(night=night, stage=stage, count=count, since=None)

    def left(self):
        if self.since is None and len(self.night.begun(self.stage)) >= self.count:
            self.__dict__["since"] = time.monotonic()
        return 1000.0 if self.since is None else self.since - time.monotonic()


WORDS = ("heavy-900-30", "fine-20-30", "verymuchtoolong-10-30", "ok-20-30", "unreadable-1-1", "OK-20-30")
BEST_FIRST = ["ok-20-30", "fine-20-30", "heavy-900-30", "verymuchtoolong-10-30"]


def test_with_time_enough_all_is_done_the_best_first(night):
    outcome = night.run(*WORDS, budget=soon(600))
    assert (outcome.done, outcome.failed, outcome.left, outcome.time_up) == (5, 1, 0, False)
    assert night.begun("ponder") == BEST_FIRST
    assert sorted(night.begun("weigh")) == sorted(WORDS)  # each row once, failures too
    twins = night.query("SELECT row_number, duplicate_of FROM ranking WHERE duplicate_of IS NOT NULL")
    assert twins == [{"row_number": 6, "duplicate_of": "row-4"}]
    assert "a look at the whole library first" in night.said


def test_a_night_with_an_end_gives_the_numbers_of_one_without(night):
    night.run(*WORDS, budget=soon(600))
    sql = "SELECT row_number, rank, score, status, duplicate_of FROM ranking ORDER BY row_number"
    records = "SELECT digest, payload FROM record WHERE kind <> 'score' ORDER BY digest"
    with_end = str(night.query(sql)), night.query(records)
    night.store = night.folder / "other.db"
    night.run(*WORDS)
    assert (str(night.query(sql)), night.query(records)) == with_end


def test_work_that_cannot_end_in_time_is_not_begun(night):
    night.run("slow-10-1500")  # shows how long pondering takes
    outcome = night.run("slow-10-1500", "a-10-1500", "b-10-1500", budget=AlwaysLeft(1.2))
    assert (outcome.done, outcome.left, outcome.time_up) == (0, 2, True)
    assert night.begun("ponder") == ["slow-10-1500"]
    assert "b-10-1500" in night.begun("weigh")  # which takes no time


def test_work_in_flight_is_stopped_after_the_grace_and_waits(night):
    outcome = night.run("quick-10-1", "never-60-60000", budget=UpWhenBegun(night, "ponder", 2, grace=0.3))
    assert (outcome.done, outcome.failed, outcome.left, outcome.time_up) == (1, 0, 1, True)
    assert "running stages have 0.3 s to finish" in night.said
    assert night.query("SELECT name FROM candidate WHERE status = 'waiting'") == [{"name": "row-2"}]
    assert night.query("SELECT count(*) AS n FROM attempt WHERE NOT ok") == [{"n": 0}]
    assert night.query("SELECT candidate FROM ranking WHERE rank = 1") == [{"candidate": "row-1"}]


def test_work_in_flight_that_ends_within_the_grace_is_kept(night):
    outcome = night.run("late-10-400", "later-10-400", budget=UpWhenBegun(night, "ponder", 1, grace=600))
    assert (outcome.done, outcome.left) == (0, 2)
    assert night.query("SELECT count(*) AS n FROM work WHERE stage = 'ponder'") == [{"n": 1}]
    assert night.run("late-10-400", "later-10-400").done == 2
    assert night.begun("ponder") == ["late-10-400", "later-10-400"]


def test_the_same_command_goes_on_and_its_last_lines_say_so(night, monkeypatch, capfdbinary):
    monkeypatch.chdir(night.folder)
    Path("list.csv").write_text("\n".join(["smiles", *(f"w{at}-{at}-30" for at in range(30))]) + "\n")
    command = ["screen", "list.csv", "-b", "brief.toml", "-s", "s.db", "--workers", "1", "--hours", "2.5"]
    with monkeypatch.context() as patched:
        patched.setattr(
            import_module("orchil.cli.screen"), "budget_of", lambda *_: UpWhenBegun(night, "ponder", 10, grace=600)
        )
        assert run(command) == 3
    _, err = capfdbinary.readouterr()
    *_, left, continuation = err.decode().splitlines()
    found = re.search(r"the time is up: (\d+) of 30 candidates were finished.*; (\d+) are left", left)
    finished, waiting = map(int, found.groups())
    assert finished + waiting == 30
    assert 9 <= finished < 30
    name, *again = shlex.split(continuation.partition("to continue: ")[2])
    assert name == "orchil"
    assert again[again.index("--hours") + 1] == "2.5"
    assert run(again) == 0
    assert len(night.begun("conclude")) == len(set(night.begun("conclude"))) == 30
    assert len(night.begun("weigh")) == 30


@pytest.mark.parametrize(
    ("options", "part"),
    [
        (("--until", "07:00", "--hours", "8"), "exclude each other"),
        (("--until", "noon"), 'like "07:00"'),
        (("--hours", "0"), "above 0"),
        (("--hours", "many"), "--hours"),
    ],
)
def test_the_command_refuses_nonsense_before_anything_is_stored(night, monkeypatch, capfdbinary, options, part):
    monkeypatch.chdir(night.folder)
    Path("list.csv").write_text("smiles\na-1-1\n")
    assert run(["screen", "list.csv", "-b", "brief.toml", "-s", "s.db", *options]) == 2
    assert part in capfdbinary.readouterr()[1].decode()
    assert not Path("s.db").exists()
