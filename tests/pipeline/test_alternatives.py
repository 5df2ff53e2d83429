"""Another maker of a record, chosen in the brief, and a library stage that fails: what a whole screen does then."""

from __future__ import annotations

import io

import pytest
from orchil.errors import RunError
from orchil.progress import PlainProgress
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.screening import plan, screen
from orchil.store import Store
from orchil.supervisor import Supervisor

from .conftest import BRIEF, FAKE_PLUGIN

PLUGIN = """
import pluggy
from fake_plugin import Aside, Base, Brew, Score, Word
from orchil_schemas import LibraryRow, Record

hookimpl = pluggy.HookimplMarker("orchil")


class Other(Base):
    name, needs, makes = "other", (LibraryRow,), (Aside,)

    def run(self, inputs, settings, context):
        return [Aside(original="from other")]


class Verdict(Record):
    kind = "verdict"


class Broken(Base):
    name, makes = "broken", (Verdict,)

    def reads(self, brief, settings):
        return ()

    def run(self, table, brief, settings):
        raise ZeroDivisionError("no candidates")


class BrokenRanking(Broken):
    name, makes = "broken-ranking", (Score,)


@hookimpl
def orchil_stages():
    return [Other(), Broken(), BrokenRanking()]
"""


@pytest.fixture
def night(fakes, tmp_path, monkeypatch):
    (tmp_path / "other_plugin.py").write_text(PLUGIN)
    monkeypatch.setenv(EXTRA_PLUGINS, f"{FAKE_PLUGIN},{tmp_path / 'other_plugin.py'}")
    registry = Registry.load()
    assert not registry.problems
    said = io.StringIO()

    def run(more=""):
        (tmp_path / "words.csv").write_text("smiles\nporter\nale\n")
        (tmp_path / "b.toml").write_text(BRIEF + more)
        made = plan(tmp_path / "words.csv", tmp_path / "b.toml", registry)
        with Store.open(tmp_path / "night.db", create=True) as store, Supervisor(1) as pool:
            outcome = screen(made, store, pool=pool, progress=PlainProgress(said))
            pages = [store.candidate_page(state.name) for state in store.candidates()]
        return outcome, pages, said.getvalue(), made.chain.skipped

    return run


def test_the_chosen_maker_is_the_one_whose_record_counts_and_the_rest_of_the_other_stays(night):
    _, pages, _, skipped = night()
    assert [page.records["aside"]["original"] for page in pages] == ["porter", "ale"]
    assert [text for text in skipped if text.startswith("other (") and " waits: read makes aside" in text]
    outcome, pages, _, _ = night('[use]\nAside = "other"\n')
    assert outcome.done == 2
    assert [page.records["aside"]["original"] for page in pages] == ["from other"] * 2
    assert [page.records["word"]["text"] for page in pages] == ["porter", "ale"]
    _, pages, _, _ = night()
    assert [page.records["aside"]["original"] for page in pages] == ["porter", "ale"]


def test_a_library_stage_that_fails_costs_its_own_record_alone(night):
    outcome, pages, said, _ = night('[use]\nscore = "rank_words"\n')
    assert outcome.done == 2
    assert [page.score["rank"] for page in pages] == [1, 2]
    assert "the library stage broken failed: ZeroDivisionError: no candidates: everything else is there" in said


def test_without_a_ranking_the_run_is_broken(night):
    with pytest.raises(RunError, match="broken-ranking failed"):
        night('[use]\nscore = "broken-ranking"\n')
