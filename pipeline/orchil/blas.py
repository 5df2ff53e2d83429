"""Which linear-algebra kernels the workers shall use.

The OpenBLAS inside the xtb wheel is of 2022. Processors it does not know by name get its oldest kernels,
which are some 20 % slower over a whole GFN2-xTB gradient. The instruction sets tell which kernels run here.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path

CORE_TYPE = "OPENBLAS_CORETYPE"
_KERNELS = ((("avx512f", "avx512bw", "avx512dq", "avx512vl"), "SKYLAKEX"), (("avx2", "fma"), "HASWELL"))


def kernel_choice(cpuinfo: Path = Path("/proc/cpuinfo")) -> Mapping[str, str]:
    """The environment variable that names the kernels; empty when it is set already or nothing is known."""
    if CORE_TYPE in os.environ:
        return {}
    flags = _flags(cpuinfo)
    chosen = next((name for wanted, name in _KERNELS if flags.issuperset(wanted)), None)
    return {CORE_TYPE: chosen} if chosen else {}


def _flags(cpuinfo: Path) -> set[str]:
    try:
        lines = cpuinfo.read_text(encoding="utf-8", errors="replace").splitlines()
    except OSError:
        return set()
    return set(next((line.split(":", 1)[1] for line in lines if line.startswith("flags")), "").split())
