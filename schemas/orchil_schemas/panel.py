"""What a plugin shows of a candidate, and what it lends to questions: the contracts of report, page and SQL.

A panel is a titled section of the page of one candidate. Its parts are data, never HTML: the engine escapes every
text, renders charts and drawings, and gives each part its place, its caption and its words for those who cannot see
it. A panel is made from records alone and must not compute anything heavy: it is asked again for every page.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Protocol, TypeVar, runtime_checkable

from pydantic import Field

from .arrays import FloatArray, IntArray, Shape
from .base import Frozen, Record
from .brief import Brief

if TYPE_CHECKING:
    import pandas as pd

R = TypeVar("R", bound=Record)


class Words(Frozen):
    """Paragraphs of plain text."""

    text: tuple[str, ...]


class Fact(Frozen):
    """One line of a table of numbers: a value with its interval, or a text in its place."""

    label: str
    value: float | None = None
    unit: str = ""
    low: float | None = None
    high: float | None = None
    text: str = ""
    meaning: str = ""


class Facts(Frozen):
    """A table of numbers with units; ``caption`` stands above it."""

    facts: tuple[Fact, ...]
    caption: str = ""


class Drawing(Frozen):
    """A picture as SVG text; only shapes, paths, text and groups are kept. ``alt`` says in words what is seen."""

    svg: str
    alt: str
    caption: str = ""


class Chart(Frozen):
    """A chart as a Vega-Lite specification with its data inline; ``alt`` says in words what is seen.

    The engine sets size, fonts and colours; every axis must have a title with its unit.
    """

    spec: dict[str, Any]
    alt: str
    caption: str = ""


class Arrow(Frozen):
    """An arrow in the frame of the atoms, angstrom; ``both_ends`` for what has no sign, as a transition dipole."""

    label: str
    start: Annotated[FloatArray, Shape(3)]
    end: Annotated[FloatArray, Shape(3)]
    both_ends: bool = False


class Scene(Frozen):
    """Atoms, bonds and arrows in space, which the reader can turn.

    ``shade`` (optional, one number per atom, -1 to 1) tints atoms: below zero what ``shade_low`` names, above what
    ``shade_high`` names.
    """

    atomic_numbers: Annotated[IntArray, Shape("atoms", number="int")]
    positions_angstrom: Annotated[FloatArray, Shape("atoms", 3)]
    bonds: Annotated[IntArray, Shape("bonds", 2, number="int")]
    arrows: tuple[Arrow, ...] = ()
    shade: Annotated[FloatArray, Shape("shaded")] | None = None
    shade_low: str = ""
    shade_high: str = ""
    alt: str
    caption: str = ""


Part = Words | Facts | Drawing | Chart | Scene


@dataclass(frozen=True)
class Subject:
    """The candidate a panel is about: its records by type, and the brief of the screen."""

    candidate: str
    smiles: str
    medium: str
    brief: Brief
    records: Mapping[type[Record], Record] = field(default_factory=dict)

    def __getitem__(self, kind: type[R]) -> R:
        record = self.records[kind]
        assert isinstance(record, kind)
        return record

    def get(self, kind: type[R]) -> R | None:
        """The record of this type, None where the candidate has none."""
        return self[kind] if kind in self.records else None


@runtime_checkable
class Panel(Protocol):
    """One section of the page of a candidate.

    ``needs``: record kinds without which the section is left out. ``place`` orders the sections: ours stand at 10,
    20, ... up to 90. A panel that raises is named on the page and stops nothing.
    """

    name: str
    title: str
    place: int
    needs: tuple[type[Record], ...]

    def parts(self, subject: Subject) -> Iterable[Part]:
        """What to show, in order; nothing at all leaves the section out."""
        ...


class Finding(Frozen):
    """How near one structure of a list is to the one asked about: its place in the list, 0 to 1."""

    at: int
    similarity: float = Field(ge=0, le=1)


@runtime_checkable
class StructureKit(Protocol):
    """What pages need to know about structures, and the engine does not.

    Every method takes SMILES and answers None, or leaves out, for what it cannot read.
    """

    def drawing(self, smiles: str) -> Drawing | None:
        """The structure in two dimensions."""
        ...

    def nearest(self, smiles: str, among: Sequence[str], count: int) -> Sequence[Finding]:
        """The ``count`` most alike of a list, most alike first; the structure itself is left out."""
        ...


@dataclass(frozen=True)
class SqlFunction:
    """A function for questions: pure, its arguments and answer numbers, texts or None.

    ``call`` raises ``ValueError`` with a sentence where an argument cannot be used; ``arguments`` -1 is any number.
    """

    name: str
    arguments: int
    call: Callable[..., float | int | str | None]
    meaning: str


@dataclass(frozen=True)
class TableFormat:
    """A file format for the rows of a question: ``write(rows, path)``; raises ``ValueError`` with a sentence.

    ``write`` answers how many rows it had to leave out.
    """

    name: str
    meaning: str
    write: Callable[[pd.DataFrame, Path], int]
