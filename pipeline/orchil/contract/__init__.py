"""The contract kit: checks that every stage must pass, run by the engine itself.

A plugin's own tests are three lines::

    kit = Kit("stiffness")

    @pytest.mark.parametrize("check", kit.checks, ids=lambda check: check.__name__)
    def test_contract(check):
        check(kit)

The stage is found as in a screen: through its entry point, or through ``ORCHIL_EXTRA_PLUGINS``. Stages before it
are run as far as it needs them. A check that fails raises :class:`AssertionError` with a sentence.
"""

from .kit import Kit
from .molecules import MOLECULES

__all__ = ["MOLECULES", "Kit"]
