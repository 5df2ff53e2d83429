"""The choice of linear-algebra kernels follows the instruction sets, never the name of the processor."""

from __future__ import annotations

from pathlib import Path

import pytest
from orchil.blas import CORE_TYPE, kernel_choice


@pytest.mark.parametrize(
    ("flags", "expected"),
    [
        ("fpu sse2 avx2 fma avx512f avx512bw avx512dq avx512vl", {CORE_TYPE: "SKYLAKEX"}),
        ("fpu sse2 avx2 fma avx512f", {CORE_TYPE: "HASWELL"}),
        ("fpu sse2", {}),
    ],
)
def test_kernels_by_instruction_set(
    flags: str, expected: dict[str, str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv(CORE_TYPE, raising=False)
    cpuinfo = tmp_path / "cpuinfo"
    cpuinfo.write_text(f"processor : 0\nflags\t\t: {flags}\n", encoding="utf-8")
    assert kernel_choice(cpuinfo) == expected


def test_the_choice_of_the_user_stands(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(CORE_TYPE, "ZEN")
    assert kernel_choice() == {}


def test_an_unknown_system_is_left_alone(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv(CORE_TYPE, raising=False)
    assert kernel_choice(tmp_path / "none") == {}
