"""`mutual check`: read and report what was understood, compute nothing."""

from __future__ import annotations

from collections.abc import Mapping
from math import degrees
from typing import TYPE_CHECKING

import click

from mutual.cli.options import Reading, headline_options, reading_options, result_options
from mutual.cli.running import read_all
from mutual.cli.saying import say, say_json

if TYPE_CHECKING:
    from mutual.recording.model import Accuracy, LimitSpec, Recording, Row

FORMAT = "mutual-check-1"
WIDTH = 80

HELP = """Read recordings and say how they were understood.

Takes the options of `mutual estimate`, so that one word can be exchanged for the other; those that choose a result
do nothing here. With --detail every row is listed.

\b
Example:
  mutual check coils.csv
"""


@click.command(help=HELP, short_help="Say what a recording holds; compute nothing.")
@reading_options
@headline_options
@result_options
def check(
    recordings: tuple[str, ...],
    windings: tuple[tuple[str, tuple[str, str]], ...],
    settings: tuple[tuple[str, str], ...],
    columns: tuple[tuple[str, str], ...],
    across: str | None,
    tied: str | None,
    as_json: bool,
    detail: bool,
    **_of_the_result: object,
) -> None:
    """Print how recordings were understood."""
    files = read_all(recordings, Reading(windings, settings, columns, across, tied))
    if as_json:
        inputs = [r.source.to_dict() for r in files if r.source is not None]
        findings = [f.to_dict() for r in files for f in r.findings]
        say_json({"format": FORMAT, "inputs": inputs, "findings": findings})
        return
    say("\n\n".join("\n".join(_understood(recording, detail)) for recording in files))


def _understood(recording: Recording, detail: bool) -> list[str]:
    from mutual.reports.findings import finding_lines
    from mutual.reports.wording import wrapped

    device = recording.device
    lines = wrapped(recording.file, WIDTH)
    items = {
        "kind": f"{recording.kind}, {_counted(len(recording.rows), 'row')}",
        "device": device.name or "no name given",
        "arrangement": device.arrangement,
        "windings": "; ".join(f"{w.name} {w.first}-{w.second}" for w in device.windings) or "none declared",
        "further leads": ", ".join(lead for lead in device.leads if not _on_winding(recording, lead)),
        "internal": ", ".join(device.internal),
        "earthed": ", ".join(device.earthed),
        "hookups": "; ".join(dict.fromkeys(str(row.hookup) for row in recording.rows)),
        "read": ", ".join(dict.fromkeys(name for row in recording.rows for name in (*row.values, *row.kicks))),
        "frequencies": _frequencies(recording),
        "points": _points(recording),
    }
    for name, text in items.items():
        if text:
            lines += wrapped(text, WIDTH, f"    {name:<14} ")
    for accuracy in recording.instruments.values():
        lines += wrapped(_accuracy(accuracy), WIDTH, f"    {'accuracy':<14} ")
    if not any(accuracy.stated for accuracy in recording.instruments.values()):
        lines += wrapped("none stated", WIDTH, f"    {'accuracy':<14} ")
    for limit in recording.limits:
        lines += wrapped(_limit(limit), WIDTH, f"    {'limit':<14} ")
    lines += [line for finding in recording.findings for line in finding_lines(finding, WIDTH)]
    if detail:
        lines += [line for row in recording.rows for line in _row(row)]
    return lines


def _counted(number: int, word: str) -> str:
    return f"{number} {word}" if number == 1 else f"{number} {word}s"


def _on_winding(recording: Recording, lead: str) -> bool:
    return any(lead in (w.first, w.second) for w in recording.device.windings)


def _frequencies(recording: Recording) -> str:
    from mutual.reports.figures import short

    found = dict.fromkeys(row.frequency for row in recording.rows)
    return ", ".join("not stated" if f is None else short(f, "Hz", 6) for f in found)


def _points(recording: Recording) -> str:
    found = dict.fromkeys(tuple(row.point.items()) for row in recording.rows if row.point)
    return "; ".join(", ".join(f"{name} = {_plain(value)}" for name, value in point) for point in found)


def _plain(value: object) -> str:
    return f"{value:.6g} (SI unit)" if isinstance(value, float) else str(value)


def _accuracy(accuracy: Accuracy) -> str:
    """One instrument's table in words, as it was understood."""
    from mutual.reports.figures import percent

    parts = []
    for name, value in vars(accuracy).items():
        label = name.replace("_", " ")
        if name in ("name", "stated_as") or value is None or value == {}:
            continue
        if isinstance(value, Mapping):
            parts += [f"{label} {_size(size, unit)}" for unit, size in value.items()]
        elif name.startswith("gain"):
            parts.append(f"{label} {percent(value)}")
        else:
            unit = {"shunt_floor": "S", "input_resistance": "ohm"}.get(name, "rad" if name.startswith("phase") else "1")
            parts.append(f"{label} {_size(value, unit) if isinstance(value, float) else value}")
    return f"{accuracy.name}: {', '.join(parts) or 'nothing stated'} (as {accuracy.stated_as})"


def _size(size: float, unit: str) -> str:
    """The size of an error; angles in degrees, as data sheets have them."""
    from mutual.reports.figures import short

    return f"{degrees(size):.4g} deg" if unit == "rad" else short(size, unit)


def _limit(limit: LimitSpec) -> str:
    from mutual.reports.figures import short
    from mutual.reports.findings import UNITS

    unit = UNITS.get(limit.quantity.split(" ")[0], "1")
    ends = (("at least", limit.lower), ("at most", limit.upper))
    words = [f"{word} {short(end, unit, 6)}" for word, end in ends if end is not None]
    return f"{limit.quantity} {' and '.join(words)}"


def _row(row: Row) -> list[str]:
    """One row as it was understood, with its number and line."""
    from mutual.recording.columns import VALUE_UNITS
    from mutual.reports.figures import short
    from mutual.reports.wording import wrapped

    place = f"row {row.number}" if row.line is None else f"row {row.number}, line {row.line}"
    parts = [str(row.hookup)]
    if row.frequency is not None:
        parts.append(f"at {short(row.frequency, 'Hz', 6)}")
    for name, value in row.values.items():
        unit = VALUE_UNITS[name]
        parts.append(f"{name} {_size(value.value, unit) if unit == 'rad' else short(value.value, unit, 9)}")
    parts += [f"{name} {sign}" for name, sign in row.kicks.items()]
    return wrapped("; ".join(parts), WIDTH, f"    {place}: ", "      ")
