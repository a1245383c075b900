"""The command line: `mutual COMMAND`. Nothing else in this package prints or exits."""

from mutual.cli.main import main

__all__ = ["main"]
