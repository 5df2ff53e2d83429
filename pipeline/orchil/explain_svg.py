"""The resolved chain as a picture: a row for each stage, a lane for each record kind.

A filled dot is where a record is made, an open one where it is used. No two lines can be taken for each other,
however many stages there are.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from html import escape

from orchil_schemas import LibraryRow

from .chain import Chain, Kind
from .explain import LIBRARY
from .registry import Registry

ROW, LANE, CHARACTER, MARGIN = 40, 30, 7.5, 16
LEGEND = "filled dot: made here; open dot: used here; heavy frame: leads to what is wanted"
STYLE = (
    "text{font:13px sans-serif;fill:#222}.box{fill:#fff;stroke:#888}.wanted{stroke:#222;stroke-width:2.5}"
    ".lane{stroke:#555;stroke-width:1.5}.rule{stroke:#ddd}.made{fill:#222}.used{fill:#fff;stroke:#222;stroke-width:1.5}"
)


@dataclass(frozen=True)
class Row:
    """A line of the picture: its label, whether it leads to what is wanted, what it makes and what it uses."""

    label: str
    wanted: bool
    makes: tuple[Kind, ...]
    uses: tuple[Kind, ...]


def as_svg(chain: Chain, registry: Registry) -> str:
    """An SVG document that stands by itself; every text in it is escaped."""
    rows = list(_rows(chain, registry))
    kinds = list(dict.fromkeys(kind for row in rows for kind in row.makes))
    left = MARGIN + CHARACTER * max(len(row.label) for row in rows) + 24
    top = MARGIN + 0.8 * CHARACTER * max((len(kind.kind) for kind in kinds), default=0) + 20
    left_out = [*chain.skipped, *map(str, registry.problems)]
    notes = [LEGEND, *(f"left out: {sentence}" for sentence in left_out)]
    bottom = top + ROW * len(rows)
    width = max(left + LANE * (len(kinds) + 3), *(MARGIN * 2 + CHARACTER * len(note) for note in notes))
    body = [
        *(part for at, row in enumerate(rows) for part in _row(row, top + ROW * at, left, kinds)),
        *(part for at, kind in enumerate(kinds) for part in _lane(kind, left + LANE * (at + 1), top, rows)),
        *(_text(MARGIN, bottom + 20 * (at + 1), note) for at, note in enumerate(notes)),
    ]
    height = bottom + 20 * len(notes) + MARGIN
    words = "; ".join(f"{row.label}: makes {_names(row.makes)}, uses {_names(row.uses)}" for row in rows)
    head = f'<svg xmlns="http://www.w3.org/2000/svg" role="img" viewBox="0 0 {width:.0f} {height:.0f}">'
    title = f"<title>The chain of stages</title><desc>{escape(words)}</desc><style>{STYLE}</style>"
    return "\n".join([head, title, '<rect width="100%" height="100%" fill="#fff"/>', *body, "</svg>\n"])


def _rows(chain: Chain, registry: Registry) -> Iterator[Row]:
    yield Row(LIBRARY, True, (LibraryRow,), ())
    for step in chain.steps:
        label = f"{step.stage.name} {step.stage.version} ({registry.distribution(step.stage.name)})"
        yield Row(label, step.essential, step.gives, step.stage.needs)
    for one in chain.library_steps:
        label = f"{one.stage.name} {one.stage.version} ({registry.distribution(one.stage.name)}), over the library"
        read = {
            kind for step in chain.steps for kind in step.gives if {info.name for info in kind.offers} & {*one.reads}
        }
        yield Row(label, False, one.stage.makes, tuple(sorted(read, key=lambda kind: kind.kind)))


def _row(row: Row, y: float, left: float, kinds: Sequence[Kind]) -> Iterator[str]:
    touched = [kinds.index(kind) for kind in (*row.makes, *row.uses) if kind in kinds]
    middle = y + ROW / 2
    if touched:
        yield _line("rule", left, middle, left + LANE * (max(touched) + 1), middle)
    width = left - MARGIN
    name = "box wanted" if row.wanted else "box"
    yield f'<rect class="{name}" x="{MARGIN}" y="{y + 5:.1f}" width="{width:.1f}" height="{ROW - 10}" rx="4"/>'
    yield _text(MARGIN + 10, middle + 4.5, row.label)


def _lane(kind: Kind, x: float, top: float, rows: Sequence[Row]) -> Iterator[str]:
    made = next(at for at, row in enumerate(rows) if kind in row.makes)
    used = [at for at, row in enumerate(rows) if kind in row.uses]
    heights = [top + ROW * (at + 0.5) for at in (made, *used)]
    yield _line("lane", x, heights[0], x, heights[-1])
    yield f'<circle class="made" cx="{x:.1f}" cy="{heights[0]:.1f}" r="5"/>'
    yield from (f'<circle class="used" cx="{x:.1f}" cy="{height:.1f}" r="5"/>' for height in heights[1:])
    yield f'<text transform="translate({x + 4:.1f} {top - 6:.1f}) rotate(-50)">{escape(kind.kind)}</text>'


def _line(name: str, x: float, y: float, to_x: float, to_y: float) -> str:
    return f'<line class="{name}" x1="{x:.1f}" y1="{y:.1f}" x2="{to_x:.1f}" y2="{to_y:.1f}"/>'


def _text(x: float, y: float, text: str) -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}">{escape(text)}</text>'


def _names(kinds: Sequence[Kind]) -> str:
    return ", ".join(kind.kind for kind in kinds) or "nothing"
