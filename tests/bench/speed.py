"""How long the chain takes and where the time goes: ``python tests/bench/speed.py [--dyes 40]``.

Screens dyes of the published absorption maxima (mean of 54 atoms with hydrogens) with one worker, then with two, and
prints CPU-seconds by stage, the share that is not chemistry, and the gain of the second worker. Start-up (imports of
coordinator and workers) is measured by a screen of one small row and shown apart.
"""

from __future__ import annotations

import argparse
import csv
import os
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

from orchil.blas import kernel_choice
from orchil.store import Store
from orchil.supervisor import ONE_THREAD
from rdkit import Chem

FACTS = Path(__file__).parents[1] / "published" / "facts" / "absorption_maxima.csv"
MEAN_ATOMS = 54.0
YARDSTICK = "CCCCN(CCCC)c1ccc(/N=N/c2ccc(/N=N/c3ccc([N+](=O)[O-])cc3)cc2)cc1"
BRIEF = """title = "timing"
[[want]]
quantity = "absorption_max_nm"
between = [400, 700]
"""


@dataclass(frozen=True)
class Run:
    """One screen: wall seconds, CPU seconds of all its processes, CPU seconds by stage, candidates done."""

    wall: float
    cpu: float
    stages: dict[str, float]
    done: int

    @property
    def chemistry(self) -> float:
        """CPU seconds inside stages."""
        return sum(self.stages.values())


def main() -> None:
    """Run the screens and print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--dyes", type=int, default=40)
    dyes = sample(parser.parse_args().dyes)
    atoms = sum(size for _, _, size in dyes) / len(dyes)
    with tempfile.TemporaryDirectory() as folder:
        start_up = [screen(Path(folder), [("C=O", "gas phase", 4)], workers) for workers in (1, 2)]
        one, two = (screen(Path(folder), dyes, workers) for workers in (1, 2))
    print(f"{len(dyes)} dyes, {one.done} done, mean of {atoms:.1f} atoms with hydrogens; start-up apart:")
    spent = {stage: seconds - start_up[0].stages[stage] for stage, seconds in one.stages.items()}
    chain = sum(spent.values())
    for stage, seconds in spent.items():
        print(f"  {stage:<10}{seconds / len(dyes):8.3f} CPU-s per dye{seconds / chain:8.1%}")
    print(f"  {'chain':<10}{chain / len(dyes):8.3f} CPU-s per dye")
    gradient = gradient_seconds()
    print(f"  one GFN2 gradient of a 64-atom dye takes {1000 * gradient:.0f} ms here and now; the chain is", end=" ")
    print(f"{chain / len(dyes) / gradient:.1f} of them")
    overhead = one.cpu - start_up[0].cpu - chain
    print(f"not chemistry: {overhead / chain:.1%} of it; start-up {start_up[0].cpu:.1f} CPU-s")
    gain = (one.wall - start_up[0].wall) / (two.wall - start_up[1].wall)
    print(f"two workers are {gain:.2f} times as fast as one (start-up apart)")


def gradient_seconds() -> float:
    """CPU seconds of one GFN2 gradient of a 64-atom dye, density reused: the yardstick of the machine."""
    code = "from speed import time_gradient; print(time_gradient())"
    environment = {**os.environ, **ONE_THREAD, **kernel_choice(), "PYTHONPATH": str(Path(__file__).parent)}
    done = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True)
    return float(done.stdout)


def time_gradient() -> float:
    """Time ten gradients of an azo dye of 64 atoms along small random steps."""
    import numpy as np
    from orchil_schemas import Conformers, LibraryRow
    from orchil_stages.by_hand import run_stages
    from orchil_stages.embed import Embed
    from orchil_stages.ground_state import BOHR_ANGSTROM, open_ground_state
    from orchil_stages.intake import Intake

    structure = run_stages(LibraryRow(structure=YARDSTICK), (Intake(), Embed()))[Conformers]
    positions = structure.positions_angstrom[0] / BOHR_ANGSTROM
    ground = open_ground_state(structure.atomic_numbers, 0, None)
    ground.evaluate(positions)
    generator = np.random.default_rng(1)
    start = time.process_time()
    for _ in range(10):
        ground.evaluate(positions + 0.01 * generator.normal(size=positions.shape))
    return (time.process_time() - start) / 10


def sample(count: int) -> list[tuple[str, str, int]]:
    """(smiles, medium, atoms) of dyes of a given mean size: each next one keeps the mean nearest to it."""
    with FACTS.open(encoding="utf-8", newline="") as lines:
        rows = [(row["smiles"], row["medium"]) for row in csv.DictReader(lines)]
    sizes = {smiles: Chem.AddHs(Chem.MolFromSmiles(smiles)).GetNumAtoms() for smiles, _ in rows}
    left = sorted({(smiles, medium, sizes[smiles]) for smiles, medium in rows if 25 <= sizes[smiles] <= 95})
    chosen: list[tuple[str, str, int]] = []
    total = 0
    for step in range(min(count, len(left))):
        window = left[(step * 7) % max(1, len(left) - 20) :][:20]
        pick = min(window, key=lambda dye: abs((total + dye[2]) / (len(chosen) + 1) - MEAN_ATOMS))
        left.remove(pick)
        chosen.append(pick)
        total += pick[2]
    return chosen


def screen(folder: Path, dyes: list[tuple[str, str, int]], workers: int) -> Run:
    """One screen in a new store, as a user runs it."""
    name = f"{len(dyes)}-{workers}"
    library, brief, store = (folder / f"{name}{end}" for end in (".csv", ".toml", ".db"))
    with library.open("w", encoding="utf-8", newline="") as out:
        writer = csv.writer(out)
        writer.writerow(("id", "smiles", "medium"))
        writer.writerows((f"D{place}", smiles, medium) for place, (smiles, medium, _) in enumerate(dyes))
    brief.write_text(BRIEF, encoding="utf-8")
    command = [
        sys.executable,
        "-m",
        "orchil",
        "screen",
        str(library),
        "--brief",
        str(brief),
        "--store",
        str(store),
    ]
    start = time.monotonic()
    child = subprocess.Popen(
        [*command, "--workers", str(workers)], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
    )
    _, _, usage = os.wait4(child.pid, 0)
    wall = time.monotonic() - start
    with Store.open_read_only(store) as opened:
        timing = opened.query("SELECT stage, total_cpu_seconds FROM timing")
        done = opened.query("SELECT count(*) AS n FROM ranking WHERE status = 'done'")
    stages = dict(zip(timing["stage"], timing["total_cpu_seconds"], strict=True))
    return Run(wall, usage.ru_utime + usage.ru_stime, stages, int(done["n"].iloc[0]))


if __name__ == "__main__":
    main()
