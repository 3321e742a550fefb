"""`python -m unpaired` is the command `unpaired`."""

from .cli import main

main()
