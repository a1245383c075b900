"""Options that several commands share, and how their texts become values."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, TypeVar

import click

from mutual.errors import RefusedInput

if TYPE_CHECKING:
    from mutual.recording import Overrides

    _ParamType = click.ParamType[Any]
else:
    # Generic since click 8.2 only.
    _ParamType = click.ParamType

Function = TypeVar("Function", bound=Callable[..., Any])


@dataclass(frozen=True)
class Assignment(_ParamType):
    """`KEY=VALUE`, split at the first equals sign (or at the last, where the key may hold one)."""

    shape: str
    at_last: bool = False
    name: str = "assignment"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> tuple[str, str]:
        """Split the text; it is wrong usage where it has no such form."""
        if isinstance(value, tuple):
            return value
        key, sign, text = value.rpartition("=") if self.at_last else value.partition("=")
        if not sign or not key.strip() or not text.strip():
            self.fail(f"{value!r} should read {self.shape}", param, ctx)
        return key.strip(), text.strip()


class WindingType(_ParamType):
    """`NAME=LEAD-LEAD`."""

    name = "winding"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, tuple[str, str]]:
        """Split the text; it is wrong usage where it has no such form."""
        if isinstance(value, tuple):
            return value
        name, _, leads = value.partition("=")
        ends = [lead.strip() for lead in leads.split("-")]
        if not name.strip() or len(ends) != 2 or not all(ends):
            self.fail(f"{value!r} should name a winding and its two leads, as in pad=A-B", param, ctx)
        return name.strip(), (ends[0], ends[1])


@dataclass(frozen=True)
class QuantityType(_ParamType):
    """A number with a unit; it is wrong usage where that cannot be read."""

    unit: str
    name: str = "quantity"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """Read the number; it is wrong usage where there is none with this unit."""
        from mutual import units

        if isinstance(value, float):
            return value
        try:
            return float(units.parse(value, self.unit).value)
        except RefusedInput as refused:
            self.fail(str(refused), param, ctx)


def unique(pairs: Sequence[tuple[str, Any]], option: str) -> dict[str, Any]:
    """A mapping of pairs given one by one.

    Raises
    ------
    click.BadParameter
        A name given twice.
    """
    found: dict[str, Any] = {}
    for name, value in pairs:
        if name in found:
            raise click.BadParameter(f"{name!r} is given twice", param_hint=f"'{option}'")
        found[name] = value
    return found


def _stack(*decorators: Callable[[Function], Function]) -> Callable[[Function], Function]:
    def apply(function: Function) -> Function:
        for decorator in reversed(decorators):
            function = decorator(function)
        return function

    return apply


reading_options = _stack(
    click.argument("recordings", nargs=-1, required=True, metavar="RECORDING...", type=click.Path()),
    click.option("--winding", "windings", type=WindingType(), multiple=True, metavar="NAME=A-B",
                 help="A winding and its two leads, for files that do not name it; repeat for each."),
    click.option("--set", "settings", type=Assignment("KEY=VALUE"), multiple=True, metavar="KEY=VALUE",
                 help="What a preface could say, e.g. --set meter.gain=0.3% or --set arrangement=\"one limb\"."),
    click.option("--column", "columns", type=Assignment("THEIRS=OURS [UNIT]", at_last=True), multiple=True,
                 metavar="\"THEIRS=OURS [UNIT]\"",
                 help="A column of a foreign file, e.g. --column \"Ls=inductance [uH]\"."),
    click.option("--across", metavar="A-D", help="Where the meter sat, for a file of one hookup."),
    click.option("--tied", metavar="\"B-C ...\"", help="Leads joined by wire, for a file of one hookup."),
)  # fmt: skip

result_options = _stack(
    click.option("--coverage", type=click.FloatRange(0.5, 0.9999), default=0.95, show_default=True, metavar="P",
                 help="Coverage probability of the bounds."),
    click.option("--json", "as_json", is_flag=True, help="Print the result as JSON and nothing else."),
    click.option("--detail", is_flag=True,
                 help="Textbook formulas, uncertainty budget, values by frequency, inputs as well."),
)  # fmt: skip

headline_options = _stack(
    click.option("--at", type=QuantityType("Hz"), metavar="100kHz",
                 help="Frequency of the headline, where values change with it."),
    click.option("--point", "points", type=Assignment("gap=8 mm"), multiple=True, metavar="\"gap=8 mm\"",
                 help="Point of the headline, where several were set; repeat for each name."),
    click.option("--risk", type=click.FloatRange(0, 0.5, min_open=True), default=0.025, show_default=True, metavar="P",
                 help="Risk allowed in saying that a limit is met."),
)  # fmt: skip


@dataclass(frozen=True)
class Reading:
    """What the options say of how files are read."""

    windings: Sequence[tuple[str, tuple[str, str]]]
    settings: Sequence[tuple[str, str]]
    columns: Sequence[tuple[str, str]]
    across: str | None
    tied: str | None

    def overrides(self) -> Overrides:
        """The same for the reader."""
        from mutual.recording import Overrides

        return Overrides(
            windings=unique(self.windings, "--winding"),
            settings=unique(self.settings, "--set"),
            columns=unique(self.columns, "--column"),
            across=self.across,
            tied=self.tied,
        )

