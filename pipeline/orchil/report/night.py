"""What there is to tell about a night: brief, funnel, failures, quantities, versions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from orchil_schemas import QuantityInfo

from orchil.errors import RequestError
from orchil.registry import Registry
from orchil.store import ScreenInfo, Store

from .table import Ask, records
from .words import Named, named, pick_sentence, want_sentence


@dataclass(frozen=True)
class Step:
    """One step of the funnel: how many candidates are left, and what it means."""

    label: str
    count: int
    share: float
    meaning: str


@dataclass(frozen=True)
class Night:
    """A screen for display."""

    screen: ScreenInfo
    quantities: Mapping[str, Named]
    wants: tuple[str, ...]
    pick: str
    funnel: tuple[Step, ...]
    failures: tuple[dict[str, Any], ...]
    versions: Mapping[str, str]

    @property
    def over(self) -> bool:
        """Nothing is waiting any more."""
        return all(step.label != WAITING for step in self.funnel)

    @property
    def wanted(self) -> list[str]:
        """Quantities of the brief, each once, in its order."""
        return list(dict.fromkeys(want.quantity for want in self.screen.brief.want))


def read_night(store: Store, registry: Registry) -> Night:
    """Read what the top of a page shows; :class:`RequestError` when there is no screen yet."""
    screen = store.active_screen()
    if screen is None:
        raise RequestError("this store holds no screen yet: run `orchil screen` first")
    ask = store.query
    quantities = known_quantities(ask, registry)
    brief = screen.brief
    return Night(
        screen=screen,
        quantities=quantities,
        wants=tuple(want_sentence(want, quantities[want.quantity]) for want in brief.want),
        pick=pick_sentence(brief),
        funnel=_funnel(ask, screen, quantities),
        failures=tuple(records(ask(_FAILURES, ()))),
        versions={name: text for name, text in screen.versions.items() if name != "computation"},
    )


def known_quantities(ask: Ask, registry: Registry) -> dict[str, Named]:
    """Quantities that the store holds or the brief wants, with what the installed stages say of them."""
    infos: dict[str, QuantityInfo] = {
        info.name: info for stage in registry.stages.values() for kind in stage.makes for info in kind.offers
    }
    held = records(ask(_HELD, ()))
    wanted = records(ask(_WANTED, ()))
    names = {one["name"]: one.get("unit") for one in (*wanted, *held)}
    order = [*infos, *sorted(names.keys() - infos.keys())]
    found = {}
    for name in (name for name in order if name in names):
        info = infos.get(name)
        unit = names[name] or (info.unit if info else "1")
        found[name] = named(name, unit, info.meaning if info else "")
    return found


# One look into the index for each name: a count over all rows would read the whole largest table.
_HELD = """
WITH RECURSIVE n(name) AS (
    SELECT min(name) FROM quantity
    UNION ALL
    SELECT (SELECT min(q.name) FROM quantity q WHERE q.name > n.name) FROM n WHERE n.name IS NOT NULL
)
SELECT n.name, (SELECT q.unit FROM quantity q WHERE q.name = n.name LIMIT 1) AS unit FROM n WHERE n.name IS NOT NULL
"""

WAITING = "still waiting"

_WANTED = """
SELECT DISTINCT json_extract(w.value, '$.quantity') AS name, json_extract(w.value, '$.unit') AS unit
FROM screen, json_each(screen.brief, '$.want') w
WHERE screen.id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
"""

_FAILURES = """
SELECT failed_stage AS stage, reason_code AS code, count(*) AS count, min(candidate) AS example, min(reason) AS says
FROM failures GROUP BY failed_stage, reason_code ORDER BY count DESC
"""

# Counts run over indexes alone. What is not done may have a score from before; there are few of those at the end.
_STATUS = "SELECT status, count(*) AS n FROM candidate GROUP BY status"
_NOT_DONE = "(SELECT id FROM candidate WHERE status IN ('failed', 'waiting'))"
_COUNTS = f"""
SELECT count(*) AS ranked, sum(hit_probability >= 0.5) AS likely, sum(pick IS NOT NULL) AS picked
FROM score WHERE screen_id = ? AND candidate_id NOT IN {_NOT_DONE}
"""
_MET = f"""
SELECT position, sum(probability >= 0.5) AS n FROM want_result
WHERE screen_id = ? AND candidate_id NOT IN {_NOT_DONE} GROUP BY position
"""


def _funnel(ask: Ask, screen: ScreenInfo, quantities: Mapping[str, Named]) -> tuple[Step, ...]:
    counts = {"failed": 0, "waiting": 0} | {one["status"]: one["n"] for one in records(ask(_STATUS, ()))}
    whole = sum(counts.values())
    counts |= {key: int(value or 0) for key, value in records(ask(_COUNTS, (screen.id,)))[0].items()}
    met = {one["position"]: one["n"] for one in records(ask(_MET, (screen.id,)))}
    steps = [("in the library", whole, "rows of the file")]
    if counts["waiting"]:
        steps.append((WAITING, counts["waiting"], "the night is not over, or was stopped"))
    steps += [
        ("failed", counts["failed"], "each with a reason, below"),
        ("ranked", counts["ranked"], "everything the brief wants was computed"),
        *(
            (f"meet {quantities[want.quantity].label}", met.get(at, 0), "probability of one half or more")
            for at, want in enumerate(screen.brief.want, 1)
        ),
        ("meet every want", counts["likely"], "probability of all wants together one half or more"),
        ("picked", counts["picked"], "the diverse choice"),
    ]
    return tuple(Step(text, count, count / max(whole, 1), meaning) for text, count, meaning in steps)
