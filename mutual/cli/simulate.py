"""`mutual simulate`: the recording that a described device would give."""

from __future__ import annotations

import click

from mutual.cli.saying import tell, write_new
from mutual.errors import RefusedInput
from mutual.reports.wording import safe

HELP = """Write the recording that a described device would give.

DEVICE.toml describes the windings, the accuracy of the instruments and what is to be read. Errors are drawn within
that accuracy, so estimating from several seeds shows what a set of readings is worth before anything is wired.

\b
Example, device.toml:
  format = "mutual-device-1"
  [windings]
  pad = ["A", "B"]
  latch = ["C", "D"]
  [inductance]
  pad = "24.3 uH"
  latch = "18.9 uH"
  [coupling]
  "pad latch" = 0.12
  [meter]
  gain_common = "0.1 %"
  resolution = "10 nH"
  [[readings]]
  across = "A-D"
  tied = "B-C"
  frequency = "100 kHz"
  quantities = ["inductance"]
  [[readings]]
  across = "A-C"
  tied = "B-D"
  frequency = "100 kHz"
  quantities = ["inductance"]
\b
  mutual simulate device.toml --out simulated.csv --seed 7
  mutual estimate simulated.csv
"""


@click.command(help=HELP, short_help="The recording that a described device would give.")
@click.argument("device", metavar="DEVICE.toml", type=click.Path())
@click.option("--out", required=True, metavar="FILE", type=click.Path(), help="The recording to write.")
@click.option("--seed", type=click.IntRange(min=0), default=1, show_default=True, metavar="N",
              help="Start of the random numbers: the same seed gives the same recording.")  # fmt: skip
@click.option("--force", is_flag=True, help="Overwrite FILE if it exists.")
def simulate(device: str, out: str, seed: int, force: bool) -> None:
    """Write the simulated recording."""
    from mutual.description import read_device
    from mutual.simulate import simulate as draw
    from mutual.simulate import written

    described = read_device(device)
    try:
        recording = draw(described, seed)
    except RefusedInput as refused:
        raise refused.with_place(file=device) from None
    write_new(out, written(recording, seed), force)
    tell(f"wrote {safe(out)}: {len(recording.rows)} simulated rows, seed {seed}")
