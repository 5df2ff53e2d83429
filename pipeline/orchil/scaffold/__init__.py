"""Makes a small installable package with one stage, from the templates in ``files``."""

from .package import NewPackage, make_package

__all__ = ["NewPackage", "make_package"]
