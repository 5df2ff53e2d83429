"""Tables for people: sensible digits, units in headers, text of users never taken for markup."""

from __future__ import annotations

import math
import sys
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, TextIO

from rich import box
from rich.console import Console
from rich.table import Table
from rich.text import Text

if TYPE_CHECKING:
    import pandas as pd

WIDTH_OF_FILES = 200
"""Columns when the output is no terminal."""

RANKING = {
    "rank": "rank",
    "pick": "pick",
    "candidate": "candidate",
    "medium": "medium",
    "score": "score",
    "hit_probability": "hit\nprobability",
    "absorption_max_nm": "absorption\nmaximum\nnm",
    "molar_absorptivity": "molar\nabsorptivity\nM^-1 cm^-1",
    "oscillator_strength": "oscillator\nstrength",
    "transition_dipole_debye": "transition\ndipole\ndebye",
    "long_axis_angle_deg": "angle to\nlong axis\ndegree",
    "electron_shift_angstrom": "electron\nshift\nangstrom",
    "emission_max_nm": "emission\nmaximum\nnm",
    "cautions": "cautions",
}
"""Columns of the ranking table with their headers."""

GIVES_WAY = (
    "electron_shift_angstrom",
    "transition_dipole_debye",
    "emission_max_nm",
    "oscillator_strength",
    "long_axis_angle_deg",
    "medium",
    "hit_probability",
    "pick",
    "molar_absorptivity",
)
"""Columns that are left out in a narrow window, the first ones first."""


def console(stream: TextIO | None = None) -> Console:
    """A console on ``stream`` (stdout when not given) that leaves text alone."""
    stream = stream or sys.stdout
    width = None if stream.isatty() else WIDTH_OF_FILES
    return Console(file=stream, width=width, markup=False, highlight=False, emoji=False)


def table(headers: Sequence[str], rows: Iterable[Sequence[object]], *, title: str | None = None) -> Table:
    """A table of plain cells; columns of numbers are flush right."""
    cells = [list(row) for row in rows]
    made = Table(box=box.SIMPLE_HEAD, title=Text(title) if title else None, title_justify="left", pad_edge=False)
    for at, header in enumerate(headers):
        numeric = bool(cells) and all(missing(row[at]) or row[at] == "" or is_number(row[at]) for row in cells)
        made.add_column(Text(header), justify="right" if numeric else "left", overflow="fold")
    for row in cells:
        made.add_row(*(Text(cell_text(cell)) for cell in row))
    return made


def is_number(value: object) -> bool:
    """True for numbers and for intervals made by :func:`interval`."""
    return (isinstance(value, (int, float)) and not isinstance(value, bool)) or isinstance(value, NumberText)


class NumberText(str):
    """Text of a number, to be set flush right."""

    __slots__ = ()


def cell_text(value: object) -> str:
    """The text of one cell; control characters are made visible."""
    if missing(value):
        return ""
    text = digits(float(value)) if isinstance(value, float) else str(value)
    return "".join(char if char.isprintable() or char == "\n" else repr(char)[1:-1] for char in text)


def missing(value: object) -> bool:
    """None, NaN and the missing value of pandas."""
    return value is None or str(value) == "<NA>" or (isinstance(value, float) and math.isnan(value))


def digits(value: float, significant: int = 3) -> str:
    """A number with three significant digits and no exponent between 0.001 and a billion."""
    if value == 0 or not math.isfinite(value):
        return f"{value:g}"
    magnitude = math.floor(math.log10(abs(value)))
    if not -4 < magnitude < 9:
        return f"{value:.{significant - 1}e}"
    decimals = max(0, significant - 1 - magnitude)
    return f"{round(value, significant - 1 - magnitude):.{decimals}f}"


def interval(value: Any, low: Any, high: Any, decimals: int = 0) -> str:
    """``532 (505-561)``, or the value alone where there is no interval."""
    if missing(value):
        return NumberText("")
    if missing(low) or missing(high):
        return NumberText(f"{value:.{decimals}f}")
    return NumberText(f"{value:.{decimals}f} ({low:.{decimals}f}-{high:.{decimals}f})")


def ranking_table(ranking: pd.DataFrame, medium: str, width: int, *, title: str | None = None) -> Table:
    """The ranking with those columns that hold something and fit into ``width``.

    ``medium`` stands where the library names none. The caption tells how many columns had no room.
    """
    rows = [ranking_cells(row, medium) for row in ranking.to_dict("records")]
    shown = [key for key in RANKING if any(not missing(row[key]) and row[key] != "" for row in rows)]
    made, left_out = _ranking(shown, rows, title), 0
    for key in (key for key in GIVES_WAY if key in shown):
        if natural_width(made) <= width:
            break
        shown.remove(key)
        made, left_out = _ranking(shown, rows, title), left_out + 1
    if left_out:
        made.caption = Text(f"{left_out} more columns in a wider window and in the view `ranking`")
        made.caption_justify = "left"
    return made


def _ranking(shown: Sequence[str], rows: Sequence[Mapping[str, object]], title: str | None) -> Table:
    return table([RANKING[key] for key in shown], [[row[key] for key in shown] for row in rows], title=title)


def natural_width(made: Table) -> int:
    """Characters a table takes when nothing is folded."""
    return Console(width=10_000).measure(made).maximum


def settled(value: object) -> object:
    """Zero for what is numerical noise around it: no number of the ranking means anything below 0.0001."""
    return 0.0 if isinstance(value, float) and abs(value) < 1e-4 else value


def ranking_cells(row: Mapping[Any, Any], medium: str) -> dict[str, object]:
    """The cells of one line of the ranking, by column."""
    cells: dict[str, object] = {key: settled(row.get(key)) for key in RANKING}
    cells["medium"] = medium if missing(cells["medium"]) else cells["medium"]
    low, high = row.get("absorption_low_nm"), row.get("absorption_high_nm")
    cells["absorption_max_nm"] = interval(row.get("absorption_max_nm"), low, high)
    for key in ("score", "hit_probability"):
        cells[key] = None if missing(cells[key]) else NumberText(f"{cells[key]:.3f}")
    return cells
