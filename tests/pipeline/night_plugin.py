"""Quick stages for nights that are cut short or disturbed; loaded by workers through ORCHIL_EXTRA_PLUGINS.

A structure is ``NAME-MASS-MILLISECONDS``. Stage "weigh" is cheap and knows mass and length of the name; "ponder"
sleeps and draws a number from its seed; "conclude" works on with it. Each leaves a mark when it
begins. The worker that is the first to ponder the word FAKE_STRUCK is killed over it.
"""

from __future__ import annotations

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
    Frozen,
    Identity,
    LibraryRow,
    NoSettings,
    Quantity,
    QuantityInfo,
    Record,
)
from orchil_stages.score import Score

hookimpl = pluggy.HookimplMarker("orchil")


class Numbered(Record):
    """A record of one number, offered under the name of its kind."""

    kind = "numbered"
    value: float

    def quantities(self) -> tuple[Quantity, ...]:
        return (Quantity(name=self.kind, value=self.value, unit="1"),)


class Weight(Record):
    kind = "weight"
    word: str
    milliseconds: float


class Depth(Numbered):
    kind = "depth"
    offers: ClassVar[tuple[QuantityInfo, ...]] = (QuantityInfo(name="depth", unit="1", meaning="drawn"),)


class Height(Numbered):
    kind = "height"
    offers: ClassVar[tuple[QuantityInfo, ...]] = (QuantityInfo(name="height", unit="1", meaning="worked out"),)


class Base:
    version = "1"
    Settings: type[Frozen] = NoSettings
    time_limit_seconds = 100.0

    def found(self) -> Availability:
        return Availability(True)


def mark(stage: str, what: str) -> bool:
    """One file for each beginning; was there one before?"""
    folder = Path(os.environ["FAKE_RUNS"])
    earlier = any(folder.glob(f"{stage} {what}-*"))
    folder.joinpath(f"{stage} {what}-{time.time_ns()}").touch()
    return earlier


class Weigh(Base):
    name, needs, makes = "weigh", (LibraryRow,), (Weight, Identity)
    time_limit_seconds = 20.0

    def run(self, inputs, settings, context):
        mark("weigh", inputs[LibraryRow].structure)
        word = inputs[LibraryRow].structure.lower()
        name, mass, milliseconds = word.split("-")
        if name == "unreadable":
            raise BadInput("this cannot be weighed")
        size = len(name)
        identity = Identity(
            smiles=name,
            inchikey=word,
            formula=name,
            charge=0,
            atoms=size,
            heavy_atoms=size,
            molar_mass_g_mol=float(mass),
            fixed_hydrogen_layer="",
            zwitterion=False,
        )
        return Weight(word=word, milliseconds=float(milliseconds)), identity


class Ponder(Base):
    name, needs, makes = "ponder", (Weight,), (Depth,)

    def run(self, inputs, settings, context):
        weight = inputs[Weight]
        earlier = mark("ponder", weight.word)
        if weight.word == os.environ.get("FAKE_STRUCK") and not earlier:
            os.kill(os.getpid(), signal.SIGKILL)
        time.sleep(weight.milliseconds / 1000)
        return [Depth(value=float(np.random.default_rng([context.seed, context.attempt]).normal()))]


class Conclude(Base):
    name, needs, makes = "conclude", (Weight, Depth), (Height,)

    def run(self, inputs, settings, context):
        mark("conclude", inputs[Weight].word)
        time.sleep(inputs[Weight].milliseconds / 3000)
        return [Height(value=float(np.exp(inputs[Depth].value) / context.attempt))]


class Judge(Score):
    """Our own ranking under another name: workers load our own stages beside these."""

    name = "judge"


@hookimpl
def orchil_stages():
    return [Weigh(), Ponder(), Conclude(), Judge()]
