"""`python -m mutual.cli`, for where the command `mutual` is not on the path."""

from mutual.cli.main import main

main(prog_name="mutual")
