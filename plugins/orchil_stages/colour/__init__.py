"""Stage `colour`: what a solution or film of the dye looks like in transmitted light."""

from .stage import ColourSettings, MakeColour

__all__ = ["ColourSettings", "MakeColour"]
