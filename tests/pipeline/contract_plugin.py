"""Stages that break the contract in one way each, and two that keep it; loaded through ORCHIL_EXTRA_PLUGINS."""

from __future__ import annotations

import os
import time
from pathlib import Path
from typing import ClassVar

import numpy as np
import pluggy
from orchil_schemas import (
    Availability,
    BadInput,
    Frozen,
    LibraryRow,
    NoSettings,
    Quantity,
    QuantityInfo,
    Record,
)
from pydantic import Field

hookimpl = pluggy.HookimplMarker("orchil")


def record(name, *, meaning="length of the structure"):
    """A record type of its own for a stage, with one quantity of the same name."""

    class Length(Record):
        """How long a text is."""

        kind = name
        length: float
        low: float | None = None
        offers: ClassVar = (QuantityInfo(name=name, unit="1", meaning=meaning),)

        def quantities(self):
            return (Quantity(name=name, value=self.length, unit="1", low=self.low, high=self.low),)

        def __reduce__(self):
            return rebuilt, (name, self.model_dump())

    return Length


def rebuilt(name, fields):
    return STAGES[name].makes[0](**fields)


class Sound:
    """Keeps the contract; the others differ in one point."""

    version = "1"
    needs = (LibraryRow,)
    Settings: type[Frozen] = NoSettings
    time_limit_seconds = 5.0

    def __init_subclass__(cls):
        cls.name = cls.__name__.lower()
        cls.makes = (record(cls.name, meaning=getattr(cls, "meaning", "length of the structure")),)

    def found(self):
        return Availability(True, {"fake": "1"})

    def run(self, inputs, settings, context):
        structure = inputs[LibraryRow].structure
        if not structure:
            raise BadInput("an empty structure has no length")
        return [self.makes[0](length=self.length(structure, context))]

    def length(self, structure, context):
        return float(len(structure))


class Good(Sound):
    pass


class Moody(Sound):
    def length(self, structure, context):
        return float(np.random.default_rng().random())


class Unpicklable(Sound):
    def __init__(self):
        self.helper = lambda: 1


class Terse(Sound):
    class Settings(Frozen):
        scale: float = 1.0


class Demanding(Sound):
    class Settings(Frozen):
        scale: float = Field(description="no default")


class Rude(Sound):
    def length(self, structure, context):
        raise ValueError("bang")


class Picky(Sound):
    def run(self, inputs, settings, context):
        if "B" not in inputs[LibraryRow].structure:
            raise BadInput("no")
        return super().run(inputs, settings, context)


class Careless(Sound):
    def length(self, structure, context):
        return float(len(structure)) if len(structure) > 3 else float("odd")


class Untidy(Sound):
    def length(self, structure, context):
        Path(os.environ["HOME"], "notes.txt").write_text(structure)
        return 1.0


class Outside(Sound):
    def run(self, inputs, settings, context):
        return [self.makes[0](length=1.0, low=2.0)]


class Slow(Sound):
    time_limit_seconds = 1.0

    def length(self, structure, context):
        time.sleep(0.6)
        return 1.0


class Scarred(Sound):
    """Leaves a mark while it runs, and takes it away at the end."""

    def length(self, structure, context):
        mark = Path(os.environ["HOME"], "mark")
        if mark.exists():
            return -1.0
        mark.touch()
        time.sleep(0.2)
        mark.unlink()
        return 1.0


class Mute(Sound):
    meaning = ""


class Helpless(Sound):
    def found(self):
        return Availability(False)


class Drifting(Sound):
    version = property(lambda self: str(time.time_ns()))


class Hasty(Sound):
    time_limit_seconds = 0.5


class Wanted:
    """A library stage that keeps the contract; the others differ in one point."""

    version = "1"
    Settings: type[Frozen] = NoSettings

    def __init_subclass__(cls):
        cls.name = cls.__name__.lower()
        cls.makes = (record(cls.name),)

    def found(self):
        return Availability(True)

    def reads(self, brief, settings):
        return ("good",)

    def run(self, table, brief, settings):
        values = np.nan_to_num(table.column("good").value)
        return [(at, self.makes[0](length=value)) for at, value in zip(table.candidate, values, strict=True)]


class GoodOfAll(Wanted):
    pass


class Twice(Wanted):
    def run(self, table, brief, settings):
        return [*super().run(table, brief, settings), *super().run(table, brief, settings)]


class Empty(Wanted):
    def run(self, table, brief, settings):
        assert np.nanmax(table.column("good").value) >= 0
        return super().run(table, brief, settings)


class Dreaming(Wanted):
    def reads(self, brief, settings):
        return ("beauty",)


class Dicing(Wanted):
    def run(self, table, brief, settings):
        chance = np.random.default_rng().random(len(table.candidate))
        return [(at, self.makes[0](length=value)) for at, value in zip(table.candidate, chance, strict=True)]


STAGES = {cls.name: cls for base in (Sound, Wanted) for cls in base.__subclasses__()}


@hookimpl
def orchil_stages():
    return [cls() for cls in STAGES.values()]
