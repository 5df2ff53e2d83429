"""``python -m orchil`` is the command ``orchil``."""

from .cli import main

main()
