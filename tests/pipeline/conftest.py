from __future__ import annotations

import io
from pathlib import Path
from types import SimpleNamespace

import pytest
from orchil import registry as registry_module
from orchil.progress import PlainProgress
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil.screening import plan, screen
from orchil.store import Store
from orchil.supervisor import MEMORY_BYTES, Supervisor

FAKE_PLUGIN = Path(__file__).with_name("fake_plugin.py")
BRIEF = 'title = "Words"\nmedium = "water"\n[[want]]\nquantity = "strength"\nat_least = 5\n'


@pytest.fixture
def fakes(monkeypatch):
    """A registry with the fake stages alone; workers find them through the environment."""
    monkeypatch.setenv(EXTRA_PLUGINS, str(FAKE_PLUGIN))
    monkeypatch.setattr(registry_module, "_installed", lambda: iter(()))
    made = Registry.load()
    assert not made.problems
    return made


@pytest.fixture
def night(fakes, tmp_path, monkeypatch):
    """Runs whole screens of words in a folder of their own; ``runs()`` lists the words that brew has seen."""
    marks = tmp_path / "runs"
    marks.mkdir()
    monkeypatch.setenv("FAKE_RUNS", str(marks))
    store_path = tmp_path / "night.db"

    def run(*words, brief=BRIEF, workers=1, retry_failed=False, header="smiles", memory=MEMORY_BYTES):
        (tmp_path / "words.csv").write_text("\n".join([header, *words]) + "\n")
        (tmp_path / "brief.toml").write_text(brief)
        made = plan(tmp_path / "words.csv", tmp_path / "brief.toml", fakes)
        progress = PlainProgress(io.StringIO())
        with Store.open(store_path, create=True) as store, Supervisor(workers, memory_bytes=memory) as pool:
            return screen(made, store, pool=pool, progress=progress, retry_failed=retry_failed)

    def query(sql: str):
        with Store.open_read_only(store_path) as store:
            rows = store.query(sql).astype(object)
            return rows.where(rows.notna(), None).to_dict("records")

    def runs() -> list[str]:
        return sorted(path.name.rpartition("-")[0] for path in marks.iterdir())

    return SimpleNamespace(run=run, query=query, runs=runs, store=store_path, folder=tmp_path)
