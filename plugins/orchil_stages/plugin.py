"""The door of the first-party stages: one hook, found through the entry point group `orchil.stages`.

Importing this module loads no chemistry library; the stages import theirs when they run.
"""

from __future__ import annotations

from collections.abc import Sequence

import pluggy
from orchil_schemas import Check, LibraryStage, Stage
from orchil_schemas.panel import Panel, SqlFunction, StructureKit, TableFormat

hookimpl = pluggy.HookimplMarker("orchil")


@hookimpl
def orchil_stages() -> Sequence[Stage | LibraryStage]:
    """The stages of the main path, in the order in which a candidate meets them."""
    from .anchor import Anchor
    from .calibrate import Calibrate
    from .colour import MakeColour
    from .dft import CheckByDft
    from .embed import Embed
    from .emission import Emit
    from .excite import Excite
    from .intake import Intake
    from .polarisation import Polarise
    from .redox import EstimateRedox
    from .relax import Relax
    from .score import Score
    from .solvatochromism import Solvate
    from .spectrum import MakeSpectrum
    from .transfer import FindPartners, HandOver
    from .vibronic import AddVibrations

    main: list[Stage | LibraryStage] = [Intake(), Embed(), Relax(), Excite(), Calibrate()]
    light: list[Stage | LibraryStage] = [MakeSpectrum(), MakeColour(), Polarise(), Emit()]
    around: list[Stage | LibraryStage] = [EstimateRedox(), HandOver(), Solvate(), AddVibrations(), CheckByDft()]
    return [*main, *light, *around, Anchor(), Score(), FindPartners()]


@hookimpl
def orchil_checks() -> list[Check]:
    """Published values that this machine must reproduce."""
    from .checks import checks

    return checks()


@hookimpl
def orchil_panels() -> list[Panel]:
    """Sections of the page of a candidate."""
    from .panels import ElectronPanel, PolarisedPanel, SpacePanel, SpectrumPanel, StatesPanel

    return [SpectrumPanel(), SpacePanel(), PolarisedPanel(), ElectronPanel(), StatesPanel()]


@hookimpl
def orchil_structures() -> list[StructureKit]:
    """Drawings and likeness."""
    from .panels import RdkitStructures

    return [RdkitStructures()]


@hookimpl
def orchil_sql_functions() -> Sequence[SqlFunction]:
    """Substructures and likeness for questions."""
    from .panels import SQL_FUNCTIONS

    return SQL_FUNCTIONS


@hookimpl
def orchil_formats() -> list[TableFormat]:
    """File formats that need chemistry."""
    from .panels import SDF

    return [SDF]
