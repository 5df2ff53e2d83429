"""What an excitation is: where hole and electron sit, fragments, triplets, orbitals to look at."""

from .orbitals import write_cube, write_molden
from .report import state_records

__all__ = ["state_records", "write_cube", "write_molden"]
