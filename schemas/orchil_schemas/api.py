"""The version of the contract between the engine and plugins.

A plugin module says ``ORCHIL_API = "1.0"``: the version it was written for. The engine takes it when the first
number is the same and the second is not larger than its own. Removing or changing anything a plugin can use
raises the first number, adding to it the second.
"""

from __future__ import annotations

API_VERSION = "1.0"
