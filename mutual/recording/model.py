"""What a recording holds once it is read: plain frozen values, SI units throughout."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from mutual.device import Device, Hookup
from mutual.result import Finding, Input

if TYPE_CHECKING:
    import pandas


@dataclass(frozen=True)
class Value:
    """A number as it was read.

    Attributes
    ----------
    value : float
        SI units (ohm, H, Hz, V, A, rad for phase; Q and D plain).
    step : float or None
        Size of the last printed digit in the same unit; None for numbers that have none.
    """

    value: float
    step: float | None = None


@dataclass(frozen=True)
class Accuracy:
    """Stated accuracy of one instrument (interface contract, section 2.1). Relative numbers and radians.

    `floor`, `noise` and `resolution` map a unit ("H", "ohm", "V", "A", "Hz", "F", "1", "rad") to a number.
    `stated` says whether any error was stated at all.
    """

    name: str
    gain_common: float | None = None
    gain_each: float | None = None
    gain: float | None = None
    phase_common: float | None = None
    phase_each: float | None = None
    phase: float | None = None
    floor: Mapping[str, float] = field(default_factory=dict)
    counts: float | None = None
    noise: Mapping[str, float] = field(default_factory=dict)
    resolution: Mapping[str, float] = field(default_factory=dict)
    shunt_floor: float | None = None
    low_q_factor: str | None = None
    input_resistance: float | None = None
    stated_as: str = "limit"

    @property
    def stated(self) -> bool:
        """Whether anything but the resolution was stated."""
        numbers = (
            self.gain_common, self.gain_each, self.gain, self.phase_common, self.phase_each, self.phase,
            self.counts, self.shunt_floor,
        )  # fmt: skip
        return any(n is not None for n in numbers) or bool(self.floor) or bool(self.noise)


@dataclass(frozen=True)
class KickTable:
    """Chances of being wrong in a kick test."""

    misread: float = 0.1
    reversed: float = 0.0001


@dataclass(frozen=True)
class Row:
    """One row of readings.

    Attributes
    ----------
    number : int
        Counted from 1, the header not counted.
    line : int or None
        Line of the file.
    hookup : Hookup
    frequency : float or None
        Hz; 0 for direct current; None where it was left out.
    values : mapping of column name (section 2.1, without unit) to Value
    kicks : mapping of "kick on make" / "kick on break" to "+", "-" or "0"
    instrument : str or None
    conditions : mapping; any of "temperature" (degC), "level" (float), "range" (str)
    point : mapping of NAME to SI value or text
    """

    number: int
    hookup: Hookup
    line: int | None = None
    frequency: float | None = None
    values: Mapping[str, Value] = field(default_factory=dict)
    kicks: Mapping[str, str] = field(default_factory=dict)
    instrument: str | None = None
    conditions: Mapping[str, Any] = field(default_factory=dict)
    point: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class LimitSpec:
    """A line of `[limits]`, in SI units."""

    quantity: str
    lower: float | None = None
    upper: float | None = None


@dataclass(frozen=True)
class Recording:
    """One file of readings with everything needed to evaluate it again."""

    device: Device
    rows: tuple[Row, ...] = ()
    kind: str = "readings"
    instruments: Mapping[str, Accuracy] = field(default_factory=dict)
    kick: KickTable = KickTable()
    limits: tuple[LimitSpec, ...] = ()
    findings: tuple[Finding, ...] = ()
    source: Input | None = None

    @classmethod
    def from_readings(cls, frame: pandas.DataFrame, windings: Mapping[str, Sequence[str]], **tables: Any) -> Recording:
        """Build a recording of readings from a DataFrame, with no file.

        Parameters
        ----------
        frame : pandas.DataFrame
            Columns named as in a file (interface contract, section 2.1), such as "inductance [uH]".
        windings : mapping of name to (first lead, second lead)
        **tables
            The preface's tables and keys, such as `meter={"gain_common": "0.1 %"}`.

        Raises
        ------
        RefusedInput
            As for a file; `row` counts from 1.
        """
        from mutual.recording.reader import from_readings

        return from_readings(frame, windings, **tables)

    @property
    def file(self) -> str:
        """Name to use in messages."""
        return self.source.file if self.source is not None else "(in memory)"

    def where(self, row: Row) -> str:
        """How messages name a row: `a.csv row 4`."""
        return f"{self.file} row {row.number}"
