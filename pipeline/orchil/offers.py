"""What plugins lend to pages and questions: panels, knowledge of structures, SQL functions, file formats."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any, TypeVar

from orchil_schemas.panel import Panel, SqlFunction, StructureKit, TableFormat

T = TypeVar("T")


@dataclass
class Offers:
    """By name, in the order of plugins; the first plugin that knows structures is asked about them."""

    panels: dict[str, Panel] = field(default_factory=dict)
    structures: StructureKit | None = None
    sql_functions: dict[str, SqlFunction] = field(default_factory=dict)
    formats: dict[str, TableFormat] = field(default_factory=dict)

    def take(self, hook: Any) -> list[str]:
        """Take what one plugin offers through its hooks; returns what did not fit, as sentences."""
        problems: list[str] = []
        _keep(self.panels, _offered(hook.orchil_panels), "panel", problems, _panel_fault)
        _keep(self.sql_functions, _offered(hook.orchil_sql_functions), "SQL function", problems)
        _keep(self.formats, _offered(hook.orchil_formats), "format", problems)
        for kit in _offered(hook.orchil_structures):
            if not isinstance(kit, StructureKit):
                problems.append(f"{type(kit).__name__} lacks drawing or nearest")
            elif self.structures is None:
                self.structures = kit
        return problems

    def ordered_panels(self) -> list[Panel]:
        """The panels in the order of a page."""
        return sorted(self.panels.values(), key=lambda panel: (panel.place, panel.name))


def _offered(caller: Any) -> Iterable[Any]:
    for implementation in caller.get_hookimpls():
        yield from implementation.function()


def _panel_fault(panel: object) -> str | None:
    lacking = [name for name in ("name", "title", "place", "needs", "parts") if not hasattr(panel, name)]
    return f"{type(panel).__name__} is no panel: it lacks {', '.join(lacking)}" if lacking else None


def _keep(
    known: dict[str, T],
    offered: Iterable[T],
    what: str,
    problems: list[str],
    fault_of: Callable[[object], str | None] = lambda _: None,
) -> None:
    for one in offered:
        fault = fault_of(one)
        name = str(getattr(one, "name", ""))
        if fault is None and name in known:
            fault = f'{what} "{name}" is there already: rename one'
        if fault is None:
            known[name] = one
        else:
            problems.append(fault)
