"""Media: solvents, films and the gas phase, with what the ground state and the spectra need of them."""

from .lookup import known_media, known_smiles, lookup
from .polarity import orientation_polarisability
from .solvation import PARAMETER_SETS, parameter_set_for

__all__ = [
    "PARAMETER_SETS",
    "known_media",
    "known_smiles",
    "lookup",
    "orientation_polarisability",
    "parameter_set_for",
]
