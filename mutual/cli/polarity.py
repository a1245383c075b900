"""`mutual polarity`: which leads are alike, how sure, and what to do next if not sure."""

from __future__ import annotations

import click

from mutual.cli.options import Reading, headline_options, reading_options, result_options
from mutual.cli.running import NOT_RELIABLE, evaluate, exit_code, paper, read_all
from mutual.cli.saying import output_encoding, say, say_json

HELP = """Say which leads are of like polarity, and how sure that is.

A pair is called alike or unlike at odds of 1000 to 1 or better; otherwise it is undetermined, the next test is
named, and the exit code is 3.

\b
Example:
  mutual polarity kicks.csv coils.csv
"""


@click.command(help=HELP, short_help="Which leads are alike, how sure, and what to do next.")
@reading_options
@headline_options
@result_options
@click.pass_context
def polarity(
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
    """Evaluate recordings together and print which leads are alike."""
    files = read_all(recordings, Reading(windings, settings, columns, across, tied))
    found = evaluate(files, coverage, at, points, risk)
    if as_json:
        say_json(found.to_dict())
    else:
        from mutual.reports.dots import render_polarity

        say(render_polarity(found, detail=detail, width=paper(), encoding=output_encoding()))
    open_pairs = any(pair.polarity.verdict == "undetermined" for pair in found.pairs)
    ctx.exit(NOT_RELIABLE if open_pairs else exit_code(found))
