"""Oscillator strengths and directions against Tamm-Dancoff TD-DFT: ``python tests/bench/tddft_agreement.py FOLDER``.

Twenty dyes of ten families, gas phase, range-separated hybrid. Each dye is relaxed and computed once; FOLDER (outside
the repository) keeps results, so that the command goes on where it stopped. ``--limit N`` does the N smallest. Prints
one line a dye, then the rank correlation of oscillator strengths over matched pairs of states, the median angle
between transition dipoles of bright pairs, and CPU time against the number of basis functions. Hours of one core for
all twenty.
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray

sys.path.insert(0, str(Path(__file__).parents[2]))
from orchil_stages.dft.settings import DftSettings
from orchil_stages.dft.stage import dft_check
from scipy.stats import spearmanr

from tests.prediction import Predictor

DYES = {
    "4-nitroaniline": ("push-pull benzene", "Nc1ccc([N+](=O)[O-])cc1"),
    "4-dimethylamino-nitrostyrene": ("push-pull benzene", "CN(C)c1ccc(/C=C/[N+](=O)[O-])cc1"),
    "2,2'-bithiophene": ("oligothiophene", "c1csc(-c2cccs2)c1"),
    "terthiophene": ("oligothiophene", "c1csc(-c2ccc(-c3cccs3)s2)c1"),
    "anthracene": ("acene", "c1ccc2cc3ccccc3cc2c1"),
    "tetracene": ("acene", "c1ccc2cc3cc4ccccc4cc3cc2c1"),
    "7-amino-4-methylcoumarin": ("coumarin", "Cc1cc(=O)oc2cc(N)ccc12"),
    "7-dimethylamino-3-cyanocoumarin": ("coumarin", "CN(C)c1ccc2cc(C#N)c(=O)oc2c1"),
    "BODIPY": ("BODIPY", "F[B-]1(F)n2cccc2C=C2C=CC=[N+]21"),
    "tetramethyl-BODIPY": ("BODIPY", "Cc1cc(C)n2c1C=C1C(C)=CC(C)=[N+]1[B-]2(F)F"),
    "pentamethine streptocyanine": ("cyanine", "CN(C)/C=C/C=C/C=[N+](C)C"),
    "heptamethine streptocyanine": ("cyanine", "CN(C)/C=C/C=C/C=C/C=[N+](C)C"),
    "N-methyl-1,8-naphthalimide": ("naphthalimide", "CN1C(=O)c2cccc3cccc(C1=O)c23"),
    "4-amino-N-methyl-1,8-naphthalimide": ("naphthalimide", "CN1C(=O)c2cccc3c(N)ccc(C1=O)c23"),
    "azobenzene": ("azo", "c1ccc(/N=N/c2ccccc2)cc1"),
    "4-amino-4'-nitroazobenzene": ("azo", "Nc1ccc(/N=N/c2ccc([N+](=O)[O-])cc2)cc1"),
    "1-aminoanthraquinone": ("anthraquinone", "Nc1cccc2C(=O)c3ccccc3C(=O)c12"),
    "1,4-diaminoanthraquinone": ("anthraquinone", "Nc1ccc(N)c2C(=O)c3ccccc3C(=O)c12"),
    "phenoxazin-3-one": ("oxazine", "O=c1ccc2nc3ccccc3oc-2c1"),
    "pyronin Y": ("xanthene", "CN(C)c1ccc2cc3ccc(=[N+](C)C)cc-3oc2c1"),
}
SETTINGS = DftSettings(roots=4, largest=60)
BRIGHT = 0.05


def computed(name: str, folder: Path) -> dict[str, list[float]]:
    """Matched pairs of one dye, from the folder where it was done before."""
    path = folder / f"{name.replace(' ', '_')}.json"
    if not path.exists():
        found = Predictor(folder)(DYES[name][1], "gas phase")
        begin = time.process_time()
        made = dft_check(found.geometry, found.medium, found.transitions, found.analysis, SETTINGS)
        pairs = made.matched_state >= 0
        states = made.matched_state[pairs]
        content = {
            "cpu_seconds": [time.process_time() - begin],
            "basis_functions": [float(made.basis_functions)],
            "dft_ev": made.energy_ev[pairs].tolist(),
            "model_ev": found.transitions.energy_ev[states].tolist(),
            "dft_f": made.oscillator_strength[pairs].tolist(),
            "model_f": found.transitions.oscillator_strength[states].tolist(),
            "angle_deg": made.dipole_angle_deg[pairs].tolist(),
            "roots": [float(len(made.energy_ev))],
        }
        path.write_text(json.dumps(content), encoding="utf-8")
    read: dict[str, list[float]] = json.loads(path.read_text(encoding="utf-8"))
    return read


def show(name: str, one: dict[str, list[float]]) -> None:
    """A line for a dye."""
    pairs = zip(one["dft_ev"], one["model_ev"], one["dft_f"], one["model_f"], one["angle_deg"], strict=True)
    states = "; ".join(f"{a:.2f}/{b:.2f} eV f {c:.2f}/{d:.2f} {e:.0f} deg" for a, b, c, d, e in pairs)
    print(f"{name:36}{one['basis_functions'][0]:5.0f}{one['cpu_seconds'][0]:8.0f} s  {states}", flush=True)


def summary(results: list[dict[str, list[float]]]) -> None:
    """The figures of the bar, and how the cost grows."""
    f_dft, f_model, angle = (np.concatenate([one[key] for one in results]) for key in ("dft_f", "model_f", "angle_deg"))
    bright: FloatArray = np.minimum(f_dft, f_model) >= BRIGHT
    roots = sum(one["roots"][0] for one in results)
    print(f"{len(f_dft)} of {roots:.0f} roots matched")
    print(f"oscillator strengths: Spearman {spearmanr(f_dft, f_model).statistic:.2f}")
    print(f"{bright.sum()} bright pairs: median angle {np.median(angle[bright]):.1f} degrees")
    if len(results) > 2:
        size, cost = (np.log([one[key][0] for one in results]) for key in ("basis_functions", "cpu_seconds"))
        power, offset = np.polyfit(size, cost, 1)
        at_500 = np.exp(offset + power * np.log(500))
        print(f"CPU seconds grow as basis functions to the {power:.1f}: {at_500:.0f} at 500")


def main() -> None:
    """Compute what is missing, then print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    parser.add_argument("--limit", type=int, default=len(DYES))
    wanted = parser.parse_args()
    wanted.folder.mkdir(parents=True, exist_ok=True)
    results = []
    for name in sorted(DYES, key=lambda name: len(DYES[name][1]))[: wanted.limit]:
        results.append(computed(name, wanted.folder))
        show(name, results[-1])
    summary(results)


if __name__ == "__main__":
    main()
