"""The excitation model: from a relaxed geometry to singlet states."""

from .stage import Excite

__all__ = ["Excite"]
