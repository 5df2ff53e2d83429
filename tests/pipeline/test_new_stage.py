"""`orchil new-stage` makes a package that is right as it is, and says why a name cannot be."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import pytest
from orchil import briefs, cli
from orchil.briefs import tomllib
from orchil.chain import resolve
from orchil.contract import Kit
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil_schemas.api import API_VERSION


@pytest.fixture
def orchil(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)

    def run(*words):
        code = cli.run(list(words))
        return code, *capsys.readouterr()

    return run


@pytest.fixture
def package(orchil, tmp_path):
    code, out, _ = orchil("new-stage", "ring-count")
    assert code == cli.DONE
    folder = tmp_path / "orchil-ring-count"
    listed = [Path(line) for line in out.split("\n\n")[0].splitlines()]
    assert sorted(listed) == sorted(p.relative_to(tmp_path) for p in folder.rglob("*") if p.is_file())
    yield folder
    sys.modules.pop("orchil_ring_count", None)


def test_it_is_one_module_one_test_a_readme_and_a_project_with_the_entry_point(package):
    names = {"README.md", "orchil_ring_count.py", "pyproject.toml", "tests"}
    assert {path.name for path in package.iterdir()} == names
    project = tomllib.loads((package / "pyproject.toml").read_text())
    assert project["project"]["name"] == "orchil-ring-count"
    assert project["project"]["entry-points"]["orchil.stages"] == {"ring-count": "orchil_ring_count"}
    for path in package.rglob("*.py"):
        ast.parse(path.read_text())
    assert f'ORCHIL_API = "{API_VERSION}"' in (package / "orchil_ring_count.py").read_text()
    assert not [path for path in package.rglob("*") if path.is_file() and "$" in path.read_text()]


def test_it_keeps_the_contract_and_can_be_wanted(package, monkeypatch, tmp_path):
    monkeypatch.setenv(EXTRA_PLUGINS, str(package / "orchil_ring_count.py"))
    kit = Kit("ring-count", {"scale": 2})
    for check in kit.checks:
        check(kit)
    (record,) = kit.records(kit.runs["hexane, no dye"])
    assert record.value == pytest.approx(2 * 14 / 6)
    readme = (package / "README.md").read_text()
    (tmp_path / "b.toml").write_text('title = "t"\n' + readme.split("```toml\n")[1].split("```")[0])
    steps = resolve(Registry.load(), briefs.load(tmp_path / "b.toml")).steps
    assert [step.essential for step in steps if step.stage.name == "ring-count"] == [True]


@pytest.mark.parametrize(
    ("name", "sentence"),
    [
        ("Ring Count", "use up to 40 lower-case letters and digits"),
        ("ring--count", "with single hyphens"),
        ("3d", "cannot be the name of a stage"),
        ("a" * 41, "cannot be the name of a stage"),
        ("relax", 'there is a stage "relax" already, from core (orchil)'),
        ("heavy-atoms", '"heavy_atoms" is the name of a record or quantity already'),
        ("record", '"record" is the name of a record or quantity already'),
        ("stages", '"orchil_stages" cannot be the name of a new module here'),
        ("ring-count", "is there already: move it away"),
    ],
)
def test_a_name_that_cannot_be_is_refused_before_anything_is_written(package, orchil, tmp_path, name, sentence):
    before = sorted(tmp_path.rglob("*"))
    code, _, err = orchil("new-stage", name)
    assert code == cli.WRONG_REQUEST
    assert sentence in err
    assert sorted(tmp_path.rglob("*")) == before


def test_a_folder_can_be_chosen_and_one_that_cannot_be_written_is_named(orchil, tmp_path):
    assert orchil("new-stage", "one", "--into", "deep/er")[0] == cli.DONE
    assert (tmp_path / "deep/er/orchil-one/orchil_one.py").is_file()
    (tmp_path / "file").write_text("")
    code, _, err = orchil("new-stage", "two", "--into", "file")
    assert (code, "cannot be written" in err) == (cli.WRONG_REQUEST, True)
