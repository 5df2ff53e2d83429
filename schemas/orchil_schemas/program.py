"""Running a program of somebody else's inside a stage: own folder, time limit, captured output, version.

Everything happens below ``context.scratch``, which is empty at the beginning and gone at the end. The program and
all it started are killed when the stage's time is up, and the end of what it said becomes part of the reason.
"""

from __future__ import annotations

import os
import re
import shutil
import signal
import subprocess
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from .errors import BadResult, NotConverged
from .stage import Availability, Context

GRACE_SECONDS = 2.0
"""The program is stopped this long before the deadline, so that the stage can still say why."""
VERSION_SECONDS = 10.0
SHOWN = 300


@dataclass(frozen=True)
class Finished:
    """A program that ended well: what it said, and the folder with the files it left."""

    stdout: str
    stderr: str
    folder: Path

    def text(self, name: str) -> str:
        """A file that it must have left; :class:`BadResult` names what is missing."""
        path = self.folder / name
        if not path.is_file():
            raise BadResult(f"the program left no file {name}{_said(self.stdout, self.stderr)}")
        return path.read_text(encoding="utf-8", errors="replace")


def run_program(
    command: Sequence[str],
    context: Context,
    *,
    files: Mapping[str, str] | None = None,
    stdin: str = "",
    environment: Mapping[str, str] | None = None,
) -> Finished:
    """Run ``command`` on ``files`` (name to text) in a new folder below the scratch folder.

    :class:`NotConverged` when time runs out or the program ends with an error; both are tried once more by the engine.
    """
    folder = context.scratch / f"program-{len(list(context.scratch.iterdir()))}"
    folder.mkdir()
    for name, text in (files or {}).items():
        (folder / name).write_text(text, encoding="utf-8")
    process = subprocess.Popen(
        list(command),
        cwd=folder,
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        errors="replace",
        env={**os.environ, **(environment or {})},
        start_new_session=True,
    )
    seconds = max(0.0, context.seconds_left() - GRACE_SECONDS)
    try:
        stdout, stderr = process.communicate(stdin, timeout=None if seconds == float("inf") else seconds)
    except subprocess.TimeoutExpired:
        os.killpg(process.pid, signal.SIGKILL)
        stdout, stderr = process.communicate()
        raise NotConverged(f"{command[0]} was stopped after {seconds:.0f} s{_said(stdout, stderr)}") from None
    if process.returncode != 0:
        raise NotConverged(f"{command[0]} ended with code {process.returncode}{_said(stdout, stderr)}")
    return Finished(stdout, stderr, folder)


def program_found(
    name: str, hint: str, *, arguments: Sequence[str] = ("--version",), pattern: str = r"\d+(?:\.\d+)+"
) -> Availability:
    """Is the program on the path, and which version says it is? For ``found`` of a stage; never raises."""
    path = shutil.which(name)
    if path is None:
        return Availability(False, hint=f"{name} is not on the path: {hint}")
    try:
        done = subprocess.run(
            [path, *arguments], capture_output=True, text=True, errors="replace", timeout=VERSION_SECONDS, check=False
        )
    except (OSError, subprocess.TimeoutExpired) as error:
        return Availability(False, hint=f"{name} does not answer ({type(error).__name__}): {hint}")
    found = re.search(pattern, done.stdout + done.stderr)
    return Availability(True, {name: found.group() if found else "unknown"})


def _said(stdout: str, stderr: str) -> str:
    last = " ".join((stderr.strip() or stdout.strip()).split())[-SHOWN:]
    return f"; it last said: {last}" if last else ""
