"""Stages on request: left out unless a brief asks, and run afterwards for the best of a screen."""

from __future__ import annotations

import io
import sys
from pathlib import Path

import pytest
from orchil import registry as registry_module
from orchil.asked import asked_for, with_stage
from orchil.briefs import load
from orchil.chain import resolve
from orchil.errors import RequestError
from orchil.progress import PlainProgress
from orchil.recompute import recompute
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.screening import plan, screen
from orchil.store import Store
from orchil.supervisor import Supervisor

HERE = Path(__file__).parent
BRIEF = 'title = "Words"\nmedium = "water"\n[[want]]\nquantity = "strength"\nat_least = 5\n'
WORDS = ("a", "bb", "ccc", "dddd", "qqqqq", "eeeeee")


@pytest.fixture
def registry(monkeypatch: pytest.MonkeyPatch) -> Registry:
    plugins = [str(HERE / "fake_plugin.py"), str(HERE / "on_request_plugin.py")]
    monkeypatch.setenv(EXTRA_PLUGINS, ",".join(plugins))
    monkeypatch.setattr(registry_module, "_installed", lambda: iter(()))
    made = Registry.load()
    assert not made.problems
    yield made
    for name in ("fake_plugin", "on_request_plugin"):
        sys.modules.pop(name, None)


def brief_of(folder: Path, text: str) -> Path:
    path = folder / "brief.toml"
    path.write_text(text, encoding="utf-8")
    return path


def names(registry: Registry, folder: Path, text: str) -> list[str]:
    return [step.stage.name for step in resolve(registry, load(brief_of(folder, text))).steps]


@pytest.mark.parametrize(
    ("more", "asked"),
    [
        ("", False),
        ("[stage.prove]\n", True),
        ('[use]\nproof = "prove"\n', True),
        ('[[want]]\nquantity = "letters"\nat_least = 2\n', True),
    ],
    ids=["silent", "stage", "use", "want"],
)
def test_a_stage_on_request_runs_where_the_brief_asks(registry, tmp_path, more, asked):
    assert ("prove" in names(registry, tmp_path, BRIEF + more)) == asked


def test_others_are_never_left_out(registry, tmp_path):
    brief = load(brief_of(tmp_path, BRIEF))
    kept = {stage.name for stage in asked_for(registry.stages.values(), brief)}
    assert set(registry.stages) - kept == {"prove"}
    assert "prove" in with_stage(brief, "prove").stage


@pytest.fixture
def finished(registry, tmp_path) -> Path:
    words = tmp_path / "words.csv"
    words.write_text("\n".join(["smiles", *WORDS]) + "\n", encoding="utf-8")
    made = plan(words, brief_of(tmp_path, BRIEF), registry)
    path = tmp_path / "night.db"
    with Store.open(path, create=True) as store, Supervisor(1) as pool:
        screen(made, store, pool=pool, progress=PlainProgress(io.StringIO()))
    return path


def again(path: Path, registry: Registry, top: int, stage: str = "prove"):
    with Store.open(path, create=False) as store, Supervisor(1) as pool:
        return recompute(store, registry, stage, top, pool=pool, progress=PlainProgress(io.StringIO()))


def test_the_best_are_recomputed_and_the_ranking_stays(registry, finished):
    with Store.open_read_only(finished) as store:
        before = store.query("SELECT row_number, rank, score FROM ranking").to_dict("records")
    outcome = again(finished, registry, 3)
    assert (outcome.done, outcome.left) == (3, 0)
    with Store.open_read_only(finished) as store:
        assert store.query("SELECT row_number, rank, score FROM ranking").to_dict("records") == before
        proved = store.query("SELECT candidate, value FROM quantities WHERE quantity = 'letters'")
        failed = store.query("SELECT structure, reason_code, status FROM candidate WHERE failed_stage = 'prove'")
        runs = store.query("SELECT count(*) AS n FROM attempt WHERE stage = 'brew'")
    best = {row["row_number"] for row in before if row["rank"] <= 3}
    assert len(best) == 3
    assert len(proved) + len(failed) == 3
    assert failed.to_dict("records") == [{"structure": "qqqqq", "reason_code": "not_converged", "status": "done"}]
    assert runs["n"][0] == len(WORDS)  # what was known came from the store


def test_recomputing_twice_does_nothing_twice(registry, finished):
    again(finished, registry, 2)
    again(finished, registry, 2)
    with Store.open_read_only(finished) as store:
        runs = store.query("SELECT ok, count(*) AS n FROM attempt WHERE stage = 'prove' GROUP BY ok")
    assert runs[runs["ok"] == 1]["n"].sum() == 1


def test_wrong_requests_are_refused(registry, finished, tmp_path):
    with pytest.raises(RequestError, match='"brew" is no stage on request; there is prove'):
        again(finished, registry, 1, stage="brew")
    Store.open(tmp_path / "new.db", create=True).close()
    with pytest.raises(RequestError, match="no screen yet"):
        again(tmp_path / "new.db", registry, 1)
    registry.stages["brew"].version = "other"
    try:
        with pytest.raises(RequestError, match="have changed since the screen"):
            again(finished, registry, 1)
    finally:
        del registry.stages["brew"].version
