"""`mutual pair`: two windings, readings typed on the command line, no file."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import click

from mutual.cli.options import QuantityType, result_options
from mutual.cli.running import evaluate, exit_code, report
from mutual.errors import RefusedInput
from mutual.quoting import shown
from mutual.result import Estimate, Finding, Input

if TYPE_CHECKING:
    from mutual.recording.model import Accuracy, Recording, Row, Value

FIRST, SECOND = "first", "second"
# Option, `across`, `tied`: the leads are A-B and C-D.
HOOKUPS = {
    "--first": ("A-B", ""),
    "--second": ("C-D", ""),
    "--one-way": ("A-D", "B-C"),
    "--other-way": ("A-C", "B-D"),
    "--aiding": ("A-D", "B-C"),
    "--opposing": ("A-C", "B-D"),
    "--first-with-short": ("A-B", "C-D"),
    "--second-with-short": ("C-D", "A-B"),
}
TEXTS = {
    "--first": "The first winding (A-B), the second open.",
    "--second": "The second winding (C-D), the first open.",
    "--one-way": "In series: across A-D, B joined to C.",
    "--other-way": "In series: across A-C, B joined to D.",
    "--aiding": "As --one-way, where the marks say that this one aids.",
    "--opposing": "As --other-way, where the marks say that this one opposes.",
    "--first-with-short": "The first winding, C joined to D.",
    "--second-with-short": "The second winding, A joined to B.",
}
ACCURACY = {
    "--gain": "Relative error, however shared: 0.1%.",
    "--gain-common": "Relative error shared by all readings.",
    "--gain-each": "Relative error of each reading by itself.",
    "--phase": "Phase error, however shared: 0.1deg or 2mrad.",
    "--phase-common": "Phase error shared by all readings.",
    "--phase-each": "Phase error of each reading by itself.",
    "--floor": "Additive error shared by all readings: 5nH; repeat for ohm.",
    "--counts": "Additive error in display steps.",
    "--noise": "Standard deviation of one reading: 5nH; repeat for ohm.",
    "--resolution": "Display step, where it is not the last digit typed: 10nH; repeat for ohm.",
    "--shunt-floor": "Additive error of the admittance: 0.5nS.",
    "--low-q-factor": "What the accuracy is multiplied by at low Q: \"1 + 1/Q\".",
    "--stated-as": "What these numbers are: limit (usual), standard or expanded.",
}
SEVERAL = ("--floor", "--noise", "--resolution")
NUMBERS = ("--counts",)


def _key(option: str) -> str:
    return option.removeprefix("--").replace("-", "_")


def _typed_options(function: Any) -> Any:
    """Options of all readings and of the accuracy table."""
    for option, text in reversed(ACCURACY.items()):
        kind: Any = click.Choice(["limit", "standard", "expanded"]) if option == "--stated-as" else str
        kind = float if option in NUMBERS else kind
        metavar = None if option in ("--stated-as", *NUMBERS) else "VALUE"
        function = click.option(
            option, type=kind, multiple=option in SEVERAL, metavar=metavar, help=text
        )(function)
    for option, text in reversed(TEXTS.items()):
        function = click.option(option, metavar="24.3uH[,R or Q]", help=text)(function)
    return function

HELP = """Two windings: type what the meter shows.

The leads of the first winding are A and B, those of the second C and D. Each reading is an inductance with its
unit; after a comma a resistance with its unit (then --frequency is needed) or, as a bare number, Q.

\b
Examples:
  mutual pair --first 24.3uH --second 18.9uH \\
      --one-way 48.4uH --other-way 38.1uH --gain 0.1%
  mutual pair --first 18.4uH --first-with-short 1.29uH,27.6 --gain 0.3%
"""


@click.command(help=HELP, short_help="Two windings, readings typed in, no file.")
@_typed_options
@click.option("--frequency", type=QuantityType("Hz"), metavar="100kHz",
              help="Test frequency; needed with a resistance.")  # fmt: skip
@click.option("--shared-loss", type=click.FloatRange(0, 1), default=0.1, show_default=True, metavar="S",
              help="Largest loss the windings may share, as a fraction of sqrt(R1 R2); 1 on a core.")  # fmt: skip
@result_options
@click.pass_context
def pair(
    ctx: click.Context,
    /,
    frequency: float | None,
    shared_loss: float,
    coverage: float,
    as_json: bool,
    detail: bool,
    **typed: Any,
) -> None:
    """Evaluate what was typed and print the estimate."""
    found = evaluate([_recording(typed, frequency, shared_loss)], coverage)
    if typed["aiding"] is not None or typed["opposing"] is not None:
        found = compare_with_marks(found)
    report(found, as_json, detail)
    ctx.exit(exit_code(found))


def compare_with_marks(found: Estimate) -> Estimate:
    """Add a finding where the readings contradict the marks, which claim that A and C are alike."""
    if found.pairs[0].polarity.verdict != "opposite":
        return found
    text = (
        "The marks say that A-D with B-C joined aids, hence that A and C are alike; the readings say that it opposes, "
        "hence that A and D are alike. Either the marks are wrong or the two readings were exchanged: exchange the "
        "marks of one winding, or read both once more."
    )
    return replace(found, findings=(*found.findings, Finding("caution", "marks contradicted", text)))


def _recording(typed: Mapping[str, Any], frequency: float | None, shared_loss: float) -> Recording:
    """What was typed, as a recording of two windings."""
    from mutual.device import Device, Winding
    from mutual.recording.checks import refuse_negative_inductance
    from mutual.recording.model import Recording

    for named, marked in (("--one-way", "--aiding"), ("--other-way", "--opposing")):
        if typed[_key(named)] is not None and typed[_key(marked)] is not None:
            raise click.UsageError(f"{named} and {marked} are the same hookup: give one of them")
    given = [option for option in HOOKUPS if typed[_key(option)] is not None]
    if not given:
        raise click.UsageError("no reading given: at least one of --first, --second, --one-way, ... is needed")
    rows = tuple(_row(n, option, typed[_key(option)], frequency) for n, option in enumerate(given, 1))
    device = Device("two windings", (Winding(FIRST, "A", "B"), Winding(SECOND, "C", "D")), shared_loss=shared_loss)
    instruments = _instruments(typed)
    try:
        refuse_negative_inductance(rows, instruments)
    except RefusedInput as refused:
        raise _of_option(refused, given[(refused.row or 1) - 1]) from None
    source, findings = _source(typed, given, frequency), _bare_ratios(typed)
    return Recording(device, rows, instruments=instruments, findings=findings, source=source)


def _bare_ratios(typed: Mapping[str, Any]) -> tuple[Finding, ...]:
    """A caution for each gain typed without `%`: it may have been meant in percent."""
    given = {option: typed[_key(option)] for option in ACCURACY if option.startswith("--gain")}
    texts = {
        option: f"{option} {value} has no % and is taken for {100 * float(value):g} %"
        for option, value in given.items()
        if value and re.fullmatch(r"[\s0-9.eE+-]+", value)
    }
    return tuple(Finding("caution", "unit", text, option) for option, text in texts.items())


def _of_option(
    refused: RefusedInput, option: str, found: str | None = None, expected: str | None = None
) -> RefusedInput:
    """The same refusal, placed at an option instead of a row and column."""
    found, expected = found or refused.found, expected or refused.expected
    return RefusedInput(refused.reason, column=option, found=found, expected=expected)


def _row(number: int, option: str, text: str, frequency: float | None) -> Row:
    from mutual.device import Hookup
    from mutual.recording.checks import refuse_nonsense
    from mutual.recording.model import Row

    across, tied = HOOKUPS[option]
    a, b = across.split("-")
    ties = tuple((pair[0], pair[-1]) for pair in tied.split())
    try:
        row = Row(number, Hookup((a, b), ties), frequency=frequency, values=_values(text))
        refuse_nonsense(row)
    except RefusedInput as refused:
        raise _of_option(refused, option, shown(text), "such as 24.3uH or 24.3uH,110mohm or 24.3uH,27.6 (Q)") from None
    if "resistance" in row.values and frequency is None:
        raise click.UsageError(f"{option} has a resistance: --frequency is needed to make use of it")
    return row


def _values(text: str) -> dict[str, Value]:
    """An inductance, and after a comma a resistance (with its unit) or Q (a bare number)."""
    from mutual.recording.model import Value
    from mutual.units import parse

    first, comma, second = text.partition(",")
    if comma and re.fullmatch(r"\s*[+-]?[0-9]+\s*", first):
        raise RefusedInput("a decimal comma: numbers here have a decimal point, and a comma begins R or Q")
    found = parse(first, "H")
    values = {"inductance": Value(found.value, found.step)}
    if comma:
        bare = re.fullmatch(r"[\s0-9.eE+-]+", second) is not None
        found = parse(second, "1" if bare else "ohm")
        if bare and found.value <= 0:
            raise RefusedInput("Q is above zero")
        values["quality" if bare else "resistance"] = Value(found.value, found.step)
    return values


def _instruments(typed: Mapping[str, Any]) -> dict[str, Accuracy]:
    """The accuracy options as the table `[meter]`, read as that of a preface is."""
    from mutual.recording.accuracy import accuracy
    from mutual.recording.preface import Preface

    table = {_key(option): typed[_key(option)] for option in ACCURACY}
    table = {key: list(value) if isinstance(value, tuple) else value for key, value in table.items() if value}
    try:
        return {"meter": accuracy(Preface({"meter": table}), "meter")} if table else {}
    except RefusedInput as refused:
        key = (refused.column or "").removeprefix("meter.")
        raise _of_option(refused, f"--{key.replace('_', '-')}") from None


def _source(typed: Mapping[str, Any], given: list[str], frequency: float | None) -> Input:
    """What stands for the file: its hash is that of the options, one a line."""
    import hashlib

    lines = [f"{option} {typed[_key(option)]}" for option in (*given, *ACCURACY) if typed[_key(option)]]
    text = "\n".join([*lines, f"--frequency {frequency}"])
    digest = hashlib.sha256(text.encode("utf-8", "surrogateescape")).hexdigest()
    return Input("command line", digest, "readings", len(given))
