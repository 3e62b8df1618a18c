"""The command line; nothing heavy is loaded before a command runs."""

from scanner.cli.program import main

__all__ = ["main"]
