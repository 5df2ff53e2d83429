"""The engine of Orchil: resolves the chain of stages, runs it, stores and ranks. Knows no chemistry."""

__version__ = "0.1.0"
