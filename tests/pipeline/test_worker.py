"""A record that cannot tell its quantities fails in the worker, not in the coordinator."""

from __future__ import annotations

import pytest
from orchil.worker import BadOutputError, _check_quantities
from orchil_schemas import Quantity, QuantityInfo, Record


class Stiffness(Record):
    kind = "stiffness"
    offers = (QuantityInfo(name="stiffness", unit="1", meaning="how stiff"),)
    value: float

    def quantities(self) -> tuple[Quantity, ...]:
        if self.value < 0:
            raise ArithmeticError("below nothing")
        name = "stiffness" if self.value < 10 else "hardness"
        return (Quantity(name=name, value=self.value, unit="1"),)


def test_sound_quantities_pass() -> None:
    _check_quantities(Stiffness(value=1.0))


@pytest.mark.parametrize(("value", "said"), [(-1.0, "below nothing"), (11.0, "does not offer: hardness")])
def test_faulty_quantities_are_bad_output(value: float, said: str) -> None:
    with pytest.raises(BadOutputError, match=said):
        _check_quantities(Stiffness(value=value))
