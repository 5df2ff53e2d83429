"""Running somebody else's program in a stage: own folder, time limit, captured output, version."""

from __future__ import annotations

import os
import sys
import time
from pathlib import Path

import pytest
from orchil_schemas import BadResult, Context, NotConverged
from orchil_schemas.program import program_found, run_program

PYTHON = sys.executable


@pytest.fixture
def context(tmp_path):
    return Context(tmp_path, seed=1)


def test_it_works_on_its_files_in_a_folder_of_its_own(context, tmp_path):
    code = "import sys; open('out.txt', 'w').write(open('in.txt').read().upper() + sys.stdin.read()); print('done')"
    done = run_program([PYTHON, "-c", code], context, files={"in.txt": "abc"}, stdin="!", environment={"X": "1"})
    assert (done.stdout, done.stderr, done.text("out.txt")) == ("done\n", "", "ABC!")
    assert done.folder.parent == tmp_path
    again = run_program([PYTHON, "-c", "import os; print(os.listdir())"], context)
    assert (again.stdout, again.folder == done.folder) == ("[]\n", False)


def test_a_missing_file_and_a_bad_end_carry_what_the_program_said(context):
    code = "import sys; print('no basis for Xx', file=sys.stderr); sys.exit({})"
    with pytest.raises(BadResult, match=r"left no file out\.txt; it last said: no basis for Xx"):
        run_program([PYTHON, "-c", code.format(0)], context).text("out.txt")
    with pytest.raises(NotConverged, match="ended with code 3; it last said: no basis for Xx"):
        run_program([PYTHON, "-c", code.format(3)], context)


def test_it_is_stopped_with_all_it_started_before_the_deadline(tmp_path):
    code = (
        "import subprocess, sys, time; child = subprocess.Popen([sys.executable, '-c', 'import time; time.sleep(60)']);"
        "print(child.pid, flush=True); time.sleep(60)"
    )
    began = time.monotonic()
    with pytest.raises(NotConverged, match="was stopped after 1 s; it last said: ") as caught:
        run_program([PYTHON, "-c", code], Context(tmp_path, seed=1, deadline=began + 3.4))
    assert time.monotonic() - began < 30
    child = int(str(caught.value).rsplit(" ", 1)[1])
    deadline = time.monotonic() + 10
    while _runs(child) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not _runs(child)


def _runs(pid):
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"


def test_the_version_is_found_or_a_hint_is_given(tmp_path, monkeypatch):
    tool = tmp_path / "mytool"
    tool.write_text("#!/bin/sh\necho mytool release 4.2.1 >&2\n")
    tool.chmod(0o755)
    monkeypatch.setenv("PATH", str(tmp_path), prepend=":")
    found = program_found("mytool", "ask the author")
    assert (found.ok, found.versions) == (True, {"mytool": "4.2.1"})
    absent = program_found("no-such-tool", "ask the author")
    assert (absent.ok, absent.hint) == (False, "no-such-tool is not on the path: ask the author")
