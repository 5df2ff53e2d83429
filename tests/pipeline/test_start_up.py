"""Start-up: help and the list of stages are quick, whatever number of plugins is installed.

Times are ratios to an interpreter that does nothing, taken in turn, the best of several, in seconds of processor
time: the machine may be busy. An interpreter takes 15 to 20 ms, so that 0.3 s are 15 to 20 of them.
"""

from __future__ import annotations

import resource
import subprocess
import sys

import pytest

NOTHING = [sys.executable, "-c", "pass"]
HELP_RATIO, STAGES_RATIO = 15, 75
ROUNDS = 4
PLUGIN = """
import pluggy
from orchil_schemas import Availability, Frozen, LibraryRow, NoSettings, Quantity, QuantityInfo, Record

hookimpl = pluggy.HookimplMarker("orchil")


class Weight{n}(Record):
    kind = "weight{n}"
    value: float = 1.0
    offers = (QuantityInfo(name="weight{n}", unit="g", meaning="a weight"),)


class Weigh:
    name, version, needs, makes, Settings = "weigh{n}", "1", (LibraryRow,), (Weight{n},), NoSettings
    time_limit_seconds = 5.0

    def found(self):
        return Availability(True)

    def run(self, inputs, settings, context):
        return [Weight{n}()]


@hookimpl
def orchil_stages():
    return [Weigh()]
"""


def seconds(command, environment=None):
    """Processor time of one run."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, env=environment)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return after.ru_utime - before.ru_utime + after.ru_stime - before.ru_stime


def orchil(*words):
    return [sys.executable, "-m", "orchil", *words]


@pytest.mark.parametrize(("words", "ratio"), [(("--help",), HELP_RATIO), (("stages",), STAGES_RATIO)])
def test_start_up(words, ratio):
    rounds = [(seconds(NOTHING), seconds(orchil(*words))) for _ in range(ROUNDS)]
    nothing, ours = (min(column) for column in zip(*rounds, strict=True))
    assert ours / nothing < ratio, f"{ours:.2f} s, an interpreter takes {nothing:.3f} s"


@pytest.mark.parametrize(
    ("words", "banned"),
    [
        (("--help",), ("numpy", "pandas", "pydantic", "sqlalchemy", "rdkit", "orchil_schemas", "pluggy")),
        (("stages",), ("pandas", "scipy", "rdkit", "pyscf", "xtb", "sqlalchemy", "alembic", "colour", "matplotlib")),
        (("stages", "--explain"), ("pandas", "rdkit", "pyscf", "xtb", "sqlalchemy")),
    ],
)
def test_what_is_slow_is_not_imported(words, banned):
    code = f"import sys; from orchil.cli import run; run({list(words)!r}); print(*sys.modules, file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True)
    assert sorted(set(done.stderr.split()) & set(banned)) == []


def test_ten_more_plugins_cost_next_to_nothing(tmp_path):
    """Ten more plugins cost less than a tenth of a second, in interpreters."""
    import os

    for n in range(10):
        (tmp_path / f"many{n}_plugin.py").write_text(PLUGIN.replace("{n}", str(n)))
        info = tmp_path / f"many{n}-1.0.dist-info"
        info.mkdir()
        lines = ["Metadata-Version: 2.1", f"Name: many{n}", "Version: 1.0", "Requires-Dist: pydantic>=2", ""]
        (info / "METADATA").write_text("\n".join(lines))
        (info / "entry_points.txt").write_text(f"[orchil.stages]\nmany{n} = many{n}_plugin\n")
    path = os.pathsep.join(filter(None, [str(tmp_path), os.environ.get("PYTHONPATH", "")]))
    many = {**os.environ, "PYTHONPATH": path}
    shown = subprocess.run(orchil("stages"), check=True, capture_output=True, text=True, env=many)
    assert "weigh9" in shown.stdout
    rounds = [(seconds(NOTHING), seconds(orchil("stages")), seconds(orchil("stages"), many)) for _ in range(ROUNDS)]
    nothing, without, with_ten = (min(column) for column in zip(*rounds, strict=True))
    assert (with_ten - without) / nothing < 10, f"{without:.2f} s, with ten more {with_ten:.2f} s"
