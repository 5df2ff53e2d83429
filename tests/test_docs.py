"""README and DEVELOPERS against the code: what can be used is documented, and every example works."""

from __future__ import annotations

import inspect
import re
from pathlib import Path

import orchil_schemas
import orchil_schemas.errors
import pytest
import typer
from orchil import briefs, cli, hookspecs
from orchil.chain import resolve
from orchil.registry import Registry
from orchil.store import Store
from orchil_schemas import StageError, all_records
from orchil_stages.medium import known_media

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
ROOMS = ("pipeline/orchil", "plugins/orchil_stages", "schemas/orchil_schemas")


def fences(text: str, language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", text, flags=re.MULTILINE | re.DOTALL)


def in_cells(*cells: str) -> str:
    """The beginning of a row of a table in README."""
    return "\n| " + " | ".join(cells) + " |"


REGISTRY = Registry.load()
STAGES = [*REGISTRY.stages.values(), *REGISTRY.library_stages.values()]
QUANTITIES = [info for record in all_records() for info in record.offers]
COMMANDS = typer.main.get_command(cli.app).commands
SQL = fences(README, "sql")
BRIEFS = fences(README, "toml")


def test_the_plugins_are_whole():
    assert REGISTRY.problems == []
    assert QUANTITIES
    assert STAGES


# README


def test_the_job_comes_first():
    title, job, *_ = README.split("\n\n")
    assert title == "# Orchil"
    assert not job.startswith(("#", "`", "|", "!", "<"))


def test_the_first_two_blocks_are_one_line_each_and_name_what_exists():
    setup, tests = fences(README, "sh")[:2]
    for block in (setup, tests):
        assert block.count("\n") == 1
        assert block.startswith("python3.11 -m venv .venv && .venv/bin/pip install ")
    for name in re.findall(r"demo_library/\S+", setup):
        assert (ROOT / name).is_file()
    assert ".venv/bin/python -m pytest" in tests


@pytest.mark.parametrize("info", QUANTITIES, ids=lambda info: info.name)
def test_every_quantity_is_explained_with_its_unit(info):
    _, _, section = README.partition("\n## Writing a brief\n")
    assert in_cells(f"`{info.name}`", info.unit) in section.partition("\n## ")[0]


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_and_option_is_documented(name):
    assert f"orchil {name}" in README
    for parameter in COMMANDS[name].params:
        for option in parameter.opts:
            if option.startswith("-"):
                assert f"`{option}`" in README or f"`{option} " in README, option


@pytest.mark.parametrize("stage", STAGES, ids=lambda stage: stage.name)
def test_every_stage_is_explained_with_its_settings_and_limit(stage):
    assert f"\n**{stage.name}** " in README
    for name in stage.Settings.model_fields:
        assert in_cells(f"`{stage.name}`", f"`{name}`") in README
    limit = getattr(stage, "time_limit_seconds", None)
    assert limit is None or f"{stage.name} {limit:g} s" in README


def test_defaults_of_settings_are_those_of_the_code():
    rows = re.findall(r"^\| `(\w+)` \| `(\w+)` \| `?([^|`]+?)`? \| ", README, flags=re.MULTILINE)
    fields = {(s.name, name): f.default for s in STAGES for name, f in s.Settings.model_fields.items()}
    assert {(stage, name) for stage, name, _ in rows} == fields.keys()
    for stage, name, default in rows:
        found = fields[stage, name]
        written = {"none": None}.get(default, default)
        assert written == found if isinstance(found, str | None) else float(written) == found, (stage, name)


def test_every_reason_code_is_explained():
    errors = [
        found
        for _, found in inspect.getmembers(orchil_schemas.errors, inspect.isclass)
        if issubclass(found, StageError) and found is not StageError
    ]
    engine = ("timeout", "crashed", "out_of_memory", "bad_output", "unexpected")
    for code in (*(error.code for error in errors), *engine):
        assert in_cells(f"`{code}`") in README


def test_every_exit_code_is_explained():
    (paragraph,) = re.findall(r"^\*\*Exit codes\.\*\* (.*?)\n\n", README, flags=re.MULTILINE | re.DOTALL)
    codes = [int(code) for code in re.findall(r"\b(\d): ", paragraph)]
    assert codes == [cli.DONE, cli.SOME_FAILED, cli.WRONG_REQUEST, cli.BROKE]


def test_every_medium_is_named():
    text = " ".join(README.replace("\n> ", " ").split())
    assert [medium.name for medium in known_media() if medium.name not in text] == []


@pytest.fixture(scope="module")
def store(tmp_path_factory):
    with Store.open(tmp_path_factory.mktemp("docs") / "empty.db", create=True) as made:
        yield made


def test_there_are_enough_questions():
    assert len(SQL) >= 10
    for view in ("ranking", "states", "quantities", "failures", "timing"):
        assert any(re.search(rf"\b(FROM|JOIN) {view}\b", sql) for sql in SQL), view


@pytest.mark.parametrize("sql", [*SQL, *re.findall(r'orchil query \S+ "([^"]+)"', README)])
def test_every_question_runs(store, sql):
    assert len(store.query(sql, (), REGISTRY.offers.sql_functions.values()).columns)


def test_every_column_of_the_ranking_is_explained(store):
    for name in store.query("SELECT * FROM ranking").columns:
        assert in_cells(f"`{name}`") in README, name


@pytest.mark.parametrize("text", BRIEFS)
def test_every_brief_is_right(text, tmp_path):
    path = tmp_path / "brief.toml"
    path.write_text(whole(text), encoding="utf-8")
    assert resolve(REGISTRY, briefs.load(path)).steps


def whole(text: str) -> str:
    """An example made a whole brief."""
    title = "" if "title =" in text else 'title = "example"\n'
    want = "" if "[[want]]" in text else '\n[[want]]\nquantity = "heavy_atoms"\nat_most = 40\n'
    return title + text + want


# DEVELOPERS


def test_every_hook_is_named():
    hooks = [
        name
        for name, found in vars(hookspecs).items()
        if inspect.isfunction(found) and hasattr(found, f"{hookspecs.PROJECT}_spec")
    ]
    assert hooks
    for name in hooks:
        assert f"`{name}`" in DEVELOPERS


def test_every_package_and_every_module_of_the_engine_has_a_line():
    for room in ROOMS:
        base = ROOT / room
        for init in base.rglob("*/__init__.py"):
            name = ".".join(init.parent.relative_to(base.parent).parts)
            assert f"| `{name}`" in DEVELOPERS, name
    for module in (*(ROOT / ROOMS[0]).glob("*.py"), *(ROOT / ROOMS[2]).glob("*.py")):
        assert module.stem == "__init__" or f"`{module.name}`" in DEVELOPERS, module.name
