"""The chapters of DEVELOPERS for writers of stages: every block of code in them is run.

What the chapters say to type is typed, in their order, in a fresh virtual environment. The environment sees the
libraries of the one that runs the tests, so that nothing is downloaded; Orchil itself is built and installed in it.
"""

from __future__ import annotations

import os
import re
import shutil
import site
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from dataclasses import dataclass
from pathlib import Path

import pytest
from orchil import briefs
from orchil.chain import resolve
from orchil.contract import Kit
from orchil.registry import EXTRA_PLUGINS, Registry

ROOT = Path(__file__).parents[1]
OUT_OF_TREE = Path(__file__).with_name("plugins_out_of_tree")
CHAPTERS = ("Your first stage", "How the chain is resolved", "Records and units", "Publishing a stage")


@dataclass(frozen=True)
class Block:
    chapter: str
    language: str
    text: str


def blocks():
    manual = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    for chapter in CHAPTERS:
        text = manual.partition(f"\n## {chapter}\n")[2].partition("\n## ")[0]
        assert text, chapter
        for indent, language, code in re.findall(r"^( *)```(\w+)\n(.*?)^\1```$", text, flags=re.MULTILINE | re.DOTALL):
            yield Block(chapter, language, re.sub(rf"^{indent}", "", code, flags=re.MULTILINE))


BLOCKS = list(blocks())


def only(language, part):
    (found,) = [block.text for block in BLOCKS if block.language == language and part in block.text]
    return found


def test_every_block_is_run_by_one_of_these_tests():
    python = [only("python", word) for word in ("BestPartner", "ToolEnergy", "Vibrations", "KIT")]
    toml = [only("toml", word) for word in ("[[want]]", "[use]", "entry-points")]
    run = {*python, *toml, *(block.text for block in BLOCKS if block.language in ("sh", "diff"))}
    assert [block.text for block in BLOCKS if block.text not in run] == []
    assert {block.language for block in BLOCKS} == {"sh", "diff", "python", "toml"}


class Desk:
    """A folder with the demo library, and a shell in which the fresh environment is active."""

    def __init__(self, folder):
        self.folder = folder
        environment = folder / "venv"
        subprocess.run([sys.executable, "-m", "venv", "--without-pip", str(environment)], check=True)
        (place,) = environment.glob("lib/python*/site-packages")
        lines = [f"import site; site.addsitedir({path!r})" for path in site.getsitepackages()]
        (place / "libraries.pth").write_text("\n".join(lines) + "\n")
        shutil.copytree(ROOT / "demo_library", folder / "demo_library")
        scripts = environment / "bin"
        (scripts / "pip").write_text(f'#!/bin/sh\nexec {scripts}/python -m pip "$@"\n')
        (scripts / "pip").chmod(0o755)
        self._environment = {
            **{name: text for name, text in os.environ.items() if name != EXTRA_PLUGINS},
            "PATH": f"{scripts}:{os.environ['PATH']}",
            "PIP_NO_INDEX": "1",
            "PIP_NO_DEPS": "1",
            "PIP_NO_BUILD_ISOLATION": "0",
            "PIP_DISABLE_PIP_VERSION_CHECK": "1",
            "PIP_ROOT_USER_ACTION": "ignore",
            "HOME": str(folder),
        }

    def type(self, lines):
        done = subprocess.run(
            ["bash", "-euo", "pipefail", "-c", lines],
            cwd=self.folder,
            env=self._environment,
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 0, f"{lines}\n{done.stdout}\n{done.stderr}"
        return done.stdout


def edited(text, diff):
    """``text`` with each block of minus lines replaced by the plus lines after it."""
    for old, new in re.findall(r"((?:^-.*\n)+)((?:^\+.*\n)+)", diff, flags=re.MULTILINE):
        before, after = (re.sub(r"^[-+]", "", part, flags=re.MULTILINE) for part in (old, new))
        assert text.count(before) == 1, before
        text = text.replace(before, after)
    return text


def order(desk, store):
    rows = desk.type(f'orchil query {store} --format csv "SELECT candidate FROM ranking ORDER BY rank"')
    return rows.split()[1:]


@pytest.mark.slow
def test_what_the_manual_says_to_type(tmp_path):
    """From the scaffold to a ranking, as written; then a plugin that the manual has never heard of."""
    desk = Desk(tmp_path)
    shutil.copytree(ROOT, tmp_path / "source", ignore=_sources_only)
    desk.type("pip install --quiet ./source")
    make, install, ask, explain, publish = [block.text for block in BLOCKS if block.language == "sh"]
    edit_module, edit_test = [block.text for block in BLOCKS if block.language == "diff"]

    desk.type(make)
    package = tmp_path / "orchil-stiffness"
    for path, diff in (
        (package / "orchil_stiffness.py", edit_module),
        (package / "tests" / "test_orchil_stiffness.py", edit_test),
    ):
        path.write_text(edited(path.read_text(), diff))
    assert sum(len(re.findall(r"^\+.+", diff, flags=re.MULTILINE)) for diff in (edit_module, edit_test)) <= 12
    shown = desk.type(install)
    assert re.search(r"\bstiffness\b.*\borchil-stiffness\b", shown)
    assert "passed" in shown
    (tmp_path / "stiff.toml").write_text(only("toml", "[[want]]"))
    ranked = desk.type(ask)
    assert "rotatable_bonds" in ranked.rpartition("rank")[2]
    assert "stiffness 1 (orchil-stiffness)" in desk.type(explain)
    assert ElementTree.parse(tmp_path / "chain.svg").getroot().tag.endswith("svg")
    desk.type(publish)
    assert list((tmp_path / "dist").glob("orchil_stiffness-0.1.0-*.whl"))
    assert only("toml", "entry-points").splitlines()[1] in (package / "pyproject.toml").read_text()

    first = order(desk, "stiff.db")
    shutil.copytree(OUT_OF_TREE / "orchil-lightness", tmp_path / "elsewhere")
    desk.type("pip install --quiet ./elsewhere")
    (tmp_path / "light.toml").write_text(
        'title = "light"\nmedium = "polyethylene"\n[[want]]\nquantity = "mass_per_heavy_atom"\nat_most = 13.5\n'
    )
    desk.type("orchil screen demo_library/candidates.csv --brief light.toml --store stiff.db --limit 3")
    second = order(desk, "stiff.db")
    assert sorted(second) == sorted(first)
    assert second != first


def _sources_only(folder, names):
    kept = {"pipeline", "plugins", "schemas", "pyproject.toml", "README.md", "LICENSE"}
    return [name for name in names if (Path(folder) == ROOT and name not in kept) or name == "__pycache__"]


@pytest.fixture
def plugin(tmp_path, monkeypatch):
    """Saves a block as the manual says and lets Orchil find it."""

    def save(name, text):
        (tmp_path / name).write_text(text)
        monkeypatch.setenv(EXTRA_PLUGINS, str(tmp_path / name))

    return save


def test_the_library_stage_keeps_the_contract(plugin):
    plugin("best_partner.py", only("python", "BestPartner"))
    kit = Kit("best-partner")
    for check in kit.checks:
        check(kit)


def test_the_library_stage_finds_the_nearest_absorption(plugin):
    import numpy as np
    from orchil_schemas import Column, LibraryTable

    plugin("best_partner.py", only("python", "BestPartner"))
    stage = Kit("best-partner").stage

    def column(*values):
        array = np.array(values)
        return Column(array, array, array, array)

    columns = {"absorption_max_nm": column(400, 500, 610), "emission_max_nm": column(480, np.nan, 700)}
    made = stage.run(LibraryTable((7, 8, 9), ("", "", ""), columns), None, None)
    assert [(at, one.partner, one.gap_nm) for at, one in made] == [(7, 8, 20.0), (9, 8, 200.0)]


MYTOOL = """#!/bin/sh
if [ "$1" = --version ]; then echo mytool 1.2.3; exit; fi
if [ $(wc -l < "$1") -lt 15 ]; then echo too few atoms >&2; exit 1; fi
echo energy -$(wc -l < "$1").5
"""


def test_the_stage_with_a_program_keeps_the_contract_and_says_what_the_program_said(plugin, tmp_path, monkeypatch):
    tool = tmp_path / "mytool"
    tool.write_text(MYTOOL)
    tool.chmod(0o755)
    monkeypatch.setenv("PATH", str(tmp_path), prepend=":")
    plugin("external.py", only("python", "ToolEnergy"))
    kit = Kit("mytool")
    assert kit.stage.found().versions == {"mytool": "1.2.3"}
    for check in kit.checks:
        check(kit)
    (record,) = kit.records(kit.runs["azobenzene"])
    assert record.energy_hartree == -24.5
    assert "too few atoms" in kit.runs["5-bromo-2,2'-bithiophene"].reply.message or kit.odd_runs["water"].reply.message


def test_records_and_units():
    exec(compile(only("python", "Vibrations"), "manual", "exec"), {"__name__": "manual"})


def test_the_contract_test_of_the_manual_is_that_of_the_scaffold():
    """It is run in the fresh environment, as part of the package."""
    template = (ROOT / "pipeline/orchil/scaffold/files/test.py.tmpl").read_text()
    block = only("python", "KIT").replace('Kit("stiffness", {"scale": 1.0})', 'Kit("$name")')
    assert block.strip() in template


def test_the_choice_of_a_maker_is_understood(monkeypatch, tmp_path):
    monkeypatch.syspath_prepend(str(ROOT / "plugins" / "worked" / "ppp"))
    monkeypatch.setenv(EXTRA_PLUGINS, "orchil_ppp")
    want = 'title = "t"\n[[want]]\nquantity = "absorption_max_nm"\nat_least = 400\n'
    (tmp_path / "b.toml").write_text(want + only("toml", "[use]"))
    steps = resolve(Registry.load(), briefs.load(tmp_path / "b.toml")).steps
    assert [step for step in steps if step.stage.name == "ppp" and step.essential]
