"""The trained numbers of the response Hamiltonian, by name, as one flat vector.

Names: ``gap_scale``, ``constant`` (eV); ``occ:7p3``/``virt:7p3`` level shifts (eV) of the p shell of nitrogen with
coordination number 3; ``occ_charge:7`` their response to the atomic charge (eV/e); ``occ_hetero:7``,
``occ_hydrogen:7`` and ``occ_around:7`` to the neighbours; ``occ_along:7`` and ``occ_plane:7`` the dependence of p
levels on their direction against the bonds; ``hop:6-7`` relative change of p-p couplings; ``coulomb_*`` and
``exchange_*`` the damped kernels; ``solvent_*`` the medium.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from orchil_schemas import FloatArray

from .window import HOPPING_CLASSES

COORDINATION: dict[int, tuple[float, ...]] = {
    5: (3.0, 4.0),
    6: (2.0, 3.0, 4.0),
    7: (1.0, 2.0, 3.0, 4.0),
    8: (1.0, 2.0),
    14: (4.0,),
    15: (3.0, 4.0),
    16: (1.0, 2.0, 3.5),
}
"""Coordination numbers at which a level shift is trained; between them the shift is interpolated smoothly."""

ELEMENTS = (1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53)
"""Elements with kernels of their own; others take the untrained hardness."""

CHARGED = (1, 5, 6, 7, 8, 16)
NEIGHBOURED = (5, 6, 7, 8, 16)
"""Elements whose p levels know their neighbours."""

SHAPED: tuple[tuple[int, ...], ...] = ((5,), (6,), (7,), (8,), (16, 34), (9, 17, 35, 53))
"""Groups of elements whose p levels depend on the direction against the bonds."""

_D_SHELLS = (14, 15, 16, 17)


@dataclass(frozen=True)
class LevelKind:
    """One trained level: element, angular momentum, coordination number (None: whatever it is)."""

    number: int
    momentum: int
    coordination: float | None

    @property
    def name(self) -> str:
        """Short name as in the parameter file."""
        tail = "" if self.coordination is None else f"{self.coordination:g}"
        return f"{self.number}{'spd'[self.momentum]}{tail}"


@cache
def level_kinds() -> tuple[LevelKind, ...]:
    """All trained levels in a fixed order."""
    kinds = [LevelKind(1, 0, None)]
    for number in ELEMENTS[1:]:
        kinds.append(LevelKind(number, 0, None))
        kinds.extend(LevelKind(number, 1, c) for c in COORDINATION.get(number, (None,)))
    kinds.extend(LevelKind(number, 2, None) for number in _D_SHELLS)
    return tuple(kinds)


@cache
def start_values() -> Mapping[str, float]:
    """Every parameter with the value that training starts from and is drawn towards."""
    values: dict[str, float] = {"gap_scale": 1.0, "constant": 1.0}
    for side in ("occ", "virt"):
        values |= {f"{side}:{kind.name}": 0.0 for kind in level_kinds()}
        values |= {f"{side}_charge:{number}": 0.0 for number in CHARGED}
        values |= {f"{side}_{what}:{n}": 0.0 for what in ("hetero", "hydrogen", "around") for n in NEIGHBOURED}
        values |= {f"{side}_{what}:{group[0]}": 0.0 for what in ("along", "plane") for group in SHAPED}
    values |= {f"hop:{one}-{other}": 0.0 for one, other in HOPPING_CLASSES}
    # kernels start as in the simplified Tamm-Dancoff approach (Grimme, J. Chem. Phys. 138, 244104, 2013),
    # with the attraction halved again: GFN2-xTB levels lie as close as those of a functional without exchange
    values |= {"coulomb_near": 0.25, "coulomb_far": 0.25, "coulomb_length": 4.0, "coulomb_exponent": 2.0}
    values |= {"exchange_strength": 1.0, "exchange_exponent": 2.0}
    for kernel in ("coulomb", "exchange"):
        values |= {f"{kernel}_hardness:{number}": 0.0 for number in ELEMENTS}
    values |= {"solvent_transition": 0.0, "solvent_dipole": 0.0, "solvent_polarisability": 0.0}
    return values


@cache
def names() -> tuple[str, ...]:
    """Parameter names in the order of the vector."""
    return tuple(start_values())


@cache
def index() -> Mapping[str, int]:
    """Position of each name in the vector."""
    return {name: place for place, name in enumerate(names())}


@dataclass(frozen=True)
class Parameters:
    """A full parameter vector with access by name."""

    vector: FloatArray

    def __getitem__(self, name: str) -> float:
        return float(self.vector[index()[name]])

    def several(self, found: Iterable[str]) -> FloatArray:
        """Values of several names, in their order."""
        return self.vector[[index()[name] for name in found]]


def start_parameters() -> Parameters:
    """The untrained vector."""
    return Parameters(np.array(list(start_values().values())))


def load_parameters(text: str) -> Parameters:
    """Parameters from the JSON of a parameter file; names it lacks keep their start value (ValueError:
    unknown).
    """
    values = dict(start_values())
    given = json.loads(text)["parameters"]
    unknown = set(given) - set(values)
    if unknown:
        raise ValueError(f"unknown parameters: {', '.join(sorted(unknown))}")
    values |= given
    return Parameters(np.array(list(values.values())))


@cache
def trained_parameters() -> Parameters:
    """The parameters shipped with the package."""
    return load_parameters(files(__package__).joinpath("trained.json").read_text(encoding="utf-8"))
