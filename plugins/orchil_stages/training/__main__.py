"""``python -m orchil_stages.training``: make the trained numbers from the data folder.

    relax   DATA CACHE   relaxed geometries of the measured dyes (resumable; both cores)
    fit     DATA CACHE   train the response Hamiltonian on all dyes (trained.json) and without each fold
    calibrate DATA CACHE train the learned correction and its intervals, write its files
    anchor  DATA CACHE   fit how the errors of relatives go together, write the numbers of the anchor stage
    solvents DATA CACHE  fit the effective change of dipole to measured solvent shifts, write its numbers
    bench   DATA CACHE   errors on unseen scaffolds, five folds, beside the baselines

DATA is the folder with the measured dyes and TD-DFT energies, CACHE a folder outside the repository.
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from . import hamiltonian, solvents, steps
from .choice import dyes_in_order
from .dataset import media_of_dyes, read_measured
from .geometries import relax_dyes


def main() -> None:
    """Read the command line and run one step."""
    parser = argparse.ArgumentParser(prog="python -m orchil_stages.training", description=__doc__)
    commands = parser.add_subparsers(required=True)
    for name, run in (
        ("relax", relax),
        ("fit", hamiltonian.fit),
        ("calibrate", steps.calibrate),
        ("anchor", steps.anchor),
        ("solvents", solvents.fit),
        ("bench", steps.bench),
    ):
        step = commands.add_parser(name)
        step.add_argument("data", type=Path)
        step.add_argument("cache", type=Path)
        step.add_argument("--workers", type=int, default=2)
        step.add_argument("--limit", type=int, default=None, help="only the first dyes, for a trial")
        step.set_defaults(run=run)
    chosen = parser.parse_args()
    chosen.run(chosen)


def relax(chosen: argparse.Namespace) -> None:
    """Relax the dyes, one of every scaffold first."""
    dyes = dyes_in_order(media_of_dyes(read_measured(chosen.data / "measured_dyes.csv")))[: chosen.limit]
    start, failed = time.monotonic(), 0
    for count, done in enumerate(relax_dyes(dyes, chosen.cache, chosen.workers), 1):
        failed += done.geometry is None
        if count % 50 == 0:
            rate = count / (time.monotonic() - start)
            print(f"{count} relaxed, {failed} failed, {rate:.2f} dyes/s", flush=True)


if __name__ == "__main__":
    main()
