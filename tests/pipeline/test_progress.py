"""Signs of life: plain lines where nobody watches, a live line on a terminal."""

from __future__ import annotations

import io

import pytest
from orchil.progress import LiveProgress, PlainProgress, duration, for_stream


def test_plain_lines_come_once_a_minute():
    now = [0.0]
    stream = io.StringIO()
    progress = PlainProgress(stream, clock=lambda: now[0])
    progress.start(100, 3)
    for second in range(0, 121, 10):
        now[0] = float(second)
        progress.update(second // 10, 1)
    progress.end(13, 1, 86)
    assert stream.getvalue().splitlines() == [
        "orchil: 100 candidates to do, 3 finished before",
        "orchil: 7 of 100, 1 failed, 420 per hour, 13 min left",
        "orchil: 13 of 100, 1 failed, 390 per hour, 13 min left",
        "orchil: 13 done, 1 failed, 86 left in 2 min",
    ]


def test_a_stream_that_is_no_terminal_gets_plain_lines():
    assert isinstance(for_stream(io.StringIO()), PlainProgress)


def test_the_live_line_shows_counts(capsys):
    progress = LiveProgress()
    progress.start(4, 0)
    progress.update(2, 1)
    progress.say("[red]not markup[/red]")
    progress.end(3, 1, 0)
    shown = capsys.readouterr().err
    assert "4/4" in shown
    assert "1 failed" in shown
    assert "[red]not markup[/red]" in shown


@pytest.mark.parametrize(
    ("seconds", "text"), [(8.44, "8.4 s"), (59.9, "59.9 s"), (720, "12 min"), (11100, "3 h 05 min")]
)
def test_durations(seconds, text):
    assert duration(seconds) == text
