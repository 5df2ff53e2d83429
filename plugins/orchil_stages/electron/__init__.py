"""What an excitation is: where hole and electron sit, fragments, triplets, orbitals to look at."""

from .orbitals import write_cube, write_molden
from .report import state_analysis, triplets_record

__all__ = ["state_analysis", "triplets_record", "write_cube", "write_molden"]
