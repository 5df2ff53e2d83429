"""Small stages without chemistry, for tests of the engine; loaded by workers through ORCHIL_EXTRA_PLUGINS.

The structure of a library row is a word; what the word begins with decides how the stage "brew" behaves.
"""

from __future__ import annotations

import ctypes
import os
import signal
import time
from pathlib import Path
from typing import ClassVar

import numpy as np
import pluggy
from orchil_schemas import (
    Availability,
    BadInput,
    Check,
    CheckResult,
    Frozen,
    LibraryRow,
    NoSettings,
    NotConverged,
    Quantity,
    QuantityInfo,
    Record,
    Score,
    WantResult,
)

hookimpl = pluggy.HookimplMarker("orchil")
LEAK: list[np.ndarray] = []


class Word(Record):
    kind = "word"
    text: str


class Aside(Record):
    kind = "aside"
    original: str


class Brew(Record):
    kind = "brew"
    strength: float
    attempt: int
    seed: int
    pid: int
    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="strength", unit="nm", meaning="length of the word"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        return (
            Quantity(name="strength", value=self.strength, unit="nm", low=self.strength - 1, high=self.strength + 1),
        )


class Label(Record):
    kind = "label"
    text: str


class Base:
    version = "1"
    Settings: type[Frozen] = NoSettings
    time_limit_seconds = 20.0

    def found(self) -> Availability:
        return Availability(True, {"fake": "1.0"})


class Read(Base):
    name, needs, makes = "read", (LibraryRow,), (Word, Aside)

    def run(self, inputs, settings, context):
        row = inputs[LibraryRow]
        if row.structure == "unreadable":
            raise BadInput("this word cannot be read")
        return Word(text=row.structure.lower()), Aside(original=row.structure)

    def check_brief(self, brief):
        return [f'unknown medium "{brief.medium}": use water'] if brief.medium == "mercury" else []


class BrewSettings(Frozen):
    scale: float = 1.0


def count_run(word: str) -> None:
    """Leave a mark for each run, so that tests can see what was repeated."""
    folder = os.environ.get("FAKE_RUNS")
    if folder:
        Path(folder, f"{word.split()[0][:20]}-{time.time_ns()}").touch()


class Brewing(Base):
    name, needs, makes, Settings = "brew", (Word,), (Brew,), BrewSettings
    time_limit_seconds = 3.0

    def run(self, inputs, settings, context):
        word = inputs[Word].text
        count_run(word)
        assert not list(context.scratch.iterdir())
        Path("left-behind").touch()
        behaviour = getattr(self, "do_" + word.split("-")[0], None)
        if behaviour:
            special = behaviour(context)
            if special is not None:
                return special
        return [
            Brew(
                strength=len(word) * settings.scale,
                attempt=context.attempt,
                seed=context.seed,
                pid=os.getpid(),
            )
        ]

    def do_segfault(self, context):
        ctypes.string_at(0)

    def do_forever(self, context):
        while True:
            time.sleep(10)

    def do_stubborn(self, context):
        signal.signal(signal.SIGTERM, signal.SIG_IGN)
        while True:
            pass

    def do_greedy(self, context):
        np.ones(1 << 34)

    def do_leak(self, context):
        LEAK.append(np.ones(40 << 17))

    def do_raise(self, context):
        raise RuntimeError("[bold]odd[/bold] <b>words</b>")

    def do_rubbish(self, context):
        return ["rubbish"]

    def do_nothing(self, context):
        return []

    def do_nan(self, context):
        return [Brew.model_construct(strength=float("nan"), attempt=1, seed=1, pid=1)]

    def do_invalid(self, context):
        return [Brew.model_construct(strength="strong", attempt=1, seed=1, pid=1)]

    def do_shy(self, context):
        if context.attempt == 1:
            raise NotConverged("not at the first try")

    def do_never(self, context):
        raise NotConverged(f"gave up at attempt {context.attempt}")

    def do_exit(self, context):
        os._exit(3)

    def do_slow(self, context):
        time.sleep(0.4)

    def do_killedonce(self, context):
        if context.attempt == 1:
            os.kill(os.getpid(), signal.SIGKILL)


class Labelling(Base):
    """A leaf that nobody wants: its failure must not cost the candidate."""

    name, needs, makes = "label", (Brew,), (Label,)

    def run(self, inputs, settings, context):
        if inputs[Brew].strength == 7:
            raise BadInput("sevens have no label")
        return [Label(text=f"{inputs[Brew].strength:g}")]


class Ranking(Base):
    name, makes = "rank_words", (Score,)

    def reads(self, brief, settings):
        return tuple(want.quantity for want in brief.want)

    def run(self, table, brief, settings):
        strength = table.column(brief.want[0].quantity).value
        order = np.argsort(-strength, kind="stable")
        for rank, at in enumerate(order, 1):
            chance = float(strength[at] / 100)
            want = WantResult(
                quantity=brief.want[0].quantity,
                value=float(strength[at]),
                probability=chance,
                weight=1,
                contribution=1,
            )
            yield (
                table.candidate[at],
                Score(rank=rank, score=chance, hit_probability=chance, pareto_front=1, wants=(want,)),
            )


@hookimpl
def orchil_stages():
    return [Read(), Brewing(), Labelling(), Ranking()]


@hookimpl
def orchil_checks():
    return [Check("words are words", lambda: CheckResult(True, "they are"))]
