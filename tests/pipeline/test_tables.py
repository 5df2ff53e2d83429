"""The ranking in narrow and wide windows."""

from __future__ import annotations

import pandas as pd
import pytest
from orchil.cli.tables import RANKING, natural_width, ranking_cells, ranking_table

ROW = {
    "rank": 1, "pick": 1, "candidate": "OB-049", "medium": "polyethylene", "score": 0.776, "hit_probability": 0.488,
    "absorption_max_nm": 534.0, "absorption_low_nm": 475.0, "absorption_high_nm": 606.0, "molar_absorptivity": 73000.0,
    "oscillator_strength": 3.43, "transition_dipole_debye": 20.1, "long_axis_angle_deg": 2.39,
    "electron_shift_angstrom": 3.26, "emission_max_nm": 602.0, "cautions": "see below",
}  # fmt: skip


@pytest.mark.parametrize("width", [60, 80, 100, 120, 160])
def test_a_ranking_fits_its_window(width: int) -> None:
    made = ranking_table(pd.DataFrame([ROW]), "toluene", width)
    assert natural_width(made) <= width
    headers = [str(column.header) for column in made.columns]
    for kept in ("rank", "candidate", "score", "absorption_max_nm"):
        assert RANKING[kept] in headers
    left_out = len(RANKING) - len(headers)
    assert (f"{left_out} more columns" in str(made.caption)) is (left_out > 0)


def test_a_wide_window_shows_everything() -> None:
    made = ranking_table(pd.DataFrame([ROW]), "toluene", 200)
    assert len(made.columns) == len(RANKING)


def test_noise_around_zero_is_shown_as_zero() -> None:
    assert ranking_cells(ROW | {"electron_shift_angstrom": 3.3e-7}, "toluene")["electron_shift_angstrom"] == 0.0
    assert ranking_cells(ROW, "toluene")["electron_shift_angstrom"] == 3.26
