"""What plugins may use is kept as text for every version; a change without a new version fails here.

After a change: raise ``API_VERSION`` in ``schemas/orchil_schemas/api.py`` (the second number for something new, the
first for something changed or gone), then ``python -m orchil.plugin_api > tests/pipeline/plugin_api/VERSION.txt``. The
file of a version that was released is never written again.
"""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import orchil_schemas
import pytest
from orchil import plugin_api
from orchil_schemas.api import API_VERSION

FOLDER = Path(__file__).with_name("plugin_api")
VERSIONS = sorted(tuple(map(int, path.stem.split("."))) for path in FOLDER.glob("*.txt"))


def lines(version):
    return (FOLDER / f"{'.'.join(map(str, version))}.txt").read_text(encoding="utf-8").splitlines()


def test_nothing_has_changed_without_a_new_version():
    assert VERSIONS[-1] == tuple(map(int, API_VERSION.split("."))), "keep the text of this version, see above"
    kept, now = lines(VERSIONS[-1]), plugin_api.described().splitlines()
    assert sorted(set(kept) - set(now)) == [], "gone or changed: raise API_VERSION, see the top of this file"
    assert sorted(set(now) - set(kept)) == [], "new: raise API_VERSION, see the top of this file"


def test_within_a_first_number_nothing_is_lost():
    for older, newer in pairwise(VERSIONS):
        assert older[0] != newer[0] or set(lines(older)[1:]) <= set(lines(newer)[1:]), newer


@pytest.mark.parametrize(
    "line",
    [
        "hook orchil_stages() -> list[Stage | LibraryStage]",
        "orchil_schemas.Stage.run(self, inputs: Inputs, settings: Any, context: Context) -> Iterable[Record]",
        "orchil_schemas.Context.seed: int",
        "orchil_schemas.Transitions.energy_ev: array of float64 (required)",
        "orchil_schemas.Identity.quantity heavy_atoms [1]",
        "orchil_schemas.OutOfScope(StageError)",
        "orchil_schemas.files.InputFile.read_text(self) -> str",
        "orchil.contract.Kit.records(self, run: Run) -> list[Record]",
    ],
)
def test_the_text_says_what_a_plugin_stands_on(line):
    assert line in plugin_api.described().splitlines()


def test_a_changed_signature_changes_the_text(monkeypatch):
    before = plugin_api.described()

    def run(self, inputs, settings): ...

    monkeypatch.setattr(orchil_schemas.Stage, "run", run)
    assert plugin_api.described() != before


def test_a_new_field_changes_the_text(monkeypatch):
    class Identity(orchil_schemas.Record):
        another: int

    before = plugin_api.described()
    monkeypatch.setattr(orchil_schemas, "Identity", Identity)
    assert "orchil_schemas.Identity.another: int (required)" in plugin_api.described()
    assert "orchil_schemas.Identity.another" not in before
