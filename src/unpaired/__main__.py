"""`python -m unpaired` is the command `unpaired`."""

from .cli import main

if __name__ == "__main__":  # worker processes import this module too
    main()
