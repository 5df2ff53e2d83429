"""A stage that runs on request, for test_recompute.py; loaded beside the fake plugin."""

from __future__ import annotations

from typing import ClassVar

import pluggy
from fake_plugin import Brew, Word  # type: ignore[import-not-found]
from orchil_schemas import Availability, Frozen, NoSettings, NotConverged, Quantity, QuantityInfo, Record

hookimpl = pluggy.HookimplMarker("orchil")


class Proof(Record):
    kind = "proof"
    letters: int
    offers: ClassVar[tuple[QuantityInfo, ...]] = (QuantityInfo(name="letters", unit="1", meaning="letters"),)

    def quantities(self) -> tuple[Quantity, ...]:
        return (Quantity(name="letters", value=self.letters, unit="1"),)


class Prove:
    name = "prove"
    version = "1"
    needs: tuple[type[Record], ...] = (Word, Brew)
    makes: tuple[type[Record], ...] = (Proof,)
    Settings: type[Frozen] = NoSettings
    time_limit_seconds = 5.0
    on_request = True

    def found(self) -> Availability:
        return Availability(True)

    def run(self, inputs, settings, context):
        word = inputs[Word].text
        if "q" in word:
            raise NotConverged("no word with a q can be proved: leave it out")
        return [Proof(letters=len(word))]


@hookimpl
def orchil_stages():
    return [Prove()]
