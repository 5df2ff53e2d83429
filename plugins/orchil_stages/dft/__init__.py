"""Check of a few candidates by TD-DFT (PySCF): singlets of a range-separated hybrid at the relaxed geometry."""

from .stage import CheckByDft

__all__ = ["CheckByDft"]
