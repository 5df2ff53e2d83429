"""`orchil query`: the rows of one SELECT, or of a ready-made question."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from orchil.errors import RequestError
from orchil.questions import Question, find, questions
from orchil.store import Store

from . import formats
from .common import loaded_registry
from .tables import console, table


@dataclass(frozen=True)
class Asked:
    """SQL, or the name of a question with its parameters as NAME=VALUE; neither: list the questions."""

    sql: str | None
    ask: str | None
    settings: tuple[str, ...]


def run_query(target: str, asked: Asked, form: str, output: Path | None) -> None:
    """Run the query and write its rows."""
    if asked.sql is None and asked.ask is None:
        _list(questions().values())
        return
    sql, parameters = _statement(asked)
    offers = loaded_registry().offers
    formats.check(form, output, offers.formats)
    with Store.open_read_only(target) as store:
        rows = store.query(sql, parameters, offers.sql_functions.values())
    formats.write(rows, form, output, offers.formats)


def _statement(asked: Asked) -> tuple[str, dict[str, str | int | float]]:
    if asked.sql is not None and asked.ask is not None:
        raise RequestError("give SQL or --ask, not both")
    given = dict(map(_setting, asked.settings))
    if asked.ask is not None:
        question = find(asked.ask)
        return question.sql, question.values(given)
    if given:
        raise RequestError("--set goes with --ask: in SQL write the value itself")
    return asked.sql or "", {}


def _setting(text: str) -> tuple[str, str]:
    name, equals, value = text.partition("=")
    if not equals or not name.strip():
        raise RequestError(f'--set "{text}" is not NAME=VALUE, for example --set best=20')
    return name.strip(), value.strip()


def _list(found: Iterable[Question]) -> None:
    rows = [
        (one.name, one.asks, "; ".join(f"{each.name} = {each.default}" for each in one.parameters)) for one in found
    ]
    console().print(table(["--ask", "question", "--set"], rows))
