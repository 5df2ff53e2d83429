"""The time a night may take: when it ends, and which work can still end in time."""

from __future__ import annotations

import math
import time
from collections import deque
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime, timedelta

import numpy as np

from .errors import RequestError

GRACE_SECONDS = 30.0
LONGEST_HOURS = 8760.0
REMEMBERED = 200
"""So many durations of a stage count, the newest."""
CAUTIOUS = 0.75
"""The quantile of durations that a task is expected to take: one outlier among a few must not end the night."""


@dataclass(frozen=True)
class Budget:
    """The end of a night by the clock of the machine (seconds since 1970), so that a machine that slept keeps it."""

    ends_at: float
    grace_seconds: float = GRACE_SECONDS

    def left(self) -> float:
        """Seconds until the end, negative afterwards."""
        return self.ends_at - time.time()

    def __str__(self) -> str:
        return f"{datetime.fromtimestamp(self.ends_at):%Y-%m-%d %H:%M}"


def budget_of(until: str | None, hours: float | None, now: datetime | None = None) -> Budget | None:
    """The budget that the options ask for, None without any; :class:`RequestError` for what cannot be meant.

    ``until`` is a local time of day, ``now`` local time without a zone.
    """
    if until is not None and hours is not None:
        raise RequestError("--until and --hours exclude each other: give one of them")
    now = now or datetime.now()
    if until is not None:
        return Budget(_next(until, now).timestamp())
    return None if hours is None else Budget(now.timestamp() + _hours(hours) * 3600)


def _next(text: str, now: datetime) -> datetime:
    """The next time the clock shows ``text``; the length of that day is left to the time zone."""
    try:
        clock = datetime.strptime(text.strip(), "%H:%M")
    except ValueError:
        raise RequestError(f'--until {text}: that is no time of day; write hours and minutes like "07:00"') from None
    today = now.replace(hour=clock.hour, minute=clock.minute, second=0, microsecond=0)
    return today if today > now else today + timedelta(days=1)


def _hours(hours: float) -> float:
    if not math.isfinite(hours) or not 0 < hours <= LONGEST_HOURS:
        raise RequestError(f"--hours {hours:g}: write a number above 0 and up to {LONGEST_HOURS:g}, like 8 or 0.5")
    return hours


class Durations:
    """Wall seconds that stages have taken, from earlier runs and from this one."""

    def __init__(self, known: Mapping[str, Iterable[float]]) -> None:
        self._seconds = {stage: deque(seconds, REMEMBERED) for stage, seconds in known.items()}

    def note(self, stage: str, seconds: float) -> None:
        """Learn how long a stage took."""
        self._seconds.setdefault(stage, deque(maxlen=REMEMBERED)).append(seconds)

    def expected(self, stage: str) -> float:
        """Seconds that a stage is likely to take, 0 as long as nothing is known."""
        found = self._seconds.get(stage)
        return float(np.quantile(found, CAUTIOUS)) if found else 0.0
