"""Recordings to an estimate, an estimate to print, and its exit code."""

from __future__ import annotations

import shutil
import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import click

from mutual.cli.options import Reading, unique
from mutual.cli.saying import output_encoding, say, say_json
from mutual.errors import RefusedInput, WrongUsage
from mutual.reports.wording import safe
from mutual.result import Estimate

if TYPE_CHECKING:
    from mutual.recording.model import Recording

DONE, NOT_RELIABLE, LIMIT = 0, 3, 4
WIDEST = 100


def read_all(files: Sequence[str], reading: Reading) -> list[Recording]:
    """Read the files of one command, each with the same options.

    Raises
    ------
    RefusedInput
        One of them cannot be used.
    """
    from mutual.recording import read

    overrides = reading.overrides()
    return [read(file, overrides) for file in files]


def evaluate(
    recordings: Sequence[Recording],
    coverage: float,
    at: float | None = None,
    points: Sequence[tuple[str, str]] = (),
    risk: float = 0.025,
) -> Estimate:
    """Evaluate recordings of one device together.

    Raises
    ------
    RefusedInput
        The recordings cannot be used without guessing.
    click.UsageError
        A frequency or point at which nothing was read.
    """
    from mutual.evaluate import estimate

    point = chosen_point(recordings, points)
    try:
        return estimate(recordings, coverage=coverage, at=at, point=point, risk=risk)
    except WrongUsage as wrong:
        raise click.UsageError(safe(wrong), click.get_current_context()) from wrong


def chosen_point(recordings: Sequence[Recording], points: Sequence[tuple[str, str]]) -> dict[str, Any] | None:
    """The point named on the command line, as the rows have it: a number in SI units, or a text; None for no name.

    Raises
    ------
    click.BadParameter
        A name given twice, or one that no row has.
    """
    from mutual.units import parse

    rows = [row for recording in recordings for row in recording.rows]
    known = dict.fromkeys(name for row in rows for name in row.point)
    chosen: dict[str, Any] = {}
    for name, text in unique(points, "--point").items():
        if name not in known:
            there = ", ".join(known) or "none"
            raise click.BadParameter(f"no point {name!r} was set; there is: {there}", param_hint="'--point'")
        # A column without a unit may hold texts, and "8 mm" is then one of them.
        is_text = any(row.point.get(name) == text for row in rows)
        try:
            chosen[name] = text if is_text else parse(text).value
        except RefusedInput:
            chosen[name] = text
    return chosen or None


def paper() -> int:
    """Characters on a line: those of the terminal, 80 in a pipe."""
    if sys.stdout is None or not sys.stdout.isatty():
        return 80
    return max(40, min(shutil.get_terminal_size((80, 24)).columns, WIDEST))


def report(estimate: Estimate, as_json: bool, detail: bool) -> None:
    """Print an estimate for people, or as JSON."""
    if as_json:
        say_json(estimate.to_dict())
        return
    from mutual.reports.terminal import render

    say(render(estimate, detail=detail, width=paper(), encoding=output_encoding()))


def exit_code(estimate: Estimate) -> int:
    """Exit code of a result that was made (interface contract, section 3)."""
    if not estimate.reliable:
        return NOT_RELIABLE
    if any(limit.verdict != "met" for limit in estimate.limits):
        return LIMIT
    return DONE
