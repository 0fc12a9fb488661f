"""Run the command line with ``python -m ampwarden``."""

from .commands.main import main

main()
