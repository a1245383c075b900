"""A described device: what its windings are, and what is to be read of it (format `mutual-device-1`)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual.device import Device, Hookup
from mutual.errors import RefusedInput
from mutual.recording.model import Accuracy, KickTable, LimitSpec

Real = NDArray[np.float64]

FORMAT = "mutual-device-1"
# Couplings typed with three digits may miss an ideal device by their last digit, not by more.
ROUNDING = 1e-9


@dataclass(frozen=True)
class Table:
    """A value by frequency: straight lines between the frequencies given, constant beyond them.

    Attributes
    ----------
    frequencies : tuple of float
        Hz, rising; a single 0 for a value that holds at all.
    values : tuple of float
        SI units.
    """

    frequencies: tuple[float, ...]
    values: tuple[float, ...]

    def at(self, frequency: float) -> float:
        """The value at a frequency in Hz."""
        return float(np.interp(frequency, self.frequencies, self.values))


NOTHING = Table((0.0,), (0.0,))


@dataclass(frozen=True)
class Planned:
    """One line of what is to be read.

    Attributes
    ----------
    hookup : Hookup
    quantities : tuple of str
        Columns of readings.
    frequencies : tuple of float or None
        Hz; None where the quantities need none.
    repeats : int
    instrument : str or None
    """

    hookup: Hookup
    quantities: tuple[str, ...]
    frequencies: tuple[float | None, ...] = (None,)
    repeats: int = 1
    instrument: str | None = None


@dataclass(frozen=True)
class Described:
    """A device as designed, with the accuracy of what will read it.

    Attributes
    ----------
    device : Device
    inductance, resistance : tuple of Table
        By winding, in their order; H and ohm.
    coupling, mutual_resistance : mapping of (int, int) to Table
        By numbers of windings, the lower first; signed, for the first leads. Missing pairs have none.
    instruments : mapping of name to Accuracy
    readings : tuple of Planned
    """

    device: Device
    inductance: tuple[Table, ...]
    resistance: tuple[Table, ...]
    coupling: Mapping[tuple[int, int], Table] = field(default_factory=dict)
    mutual_resistance: Mapping[tuple[int, int], Table] = field(default_factory=dict)
    instruments: Mapping[str, Accuracy] = field(default_factory=dict)
    readings: tuple[Planned, ...] = ()
    kick: KickTable = field(default_factory=KickTable)
    limits: tuple[LimitSpec, ...] = ()

    def inductances(self, frequency: float) -> Real:
        """Inductance matrix (n, n) in H at a frequency in Hz."""
        own = np.array([table.at(frequency) for table in self.inductance])
        matrix = np.diag(own)
        for (i, j), table in self.coupling.items():
            matrix[i, j] = matrix[j, i] = table.at(frequency) * np.sqrt(own[i] * own[j])
        return matrix

    def resistances(self, frequency: float) -> Real:
        """Resistance matrix (n, n) in ohm at a frequency in Hz; windings share no loss at direct current."""
        matrix = np.diag([table.at(frequency) for table in self.resistance])
        for (i, j), table in self.mutual_resistance.items():
            matrix[i, j] = matrix[j, i] = table.at(frequency) if frequency > 0 else 0.0
        return matrix

    def check_passive(self) -> None:
        """Refuse a device that could give out energy.

        Raises
        ------
        RefusedInput
            The inductance or resistance matrix is not positive semidefinite at some frequency in use; `found` names
            the smallest set of windings that shows it.
        """
        tables = [*self.inductance, *self.resistance, *self.coupling.values(), *self.mutual_resistance.values()]
        frequencies = {f for table in tables for f in table.frequencies}
        frequencies |= {f for planned in self.readings for f in planned.frequencies if f is not None}
        for frequency in sorted(frequencies):
            for column, matrix in (
                ("coupling", self.inductances(frequency)),
                ("mutual_resistance", self.resistances(frequency)),
            ):
                self._refuse_active(column, matrix, frequency)

    def _refuse_active(self, column: str, matrix: Real, frequency: float) -> None:
        own = np.sqrt(np.diag(matrix))
        size = np.outer(own, own)
        ratio = np.divide(matrix, size, out=np.where(matrix == 0, 0.0, np.inf), where=size > 0)
        np.fill_diagonal(ratio, 1.0)
        for count in range(2, len(own) + 1):
            for chosen in combinations(range(len(own)), count):
                part = ratio[np.ix_(chosen, chosen)]
                if np.all(np.isfinite(part)) and np.linalg.eigvalsh(part)[0] >= -ROUNDING:
                    continue
                names = " ".join(self.device.windings[i].name for i in chosen)
                raise RefusedInput(
                    "the device is not passive: these windings could give out energy",
                    column=column,
                    found=self._amount(column, chosen, frequency) if count == 2 else names,
                    expected=_expected(column, count),
                )

    def _amount(self, column: str, chosen: tuple[int, ...], frequency: float) -> str:
        i, j = chosen
        names = f"{self.device.windings[i].name} {self.device.windings[j].name}"
        table = (self.coupling if column == "coupling" else self.mutual_resistance).get((i, j), NOTHING)
        return f"{names} = {table.at(frequency):.6g}" + (f" at {frequency:g} Hz" if frequency > 0 else "")


def _expected(column: str, count: int) -> str:
    if count > 2:
        return "couplings that go together, as between 1 and -1 they need not: the matrix must be positive semidefinite"
    return "a coupling from -1 to 1" if column == "coupling" else "at most sqrt(R1 R2) in ohm"
