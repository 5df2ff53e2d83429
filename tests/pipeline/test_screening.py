"""Whole screens of fake words: every way a stage can go wrong, resuming, sharing, ranking."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from orchil.board import DISTURBANCES
from orchil.errors import RequestError
from orchil.screening import checked_brief, rescore
from orchil.store import Store, StoreError
from orchil.supervisor import memory_kills

BRIEF = 'title = "Words"\nmedium = "water"\n[[want]]\nquantity = "strength"\nat_least = 5\n'

FAILING = {
    "segfault-1": ("brew", "crashed", "SIGSEGV"),
    "exit-1": ("brew", "crashed", "exit code 3"),
    "forever-1": ("brew", "timeout", "3 s"),
    "stubborn-1": ("brew", "timeout", "3 s"),
    "greedy-1": ("brew", "out_of_memory", "memory"),
    "raise-1": ("brew", "unexpected", "RuntimeError: [bold]odd"),
    "rubbish-1": ("brew", "bad_output", "a str"),
    "nothing-1": ("brew", "bad_output", "did not return brew"),
    "nan-1": ("brew", "bad_output", "JSON"),
    "invalid-1": ("brew", "bad_output", "brew"),
    "never-1": ("brew", "not_converged", "gave up at attempt 2"),
    "unreadable": ("read", "bad_input", "cannot be read"),
}


def test_every_kind_of_failure_is_a_row_with_a_reason(night):
    outcome = night.run(*FAILING, "fine", workers=2)
    assert (outcome.done, outcome.failed, outcome.left) == (1, len(FAILING), 0)
    found = {row["structure"]: row for row in night.query("SELECT * FROM failures")}
    for word, (stage, code, part) in FAILING.items():
        assert (found[word]["failed_stage"], found[word]["reason_code"]) == (stage, code)
        assert part in found[word]["reason"]
    assert [row["rank"] for row in night.query("SELECT rank FROM ranking WHERE candidate = 'row-13'")] == [1]


def test_recoverable_failures_are_tried_once_more_and_both_tries_are_kept(night):
    night.run("shy-one", "never-1", "killedonce-1", "raise-1")
    # A worker that is killed for no lack of memory begins again, before that counts as a try that failed.
    again = 0 if memory_kills() is None else DISTURBANCES
    code = "out_of_memory" if memory_kills() is None else "crashed"
    tries = night.query(
        "SELECT structure, attempt, ok, a.reason_code FROM attempt a "
        "JOIN candidate c ON c.id = a.candidate_id WHERE stage = 'brew' ORDER BY structure, attempt"
    )
    assert [(row["structure"], row["attempt"], row["ok"], row["reason_code"]) for row in tries] == [
        *[("killedonce-1", 1, 0, code)] * (again + 1),
        ("killedonce-1", 2, 1, None),
        ("never-1", 1, 0, "not_converged"),
        ("never-1", 2, 0, "not_converged"),
        ("raise-1", 1, 0, "unexpected"),
        ("shy-one", 1, 0, "not_converged"),
        ("shy-one", 2, 1, None),
    ]


def test_a_leaking_stage_costs_workers_but_no_candidate(night):
    outcome = night.run(*(f"leak-{number}" for number in range(20)), workers=1, memory=600 << 20)
    assert outcome.done == 20
    pids = night.query("SELECT json_extract(payload, '$.pid') AS pid FROM record WHERE kind = 'brew'")
    assert len({row["pid"] for row in pids}) >= 2


def test_equal_species_are_computed_once_and_marked(night):
    night.run("Slow-a", "slow-a", "SLOW-A", "other", workers=2)
    rows = night.query("SELECT candidate, duplicate_of, status FROM ranking ORDER BY row_number")
    assert [row["duplicate_of"] for row in rows] == [None, "row-1", "row-1", None]
    assert {row["status"] for row in rows} == {"done"}
    assert night.runs() == ["other", "slow-a"]


def test_a_later_duplicate_of_a_finished_candidate_is_marked(night):
    night.run("Alpha", "beta")
    night.run("Alpha", "beta", "ALPHA")
    rows = night.query("SELECT duplicate_of FROM ranking WHERE row_number = 3")
    assert rows == [{"duplicate_of": "row-1"}]
    assert night.runs() == ["alpha", "beta"]


def test_a_twin_fails_for_the_same_reason_without_running(night):
    night.run("Raise-1", "raise-1")
    assert night.runs() == ["raise-1"]
    assert {row["reason_code"] for row in night.query("SELECT reason_code FROM failures")} == {"unexpected"}


def test_run_again_repeats_nothing_and_retries_failures_only_on_demand(night):
    night.run("alpha", "never-1")
    before = night.runs()
    assert before == ["alpha", "never-1", "never-1"]
    assert night.run("alpha", "never-1").failed == 0
    assert night.runs() == before
    assert night.run("alpha", "never-1", retry_failed=True).failed == 1
    assert night.runs().count("alpha") == 1
    assert night.runs().count("never-1") == 4


def test_other_settings_compute_anew_and_the_old_ones_come_back_from_the_cache(night):
    night.run("alpha")
    night.run("alpha", brief=BRIEF + "[stage.brew]\nscale = 3\n")
    assert night.query("SELECT value FROM quantities WHERE quantity = 'strength'") == [{"value": 15.0}]
    night.run("alpha")
    assert night.query("SELECT value FROM quantities WHERE quantity = 'strength'") == [{"value": 5.0}]
    assert night.runs() == ["alpha", "alpha"]


def test_seed_depends_on_the_inputs_alone(night):
    night.run("alpha", "shy-one")
    night.run("alpha", "shy-one", brief=BRIEF + "[stage.brew]\nscale = 3\n")
    seeds = night.query(
        "SELECT json_extract(payload, '$.seed') AS seed, count(*) AS n FROM record WHERE kind = 'brew' GROUP BY 1"
    )
    assert [row["n"] for row in seeds] == [2, 2]
    assert all(0 < row["seed"] < 2**31 for row in seeds)


def test_failure_of_a_stage_nobody_wants_does_not_cost_the_candidate(night):
    night.run("sevenxx")
    row = night.query("SELECT status, failed_stage, reason_code FROM candidate")
    assert row == [{"status": "done", "failed_stage": "label", "reason_code": "bad_input"}]
    assert night.query("SELECT rank FROM ranking") == [{"rank": 1}]


def test_bad_rows_fail_alone(night):
    outcome = night.run("a,alpha,1", "b,,0", "c,beta,x", "d,gamma", header="id,smiles,charge")
    assert outcome.done == 1
    rows = night.query("SELECT candidate, failed_stage, reason_code, reason FROM failures")
    assert [row["candidate"] for row in rows] == ["b", "c", "d"]
    assert {(row["failed_stage"], row["reason_code"]) for row in rows} == {("reading", "bad_input")}


def test_the_brief_gives_the_medium_where_the_library_does_not(night):
    night.run("a,alpha,", "b,alpha,ether", header="id,smiles,solvent")
    works = night.query("SELECT count(*) AS n FROM work WHERE stage = 'read'")
    assert works == [{"n": 2}]


def test_a_changed_library_is_refused(night):
    night.run("alpha")
    with pytest.raises(StoreError, match="library changed"):
        night.run("beta")


def test_rescoring_computes_nothing(night, fakes):
    night.run("alpha", "beta")
    (night.folder / "other.toml").write_text(BRIEF.replace("at_least = 5", "at_most = 4"))
    brief, chain = checked_brief(night.folder / "other.toml", fakes)
    with Store.open(night.store, create=False) as store:
        assert rescore(store, brief, chain) == []
        assert store.active_screen().brief.want[0].at_most == 4
    assert night.runs() == ["alpha", "beta"]


def test_rescoring_says_when_the_results_come_from_other_settings(night, fakes):
    night.run("alpha")
    (night.folder / "other.toml").write_text(BRIEF + "[stage.brew]\nscale = 3\n")
    brief, chain = checked_brief(night.folder / "other.toml", fakes)
    with Store.open(night.store, create=False) as store:
        assert "ranked as they are" in rescore(store, brief, chain)[0]


def test_an_unknown_medium_of_the_brief_is_refused_before_the_store_is_made(night):
    with pytest.raises(RequestError, match=r'brief.toml: unknown medium "mercury": use water'):
        night.run("alpha", brief=BRIEF.replace("water", "mercury"))
    assert not night.store.exists()


def test_a_fault_in_the_last_line_of_the_library_is_refused_before_the_store_is_made(night):
    with pytest.raises(RequestError, match="row 2 never ends"):
        night.run("alpha", '"beta')
    assert not night.store.exists()


COMMAND = "import orchil.registry as r; r._installed = lambda: iter(()); import orchil.cli as c; c.main()"


def begin(night, *more: str) -> subprocess.Popen[bytes]:
    words = [f"slow-{letter}" for letter in "abcdefgh"]
    (night.folder / "words.csv").write_text("\n".join(["smiles", *words]) + "\n")
    (night.folder / "brief.toml").write_text(BRIEF)
    files = [str(night.folder / "words.csv"), "--brief", str(night.folder / "brief.toml")]
    arguments = ["screen", *files, "--store", str(night.store), "--workers", "2", *more]
    return subprocess.Popen([sys.executable, "-c", COMMAND, *arguments], stderr=subprocess.PIPE, stdout=subprocess.PIPE)


def wait_for_runs(night, process, count: int) -> None:
    while len(night.runs()) < count:
        assert process.poll() is None, process.communicate()
        time.sleep(0.02)


def children(pid: int) -> list[int]:
    found = []
    for status in Path("/proc").glob("[0-9]*/status"):
        try:
            text = status.read_text()
        except OSError:
            continue
        if f"\nPPid:\t{pid}\n" in text:
            found.append(int(status.parent.name))
    return found


def alive(pid: int) -> bool:
    try:
        return "State:\tZ" not in Path(f"/proc/{pid}/status").read_text()
    except OSError:
        return False


def test_kill_nine_loses_only_work_in_flight_and_leaves_no_orphans(night):
    process = begin(night)
    wait_for_runs(night, process, 5)
    workers = children(process.pid)
    assert len(workers) == 2
    process.kill()
    process.communicate()
    until = time.monotonic() + 5
    while any(map(alive, workers)) and time.monotonic() < until:
        time.sleep(0.02)
    assert not any(map(alive, workers))
    finished = night.query("SELECT count(*) AS n FROM work WHERE stage = 'brew'")[0]["n"]
    assert finished >= 1
    process = begin(night)
    output, errors = process.communicate(timeout=60)
    assert process.returncode == 0, errors
    assert b"rank" in output
    assert len(set(night.runs())) == 8
    assert len(night.runs()) - 8 <= 4  # two in flight, and two that may have finished since the last commit


def test_interrupt_lets_running_stages_finish_and_keeps_them(night):
    process = begin(night)
    wait_for_runs(night, process, 3)
    os.kill(process.pid, signal.SIGINT)
    _, errors = process.communicate(timeout=60)
    assert process.returncode == 3
    assert b"candidates left" in errors
    runs = len(night.runs())
    assert runs < 8
    assert night.query("SELECT count(*) AS n FROM work WHERE stage = 'brew'") == [{"n": runs}]
    process = begin(night)
    process.communicate(timeout=60)
    assert process.returncode == 0
    assert len(night.runs()) == 8


def test_second_interrupt_stops_at_once(night):
    process = begin(night)
    wait_for_runs(night, process, 2)
    os.kill(process.pid, signal.SIGINT)
    time.sleep(0.05)
    os.kill(process.pid, signal.SIGINT)
    _, errors = process.communicate(timeout=60)
    assert process.returncode == 3
    assert b"Traceback" not in errors


def test_limit_takes_the_first_rows(night):
    process = begin(night, "--limit", "2")
    process.communicate(timeout=60)
    assert process.returncode == 0
    assert night.runs() == ["slow-a", "slow-b"]
