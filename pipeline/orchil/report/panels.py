"""Panels of plugins, turned from data into parts of a page. A panel that fails is a sentence, never a lost page."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from orchil_schemas import Record
from orchil_schemas.panel import Chart, Drawing, Facts, Panel, Part, Scene, Subject, Words

from orchil.registry import Registry
from orchil.store import CandidatePage, ScreenInfo

from .charts import chart_svg
from .safe_svg import safe_svg
from .words import number, pretty_unit


@dataclass(frozen=True)
class Shown:
    """One part as a template needs it: ``kind`` names the way it is shown."""

    kind: str
    caption: str = ""
    alt: str = ""
    svg: str = ""
    text: tuple[str, ...] = ()
    facts: tuple[dict[str, str], ...] = ()
    scene: dict[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Section:
    """One panel on the page; ``problem`` says why there is nothing to see."""

    name: str
    title: str
    parts: tuple[Shown, ...] = ()
    problem: str = ""


class Panels:
    """Asks the panels of all plugins about candidates; ids of drawings are unlike on all of one page."""

    def __init__(self, registry: Registry) -> None:
        self._panels = registry.offers.ordered_panels()
        self._structures = registry.offers.structures
        kinds = [kind for stage in registry.stages.values() for kind in (*stage.needs, *stage.makes)]
        self._kinds: dict[str, type[Record]] = {kind.kind: kind for kind in kinds}
        self._number = itertools.count(1)

    def sections(self, page: CandidatePage, screen: ScreenInfo) -> list[Section]:
        """What every panel has to show of one candidate, in order."""
        subject = self._subject(page, screen)
        made = (self._section(panel, subject) for panel in self._panels if set(panel.needs) <= subject.records.keys())
        return [section for section in made if section.parts or section.problem]

    def drawing(self, smiles: str | None) -> str:
        """The structure as SVG, "" where there is none to draw."""
        if not smiles or self._structures is None:
            return ""
        found = self._structures.drawing(smiles)
        return "" if found is None else safe_svg(found.svg, self._prefix())

    def _subject(self, page: CandidatePage, screen: ScreenInfo) -> Subject:
        medium = str(page.row["medium"] or screen.brief.medium)
        return Subject(page.candidate.name, page.row["smiles"] or "", medium, screen.brief, self._records(page.records))

    def _records(self, payloads: Mapping[str, Any]) -> dict[type[Record], Record]:
        """The payloads as records; one that an installed stage no longer understands is left out."""
        made: dict[type[Record], Record] = {}
        for name, payload in payloads.items():
            kind = self._kinds.get(name)
            if kind is None:
                continue
            try:
                made[kind] = kind.model_validate(payload)
            except ValueError:
                continue
        return made

    def _section(self, panel: Panel, subject: Subject) -> Section:
        try:
            parts = tuple(itertools.chain.from_iterable(self._shown(part) for part in panel.parts(subject)))
        except Exception as error:
            said = f"this section could not be made: {type(error).__name__}: {error}"
            return Section(panel.name, panel.title, problem=said)
        return Section(panel.name, panel.title, parts)

    def _shown(self, part: Part) -> Iterator[Shown]:
        if isinstance(part, Words):
            yield Shown("words", text=part.text)
        elif isinstance(part, Facts):
            yield Shown("facts", caption=part.caption, facts=tuple(map(_fact, part.facts)))
        elif isinstance(part, Drawing):
            yield Shown("picture", part.caption, part.alt, safe_svg(part.svg, self._prefix()))
        elif isinstance(part, Chart):
            yield Shown("picture", part.caption, part.alt, safe_svg(chart_svg(part.spec), self._prefix()))
        elif isinstance(part, Scene):
            yield Shown("scene", part.caption, part.alt, scene=_scene(part))
        else:
            raise TypeError(f"{type(part).__name__} is no part of a panel")

    def _prefix(self) -> str:
        return f"g{next(self._number)}-"


def _fact(fact: Any) -> dict[str, str]:
    value = fact.text or number(fact.value, fact.low, fact.high)
    return {"label": fact.label, "value": value, "unit": pretty_unit(fact.unit), "meaning": fact.meaning}


def _scene(scene: Scene) -> dict[str, Any]:
    """Plain data for the browser, positions to a thousandth of an angstrom."""
    return {
        "atoms": scene.atomic_numbers.tolist(),
        "positions": scene.positions_angstrom.round(3).tolist(),
        "bonds": scene.bonds.tolist(),
        "arrows": [
            {
                "label": one.label,
                "start": one.start.round(3).tolist(),
                "end": one.end.round(3).tolist(),
                "both": one.both_ends,
            }
            for one in scene.arrows
        ],
        "shade": None if scene.shade is None else scene.shade.round(3).tolist(),
        "shadeLow": scene.shade_low,
        "shadeHigh": scene.shade_high,
    }
