"""Energy transfer by dipole coupling: stage `transfer` for one dye, library stage `partners` for pairs."""

from .partners import FindPartners, PartnersSettings
from .stage import HandOver, TransferSettings

__all__ = ["FindPartners", "HandOver", "PartnersSettings", "TransferSettings"]
