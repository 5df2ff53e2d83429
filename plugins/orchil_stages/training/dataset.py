"""Reading the measured dyes: quarantine of known faults, scaffolds, choice of rows.

The measured set is Joung, Han, Jeong, Park, Sci. Data 7, 295 (2020). Nothing is deleted: a row that is not
used carries the reason.
"""

from __future__ import annotations

import csv
import hashlib
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from statistics import median
from typing import Any

from orchil_schemas import HC_EV_NM, BadInput

from orchil_stages.medium import lookup

SCOPE_NM = (300.0, 1100.0)
SCOPE_HEAVY_ATOMS = 100
TEST_SHARE = 4
"""One scaffold in four is kept for testing."""


@dataclass(frozen=True)
class Measurement:
    """One dye in one medium: maxima in nm, log10 molar absorptivity, width in cm^-1, None where not
    measured.
    """

    smiles: str
    medium: str
    absorption_nm: float | None
    emission_nm: float | None
    log10_absorptivity: float | None
    width_cm1: float | None
    lifetime_ns: float | None
    quantum_yield: float | None
    reference: str
    fault: str | None = None

    @property
    def energy_ev(self) -> float:
        """Energy of the absorption maximum."""
        assert self.absorption_nm is not None
        return HC_EV_NM / self.absorption_nm


def read_measured(path: Path) -> list[Measurement]:
    """All rows of the measured set with their faults; repeats of one dye in one medium become their
    median.
    """
    with path.open(encoding="utf-8", newline="") as lines:
        rows = [_measurement(row) for row in csv.DictReader(lines)]
    return _merge_repeats(rows)


def _measurement(row: dict[str, str]) -> Measurement:
    def number(name: str) -> float | None:
        return float(row[name]) if row[name] else None

    medium, fault = _medium(row)
    made = Measurement(
        smiles=row["smiles"],
        medium=medium,
        absorption_nm=number("absorption_max_nm"),
        emission_nm=number("emission_max_nm"),
        log10_absorptivity=number("log10_molar_absorptivity"),
        width_cm1=_width(number("absorption_fwhm_cm1"), number("absorption_fwhm_nm"), number("absorption_max_nm")),
        lifetime_ns=number("lifetime_ns"),
        quantum_yield=number("quantum_yield"),
        reference=row["reference"],
        fault=fault,
    )
    return made if fault else replace(made, fault=_fault(made))


def _width(in_cm1: float | None, in_nm: float | None, position_nm: float | None) -> float | None:
    """Width in cm^-1; one given in nm is turned at the maximum."""
    if in_cm1 is None and in_nm is not None and position_nm is not None:
        return in_nm * 1e7 / position_nm**2
    return in_cm1


def _medium(row: dict[str, str]) -> tuple[str, str | None]:
    solvent = row["solvent_smiles"]
    if solvent == row["smiles"]:
        return solvent, "solid: the medium is the dye itself"
    if solvent == "gas":
        return "gas phase", None
    try:
        return lookup(solvent).name, None
    except BadInput:
        return solvent, "medium is not in the table of solvents"


def _fault(row: Measurement) -> str | None:
    if row.absorption_nm is None:
        return "no absorption maximum"
    if row.emission_nm is not None and row.emission_nm < row.absorption_nm:
        return "emission at a shorter wavelength than absorption"
    if "." in row.smiles:
        return "more than one species in the row"
    if not SCOPE_NM[0] <= row.absorption_nm <= SCOPE_NM[1]:
        return "absorption maximum outside 300 to 1,100 nm"
    return None


def _merge_repeats(rows: Iterable[Measurement]) -> list[Measurement]:
    groups: dict[tuple[str, str], list[Measurement]] = defaultdict(list)
    for row in rows:
        groups[(row.smiles, row.medium)].append(row)
    return [_merged(group) for group in groups.values()]


def _merged(group: Sequence[Measurement]) -> Measurement:
    sound = [row for row in group if row.fault is None]
    if len(sound) < 2:
        return sound[0] if sound else group[0]
    maxima = [row.absorption_nm for row in sound if row.absorption_nm is not None]
    if max(maxima) - min(maxima) > 20.0:
        return replace(sound[0], fault="repeated measurements differ by more than 20 nm")

    def middle(name: str) -> float | None:
        values = [getattr(row, name) for row in sound if getattr(row, name) is not None]
        return median(values) if values else None

    fields = (
        "absorption_nm",
        "emission_nm",
        "log10_absorptivity",
        "width_cm1",
        "lifetime_ns",
        "quantum_yield",
    )
    middles: dict[str, Any] = {name: middle(name) for name in fields}
    return replace(sound[0], **middles)


def scaffold(smiles: str) -> str:
    """Bemis-Murcko scaffold (J. Med. Chem. 39, 2887, 1996) as SMILES; "acyclic" for molecules without
    rings.
    """
    from rdkit import Chem, rdBase
    from rdkit.Chem.Scaffolds.MurckoScaffold import GetScaffoldForMol

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        return "unreadable"
    core = GetScaffoldForMol(molecule)  # type: ignore[no-untyped-call]
    return Chem.MolToSmiles(core, isomericSmiles=False) or "acyclic"


def is_test(scaffold_smiles: str) -> bool:
    """Is this scaffold kept out of training? Decided by a hash of the scaffold alone, the same on every
    machine.
    """
    return int(hashlib.sha256(scaffold_smiles.encode()).hexdigest(), 16) % TEST_SHARE == 0


def fold(scaffold_smiles: str, folds: int) -> int:
    """Cross-validation fold of a scaffold, independent of :func:`is_test`."""
    return int(hashlib.sha256(b"fold:" + scaffold_smiles.encode()).hexdigest(), 16) % folds


def media_of_dyes(rows: Iterable[Measurement]) -> dict[str, list[Measurement]]:
    """Sound rows by dye, the medium most used over the whole set first."""
    sound = [row for row in rows if row.fault is None]
    popularity: dict[str, int] = defaultdict(int)
    for row in sound:
        popularity[row.medium] += 1
    by_dye: dict[str, list[Measurement]] = defaultdict(list)
    for row in sound:
        by_dye[row.smiles].append(row)
    for group in by_dye.values():
        group.sort(key=lambda row: -popularity[row.medium])
    return dict(by_dye)
