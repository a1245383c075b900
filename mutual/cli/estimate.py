"""`mutual estimate`: recordings of one device, evaluated together."""

from __future__ import annotations

import click

from mutual.cli.options import Reading, headline_options, reading_options, result_options
from mutual.cli.running import evaluate, exit_code, read_all, report

HELP = """Evaluate all recordings of one device together.

Prints for every pair of windings the mutual inductance M, the coupling k and which leads are alike, each with
bounds; then how far the readings can be trusted, and what to do about what is wrong with them.

\b
Example:
  mutual estimate coils.csv --detail
  mutual estimate export.csv --winding pad=A-B --winding latch=C-D \\
      --column "Ls=inductance [uH]" --across A-D --tied B-C
"""


@click.command(help=HELP, short_help="Mutual inductance, coupling and polarity from recordings.")
@reading_options
@headline_options
@result_options
@click.pass_context
def estimate(
    ctx: click.Context,
    recordings: tuple[str, ...],
    windings: tuple[tuple[str, tuple[str, str]], ...],
    settings: tuple[tuple[str, str], ...],
    columns: tuple[tuple[str, str], ...],
    across: str | None,
    tied: str | None,
    at: float | None,
    points: tuple[tuple[str, str], ...],
    risk: float,
    coverage: float,
    as_json: bool,
    detail: bool,
) -> None:
    """Evaluate recordings together and print the estimate."""
    files = read_all(recordings, Reading(windings, settings, columns, across, tied))
    found = evaluate(files, coverage, at, points, risk)
    report(found, as_json, detail)
    ctx.exit(exit_code(found))
