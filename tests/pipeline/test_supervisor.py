"""The workers themselves: one thread each, private folders, replacement, nothing left behind."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

import pytest
from orchil import supervisor
from orchil.messages import Task
from orchil.supervisor import ONE_THREAD, STARTS_WITHOUT_SUCCESS, Supervisor, death, memory_kills
from orchil_schemas import canonical_json


def task(word, *, attempt=1, limit=20.0):
    inputs = [("word", canonical_json({"text": word}))]
    return Task(word, "brew", '{"scale":1.0}', inputs, 7, attempt, limit)


def results(pool, count):
    found = []
    until = time.monotonic() + 60
    while len(found) < count and time.monotonic() < until:
        found += pool.wait(0.5)
    return {result.task.key: result for result in found}


@pytest.fixture
def pool(fakes):
    with Supervisor(2) as made:
        yield made


def test_a_result_carries_records_times_and_versions(pool):
    pool.submit(task("alpha"))
    assert (pool.busy, pool.free) == (1, 1)
    reply = results(pool, 1)["alpha"].reply
    assert reply.ok
    assert [kind for kind, _ in reply.records] == ["brew"]
    assert '"seed":7' in reply.records[0][1]
    assert reply.versions == {"fake": "1.0"}
    assert 0 < reply.seconds < 20
    assert reply.cpu_seconds is not None


def test_children_run_with_one_thread(pool):
    pool.submit(task("alpha"))
    results(pool, 1)
    environment = Path(f"/proc/{pool.pids[0]}/environ").read_text().split("\0")
    assert {f"{name}={value}" for name, value in ONE_THREAD.items()} <= set(environment)


def test_the_scratch_folder_is_empty_private_and_gone_afterwards(pool):
    for word in ("alpha", "raise-1", "segfault-1", "forever-1"):
        pool.submit(task(word, limit=1.0))
        folder = Path(next(slot.task.scratch for slot in pool._slots if slot.task))
        results(pool, 1)
        assert folder.parent.is_dir()
        assert not folder.exists()
    base = folder.parent
    pool.close()
    assert not base.exists()


def test_a_worker_killed_from_outside_is_replaced(pool):
    pool.submit(task("slow-1"))
    while not any(slot.ready for slot in pool._slots):
        pool.wait(0.1)
    os.kill(pool.pids[0], signal.SIGKILL)
    reply = results(pool, 1)["slow-1"].reply
    told = memory_kills() is not None  # the system says whether it was short of memory
    assert (reply.ok, reply.code, reply.disturbed) == (False, "crashed" if told else "out_of_memory", told)
    assert reply.recoverable
    pool.submit(task("alpha"))
    assert results(pool, 1)["alpha"].reply.ok


def test_a_worker_that_the_system_kills_for_lack_of_memory_has_failed(pool, monkeypatch):
    pool.submit(task("slow-1"))
    while not any(slot.ready for slot in pool._slots):
        pool.wait(0.1)
    monkeypatch.setattr(supervisor, "memory_kills", lambda: 1 << 40)  # the system has killed something meanwhile
    os.kill(pool.pids[0], signal.SIGKILL)
    reply = results(pool, 1)["slow-1"].reply
    assert (reply.code, reply.recoverable, reply.disturbed) == ("out_of_memory", True, False)


def test_workers_killed_before_they_are_ready_do_not_end_the_run(pool):
    pool.submit(task("alpha"))
    for _ in range(STARTS_WITHOUT_SUCCESS if memory_kills() is not None else 1):
        os.kill(pool.pids[0], signal.SIGKILL)
        assert pool.wait(30) == []
    assert results(pool, 1)["alpha"].reply.ok


def test_an_idle_worker_killed_from_outside_is_replaced(pool):
    pool.submit(task("alpha"))
    results(pool, 1)
    os.kill(pool.pids[0], signal.SIGKILL)
    assert pool.wait(0.5) == []
    pool.submit(task("beta"))
    assert results(pool, 1)["beta"].reply.ok


def test_the_deadline_is_hard(pool):
    pool.submit(task("stubborn-1", limit=0.5))
    reply = results(pool, 1)["stubborn-1"].reply
    assert reply.code == "timeout"
    assert 0.5 <= reply.seconds < 3


def test_workers_are_replaced_after_some_tasks(fakes):
    with Supervisor(1, tasks_per_worker=2) as pool:
        pids = []
        for number in range(5):
            pool.submit(task(f"word-{number}"))
            pids += [pool.pids[0]]
            assert len(results(pool, 1)) == 1
    assert len(set(pids)) == 3


def test_nothing_is_left_running(fakes):
    with Supervisor(2) as pool:
        pool.submit(task("forever-1"))
        pool.submit(task("alpha"))
        results(pool, 1)
        pids = pool.pids
    for pid in pids:
        with pytest.raises(ProcessLookupError):
            os.kill(pid, 0)


@pytest.mark.parametrize(
    ("status", "words", "code", "part"),
    [
        (-11, "", "crashed", "SIGSEGV"),
        (-6, "what(): std::bad_alloc", "out_of_memory", "lack of memory"),
        (-9, "", "out_of_memory", "killed from outside"),
        (1, "one\nlast line", "crashed", "exit code 1; it last said: last line"),
        (-63, "", "crashed", "signal 63"),
    ],
)
def test_deaths_have_names(status, words, code, part):
    found, message = death(status, words)
    assert found == code
    assert part in message or status == -63
