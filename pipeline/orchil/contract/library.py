"""Checks of a library stage on made-up columns."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from orchil_schemas import MEASURED, Brief, Column, LibraryTable, Record, Want

from orchil.chain import offered

from .molecules import MOLECULES

if TYPE_CHECKING:
    from .kit import Kit


def reads_what_is_offered(kit: Kit) -> None:
    """Every quantity it reads is one that a stage offers, or the user's measured value of one."""
    unknown = {name.removeprefix(MEASURED) for name in _reads(kit)} - set(offered(kit.registry))
    assert not unknown, f"reads what nobody offers: {', '.join(sorted(unknown))}"


def makes_only_what_it_promised(kit: Kit) -> None:
    """Records of its kinds, for candidates of the table, one of a kind for each."""
    for rows in (len(MOLECULES), 1):
        made = _made(kit, rows)
        seen = [(candidate, type(record)) for candidate, record in made]
        assert len(set(seen)) == len(seen), "two records of one kind for one candidate"
        assert {kind for _, kind in seen} <= set(kit.stage.makes), "a record that is not among its makes"
        assert {candidate for candidate, _ in seen} <= set(_table(kit, rows).candidate), "an unknown candidate"


def takes_an_empty_library(kit: Kit) -> None:
    """No rows, no records, no fault."""
    assert _made(kit, 0) == []


def takes_a_library_without_numbers(kit: Kit) -> None:
    """Candidates that lack every quantity do no harm."""
    _made(kit, len(MOLECULES), known=0.0)


def is_deterministic(kit: Kit) -> None:
    """The same table gives the same records."""
    first, second = _made(kit, len(MOLECULES)), _made(kit, len(MOLECULES))
    assert first == second, "other records at the second time"


def _brief(kit: Kit) -> Brief:
    wants = [Want(quantity=name, at_least=1.0) for name in sorted(offered(kit.registry))[:2]]
    return Brief(title="contract kit", want=tuple(wants))


def _reads(kit: Kit) -> tuple[str, ...]:
    return tuple(kit.stage.reads(_brief(kit), kit.settings))


def _made(kit: Kit, rows: int, *, known: float = 0.8) -> list[tuple[int, Record]]:
    return list(kit.stage.run(_table(kit, rows, known=known), _brief(kit), kit.settings))


def _table(kit: Kit, rows: int, *, known: float = 0.8) -> LibraryTable:
    """Columns with gaps; the share ``known`` of the numbers is there."""
    numbers = np.random.default_rng(1)

    def column() -> Column:
        value = np.where(numbers.random(rows) < known, numbers.uniform(1, 900, rows), np.nan)
        return Column(value, value * 0.9, value * 1.1, np.where(np.isnan(value), np.nan, 0.9))

    smiles = [row.structure for row in MOLECULES.values()][:rows]
    return LibraryTable(list(range(10, 10 + rows)), smiles, {name: column() for name in _reads(kit)})


CHECKS = (
    reads_what_is_offered,
    makes_only_what_it_promised,
    takes_an_empty_library,
    takes_a_library_without_numbers,
    is_deterministic,
)
