"""The door of the first-party stages: one hook, found through the entry point group `orchil.stages`.

Importing this module loads no chemistry library; the stages import theirs when they run.
"""

from __future__ import annotations

from collections.abc import Sequence

import pluggy
from orchil_schemas import Check, LibraryStage, Stage

hookimpl = pluggy.HookimplMarker("orchil")


@hookimpl
def orchil_stages() -> Sequence[Stage | LibraryStage]:
    """The stages of the main path, in the order in which a candidate meets them."""
    from .calibrate import Calibrate
    from .embed import Embed
    from .excite import Excite
    from .intake import Intake
    from .relax import Relax
    from .score import Score

    return [Intake(), Embed(), Relax(), Excite(), Calibrate(), Score()]


@hookimpl
def orchil_checks() -> list[Check]:
    """Published values that this machine must reproduce."""
    from .checks import checks

    return checks()
