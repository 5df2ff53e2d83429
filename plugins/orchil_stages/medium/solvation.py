"""Which GBSA parameter set of GFN2-xTB stands in for a medium that has none of its own.

The rule: among the sets whose solvent is alike in hydrogen-bond donation, the one whose Born factor 1 -
1/eps is nearest; the solvation energy of an ion is proportional to it (Born, Z. Phys. 1, 45, 1920). Carbon
disulfide and benzene stand in for nothing: toluene lies between them and is the better known. The gas phase
takes part with a factor of 0, for hosts hardly above eps = 1.
"""

from __future__ import annotations

PARAMETER_SETS = {
    "acetone": 20.493,
    "acetonitrile": 35.688,
    "benzene": 2.2706,
    "ch2cl2": 8.93,
    "chcl3": 4.7113,
    "cs2": 2.6105,
    "dmf": 37.219,
    "dmso": 46.826,
    "ether": 4.24,
    "h2o": 78.355,
    "methanol": 32.613,
    "nhexane": 1.8819,
    "thf": 7.4257,
    "toluene": 2.3741,
}
"""Sets both engines carry, with the dielectric constant of their solvent."""

_DONORS = frozenset({"h2o", "methanol"})
_NOT_STAND_INS = frozenset({"benzene", "cs2"})


def parameter_set_for(dielectric_constant: float, hydrogen_bond_donor: bool) -> str | None:
    """Name of the stand-in set; None where the gas phase is nearest (only for hosts hardly above eps = 1)."""
    born: dict[str | None, float] = {None: 0.0}
    for name, eps in PARAMETER_SETS.items():
        if (name in _DONORS) == hydrogen_bond_donor and name not in _NOT_STAND_INS:
            born[name] = 1 - 1 / eps
    wanted = 1 - 1 / dielectric_constant
    return min(born, key=lambda name: abs(born[name] - wanted))
