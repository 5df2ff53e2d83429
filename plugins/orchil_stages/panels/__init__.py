"""What our stages show of a candidate, and the chemistry that pages and questions borrow.

Importing this package loads no chemistry library.
"""

from .drawing import RdkitStructures
from .electron import ElectronPanel
from .polarised import PolarisedPanel
from .sdf import SDF
from .space import SpacePanel
from .spectrum import SpectrumPanel
from .sql import SQL_FUNCTIONS
from .states import StatesPanel

__all__ = [
    "SDF",
    "SQL_FUNCTIONS",
    "ElectronPanel",
    "PolarisedPanel",
    "RdkitStructures",
    "SpacePanel",
    "SpectrumPanel",
    "StatesPanel",
]
