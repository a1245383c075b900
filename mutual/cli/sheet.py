"""`mutual sheet`: a recording to fill in by hand."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from mutual.cli.options import Assignment, QuantityType, Reading, WindingType
from mutual.cli.running import paper
from mutual.cli.saying import output_encoding, say, write_new
from mutual.reports.wording import safe, wrapped

if TYPE_CHECKING:
    from mutual.device import Device

# What `--set` may say here: the rest of a preface is written into the file by hand.
OF_THE_DEVICE = ("device", "arrangement", "leads", "internal", "earthed", "ties", "shared_loss")

HELP = """Write a recording to fill in by hand, and draw how to wire each of its rows.

FILE gets a preface, one row for each hookup worth reading, and empty values; rows left empty do no harm. An
existing file is never overwritten.

\b
Example:
  mutual sheet coils.csv --winding pad=A-B --winding latch=C-D \\
      --frequency 100kHz
"""


@click.command(help=HELP, short_help="A recording to fill in at the bench.")
@click.argument("file", type=click.Path())
@click.option("--winding", "windings", type=WindingType(), multiple=True, required=True, metavar="NAME=A-B",
              help="A winding and its two leads; repeat for each.")
@click.option("--set", "settings", type=Assignment("KEY=VALUE"), multiple=True, metavar="KEY=VALUE",
              help="What the preface is to say of the device, e.g. --set device=\"latch coils\".")
@click.option("--frequency", type=QuantityType("Hz"), metavar="100kHz", help="Test frequency, written into every row.")
@click.option("--inductance-unit", default="uH", show_default=True, metavar="UNIT", help="Unit of that column.")
@click.option("--resistance-unit", default="ohm", show_default=True, metavar="UNIT", help="Unit of that column.")
def sheet(
    file: str,
    windings: tuple[tuple[str, tuple[str, str]], ...],
    settings: tuple[tuple[str, str], ...],
    frequency: float | None,
    inductance_unit: str,
    resistance_unit: str,
) -> None:
    """Write the sheet and print the drawings."""
    from mutual.recording import sheet as text_of

    device = _device(windings, settings)
    text = text_of(device, frequency=frequency, inductance_unit=inductance_unit, resistance_unit=resistance_unit)
    write_new(file, text)
    say("\n\n".join(_drawings(device)))
    say(f"\nWritten: {safe(file)}")
    say("Fill in what was read, state the meter's accuracy in the first lines, then run")
    say(f"    mutual estimate {safe(file)}")


def _device(windings: tuple[tuple[str, tuple[str, str]], ...], settings: tuple[tuple[str, str], ...]) -> Device:
    """The device that the options declare, checked as a preface is."""
    from mutual.recording.declared import device_of
    from mutual.recording.overrides import merged
    from mutual.recording.preface import Preface

    for key, _ in settings:
        if key.split(".")[0].strip() not in OF_THE_DEVICE:
            hint = f"a sheet takes {', '.join(OF_THE_DEVICE)}; write other keys into the file, or give them to estimate"
            raise click.BadParameter(f"{key!r}: {hint}", param_hint="'--set'")
    return device_of(merged(Preface({}), Reading(windings, settings, (), None, None).overrides()))


def _drawings(device: Device) -> list[str]:
    """A numbered drawing for each row of the sheet."""
    from mutual.recording.sheet import hookups_to_read
    from mutual.reports.drawing import draw_hookup, pen_for

    pen, width = pen_for(output_encoding()), paper()
    return [
        "\n".join([*wrapped(f"row {number}: across {hookup}", width), *draw_hookup(device, hookup, pen, width)])
        for number, hookup in enumerate(hookups_to_read(device), 1)
    ]
