"""How a run shows that it is alive: a live line on a terminal, else a plain line a minute, on stderr."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, Protocol, TextIO

if TYPE_CHECKING:
    from rich.progress import Progress as RichProgress

PLAIN_SECONDS = 60.0


class Progress(Protocol):
    """What the runner tells while it runs."""

    def start(self, total: int, finished_before: int) -> None:
        """Begin with ``total`` candidates to do."""

    def update(self, done: int, failed: int) -> None:
        """Tell the counts so far."""

    def end(self, done: int, failed: int, left: int) -> None:
        """Tell the final counts."""

    def say(self, text: str) -> None:
        """Tell one sentence."""


class PlainProgress:
    """One line at the start, one a minute, one at the end."""

    def __init__(self, stream: TextIO, *, every: float = PLAIN_SECONDS, clock: Callable[[], float] = time.monotonic):
        self._stream = stream
        self._every = every
        self._clock = clock
        self._total = 0
        self._began = self._spoke = clock()

    def start(self, total: int, finished_before: int) -> None:
        """Say how much there is to do."""
        self._total = total
        self._began = self._spoke = self._clock()
        before = f", {finished_before} finished before" if finished_before else ""
        self.say(f"{total} candidates to do{before}")

    def update(self, done: int, failed: int) -> None:
        """Say the counts, if a minute has passed."""
        if self._clock() - self._spoke >= self._every:
            self._spoke = self._clock()
            self.say(self._counts(done, failed))

    def end(self, done: int, failed: int, left: int) -> None:
        """Say the final counts."""
        seconds = self._clock() - self._began
        rest = f", {left} left" if left else ""
        self.say(f"{done} done, {failed} failed{rest} in {duration(seconds)}")

    def say(self, text: str) -> None:
        """Write one line."""
        print(f"orchil: {text}", file=self._stream, flush=True)

    def _counts(self, done: int, failed: int) -> str:
        seconds = max(self._clock() - self._began, 1e-9)
        rate = (done + failed) / seconds
        left = duration((self._total - done - failed) / rate) if rate else "unknown time"
        return f"{done + failed} of {self._total}, {failed} failed, {rate * 3600:.0f} per hour, {left} left"


class LiveProgress:
    """A line that renews itself, with rate and time left."""

    def __init__(self) -> None:
        from rich.console import Console
        from rich.progress import (
            BarColumn,
            MofNCompleteColumn,
            TextColumn,
            TimeElapsedColumn,
            TimeRemainingColumn,
        )
        from rich.progress import Progress as RichProgress

        self._bar: RichProgress = RichProgress(
            TextColumn("{task.description}"),
            BarColumn(),
            MofNCompleteColumn(),
            TextColumn("{task.fields[rate]}"),
            TextColumn("{task.fields[failed]} failed"),
            TimeElapsedColumn(),
            TimeRemainingColumn(),
            console=Console(stderr=True),
        )
        self._task: Any = None
        self._began = time.monotonic()

    def start(self, total: int, finished_before: int) -> None:
        """Show the line."""
        self._began = time.monotonic()
        self._task = self._bar.add_task("screening", total=total, failed=0, rate="")
        self._bar.start()

    def update(self, done: int, failed: int) -> None:
        """Renew the counts."""
        rate = (done + failed) / max(time.monotonic() - self._began, 1e-9)
        self._bar.update(self._task, completed=done + failed, failed=failed, rate=f"{rate * 3600:.0f}/h")

    def end(self, done: int, failed: int, left: int) -> None:
        """Leave the line as it is at the end."""
        self.update(done, failed)
        self._bar.stop()

    def say(self, text: str) -> None:
        """Print a sentence above the line."""
        from rich.text import Text

        self._bar.console.print(Text(text))


def for_stream(stream: TextIO | None = None) -> Progress:
    """The fitting kind of progress for ``stream`` (stderr when not given)."""
    stream = stream or sys.stderr
    return LiveProgress() if stream.isatty() else PlainProgress(stream)


def duration(seconds: float) -> str:
    """A span as people read it: ``8.4 s``, ``12 min``, ``3 h 05 min``."""
    if seconds < 60:
        return f"{seconds:.1f} s"
    minutes = round(seconds / 60)
    return f"{minutes} min" if minutes < 60 else f"{minutes // 60} h {minutes % 60:02d} min"
