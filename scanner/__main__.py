"""``python -m scanner`` is the command line."""

from scanner.cli import main

main()
