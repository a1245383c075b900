"""The group of commands, and the one place where errors become sentences and exit codes."""

from __future__ import annotations

import os
from typing import Any

import click

from mutual.cli.check import check
from mutual.cli.estimate import estimate
from mutual.cli.pair import pair
from mutual.cli.polarity import polarity
from mutual.cli.saying import say, sentence, sentence_of_system, tell
from mutual.cli.sheet import sheet
from mutual.cli.simulate import simulate
from mutual.errors import RefusedInput, WrongUsage
from mutual.reports.wording import safe

REFUSED = 1
INTERRUPTED = 130  # common practice of shells: 128 + the number of the signal; no clause


class _Commands(click.Group):
    """A group whose commands may raise; they are listed in the order in which a beginner meets them."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(self.commands)

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except WrongUsage as wrong:
            raise click.UsageError(safe(wrong), ctx) from wrong
        except RefusedInput as refused:
            tell(f"mutual: {sentence(refused)}")
        except OSError as error:
            tell(f"mutual: {sentence_of_system(error)}")
        except KeyboardInterrupt:
            tell("mutual: stopped")
            ctx.exit(INTERRUPTED)
        except (click.exceptions.Exit, click.Abort, click.ClickException):
            raise
        except Exception as fault:
            if os.environ.get("MUTUAL_TRACEBACK"):
                raise
            kind = type(fault).__name__
            tell(f"mutual: a fault of the program, not of the input ({kind}: {safe(fault)}); set MUTUAL_TRACEBACK=1"
                 " to see where, and please report it")  # fmt: skip
        ctx.exit(REFUSED)


HELP = """Mutual inductance, coupling and polarity of coupled windings, with bounds.

You measure with what you have: an inductance meter on two or more windings, alone, in series one way and the
other, one shorted, in parallel. This command finds the windings that explain all readings at once, says how
sure it is, and names the slip that explains readings which contradict one another.

\b
Two windings, readings typed in:
  mutual pair --first 24.3uH --second 18.9uH \\
      --one-way 48.4uH --other-way 38.1uH --gain 0.1%
A sheet to fill in at the bench, then its estimate:
  mutual sheet coils.csv --winding pad=A-B --winding latch=C-D
  mutual estimate coils.csv

\b
Exit codes:
  0  done
  1  input refused
  2  wrong usage
  3  result printed, but not to be relied on as it stands
  4  result good, but a stated limit not met or undecided

\b
Completion of commands and options by the Tab key, for the running shell:
  bash: eval "$(_MUTUAL_COMPLETE=bash_source mutual)"
  zsh:  eval "$(_MUTUAL_COMPLETE=zsh_source mutual)"
  fish: _MUTUAL_COMPLETE=fish_source mutual | source
Put that line into the shell's start-up file to keep it.
"""


def _print_version(ctx: click.Context, _: click.Parameter, wanted: bool) -> None:
    if not wanted or ctx.resilient_parsing:
        return
    from importlib.metadata import PackageNotFoundError, version

    try:
        say(f"mutual {version('mutual-bench')}")
    except PackageNotFoundError:
        say("mutual, run from its source without being installed")
    ctx.exit()


@click.group(
    cls=_Commands,
    name="mutual",
    help=HELP,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)
@click.option("--version", is_flag=True, is_eager=True, expose_value=False, callback=_print_version,
              help="Show the version and exit.")  # fmt: skip
def main() -> None:
    """Hold the commands together."""


for _command in (pair, sheet, estimate, polarity, check, simulate):
    main.add_command(_command)
