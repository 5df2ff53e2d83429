"""`orchil show`: how the night stands, or one candidate on a page."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from orchil_schemas import Brief
from rich.console import Console
from rich.table import Table

from orchil.errors import RequestError
from orchil.progress import duration
from orchil.report.words import THIN, limits
from orchil.store import CandidatePage, ScreenInfo, Store, StoreError

from .anchored import anchor_tables, band_now
from .common import loaded_registry
from .numbers import number_tables
from .tables import NumberText, cell_text, console, digits, interval, missing, ranking_table, settled, table


def run_show(target: str, candidate: str | None) -> None:
    """Print the state of the screen, or the page of one candidate."""
    with Store.open_read_only(target) as store:
        screen = store.active_screen()
        if screen is None:
            raise RequestError("this store holds no screen yet: run `orchil screen` first")
        if candidate is None:
            _show_night(store, screen, console())
            return
        page = store.candidate_page(candidate)
        if page is None:
            raise RequestError(f'there is no candidate "{candidate}" in this store')
        _show_page(page, screen, console(), _numbers(store, page))


def _numbers(store: Store, page: CandidatePage) -> list[Table]:
    try:
        return list(number_tables(store, page, loaded_registry()))
    except StoreError:  # a database server answers its own client, not `query`
        return []


# The night


def _show_night(store: Store, screen: ScreenInfo, out: Console) -> None:
    out.print(cell_text(f"{screen.brief.title}: {screen.library}, begun {screen.created:%Y-%m-%d %H:%M} UTC"))
    out.print(table(["status", "candidates"], _counts(store)))
    _print_query(store, out, "failures by reason", _FAILURES)
    _print_query(store, out, "time by stage", _TIMING)
    best = store.ranking(limit=5)
    best = best[best["rank"].notna()]
    if len(best):
        out.print(ranking_table(best.drop(columns="cautions"), screen.brief.medium, out.width, title="best so far"))


def _counts(store: Store) -> list[tuple[str, int]]:
    statuses = [state.status for state in store.candidates()]
    return [(status, statuses.count(status)) for status in ("done", "failed", "waiting")]


_FAILURES = """
SELECT failed_stage AS stage, reason_code AS reason, count(*) AS candidates, min(reason) AS example
FROM failures GROUP BY 1, 2 ORDER BY candidates DESC
"""
_TIMING = """
SELECT stage, n AS runs, n - ok AS "not ok", total_seconds AS "total s", total_seconds / n AS "mean s",
    longest_seconds AS "longest s", total_cpu_seconds AS "CPU s" FROM timing
"""


def _print_query(store: Store, out: Console, title: str, sql: str) -> None:
    rows = store.query(sql)
    if len(rows):
        out.print(table([str(name) for name in rows.columns], rows.itertuples(index=False), title=title))


# One candidate


def _show_page(page: CandidatePage, screen: ScreenInfo, out: Console, numbers: Iterable[Table]) -> None:
    state, row = page.candidate, page.row
    out.print(cell_text(f"{state.name} (row {state.row_number}) in {state.medium or screen.brief.medium}"))
    for sentence in _sentences(page):
        out.print(cell_text(sentence))
    if not missing(row.get("absorption_max_nm")):
        out.print(table(["band", "value", "unit"], _band_rows(row, band_now(page.records))))
    for made in anchor_tables(page.records):
        out.print(made)
    if page.wants:
        out.print(table(_WANT_HEADERS, _want_rows(page, screen.brief)))
    if "transitions" in page.records:
        out.print(table(_STATE_HEADERS, _state_rows(page.records["transitions"]), title="states"))
    if weak := _weak_rows(page.records.get("state_analysis", {})):
        out.print(table(["state", "why it is weak"], weak))
    for made in numbers:
        out.print(made)
    if page.attempts:
        out.print(table(_ATTEMPT_HEADERS, map(_attempt_row, page.attempts), title="attempts"))
    if page.extra:
        out.print(table(["column of the library", "value"], page.extra.items()))


def _sentences(page: CandidatePage) -> list[str]:
    """What there is to say, in order: structure, state, standing, twins, cautions, notes."""
    row, notes = page.row, page.records.get("intake_notes", {})
    structure = row["smiles"] or (page.candidate.structure if page.candidate.format == "smiles" else "a mol block")
    said = [f"structure: {structure}", f"status: {page.candidate.status}"]
    if row["reason"]:
        said.append(f"reason: {row['reason']}")
    if page.score is not None:
        said.append(_standing(page.score))
    if page.duplicate_of:
        said.append(f"the same species as {page.duplicate_of}, computed once")
    if page.repeated_by:
        said.append(f"repeated by {', '.join(page.repeated_by)}")
    if page.same_name:
        said.append(f"other candidates of this name: {', '.join(map(str, page.same_name))} (ids)")
    if row["cautions"]:
        said.append(f"cautions: {row['cautions']}")
    return said + [f"note: {note}" for note in notes.get("notes", ())]


def _standing(score: Mapping[str, Any]) -> str:
    pick = "" if missing(score["pick"]) else f", pick {score['pick']}"
    return (
        f"rank {score['rank']}{pick}: score {score['score']:.3f}, probability of meeting every want "
        f"{score['hit_probability']:.3f}, Pareto front {score['pareto_front']}"
    )


_BAND = {
    "molar_absorptivity": ("molar absorptivity", "M^-1 cm^-1"),
    "width_ev": ("full width at half maximum", "eV"),
    "oscillator_strength": ("oscillator strength", ""),
    "transition_dipole_debye": ("transition dipole", "debye"),
    "long_axis_angle_deg": ("angle to the long axis", "degree"),
    "electron_shift_angstrom": ("electron shift", "angstrom"),
    "emission_max_nm": ("emission maximum", "nm"),
    "trust": ("against what the model was trained on", ""),
}


def _band_rows(row: Mapping[str, Any], band: Mapping[str, Any]) -> list[tuple[object, ...]]:
    span = interval(row["absorption_max_nm"], row["absorption_low_nm"], row["absorption_high_nm"])
    rest = [(name, _spanned(row, band, key), unit) for key, (name, unit) in _BAND.items() if not missing(row[key])]
    return [("absorption maximum", span, "nm"), *rest]


def _spanned(row: Mapping[str, Any], band: Mapping[str, Any], key: str) -> object:
    """The value with its interval where the band has one (``emission_max_nm`` goes with ``emission_low_nm``)."""
    stem = key.replace("_max_nm", "")
    unit = "_nm" if stem != key else ""
    low, high = band.get(f"{stem}_low{unit}"), band.get(f"{stem}_high{unit}")
    if low is None or high is None:
        return settled(row[key])
    value, least, most = (float(f"{float(number):.3g}") for number in (row[key], low, high))
    return interval(value, least, most)


_WANT_HEADERS = ["want", "wanted", "value", "probability", "weight", "share of the loss"]


def _want_rows(page: CandidatePage, brief: Brief) -> list[tuple[object, ...]]:
    """Each want with its limits; those of a store and its brief stand in the same order."""
    keys = ("value", "probability", "weight", "contribution")
    said = [limits(want, want.unit or "").replace(THIN, " ") for want in brief.want]
    wanted = [text + (", a must" if want.must else "") for text, want in zip(said, brief.want, strict=True)]
    return [(row["quantity"], wanted[row["position"] - 1], *(row[key] for key in keys)) for row in page.wants]


_STATE_HEADERS = [
    "state",
    "energy eV",
    "nm",
    "f",
    "transition dipole debye",
    "angle degree",
    "shift angstrom",
    "CT share",
]


def _state_rows(transitions: Mapping[str, Any]) -> list[tuple[object, ...]]:
    from orchil_schemas import HC_EV_NM

    rows = []
    for at, energy in enumerate(transitions["energy_ev"]):
        dipole = " ".join(f"{part:.2f}" for part in transitions["transition_dipole_debye"][at])
        numbers = [
            transitions[key][at] for key in ("long_axis_angle_deg", "electron_shift_angstrom", "charge_transfer_share")
        ]
        strength = NumberText(digits(transitions["oscillator_strength"][at]))
        rows.append(
            (
                at + 1,
                NumberText(f"{energy:.3f}"),
                NumberText(f"{HC_EV_NM / energy:.0f}"),
                strength,
                dipole,
                *numbers,
            )
        )
    return rows


def _weak_rows(analysis: Mapping[str, Any]) -> list[tuple[object, ...]]:
    return [(at, text) for at, text in enumerate(analysis.get("explanation", ()), 1) if text]


_ATTEMPT_HEADERS = ["stage", "version", "attempt", "result", "time", "host", "versions"]


def _attempt_row(attempt: Mapping[str, Any]) -> tuple[object, ...]:
    result = "ok" if attempt["ok"] else f"{attempt['reason_code']}: {attempt['reason']}"
    seconds = "" if missing(attempt["seconds"]) else duration(attempt["seconds"])
    versions = ", ".join(f"{name} {text}" for name, text in (attempt["versions"] or {}).items())
    return (
        attempt["stage"],
        attempt["stage_version"],
        attempt["attempt"],
        result,
        seconds,
        attempt["host"],
        versions,
    )
