"""What an invented recording is made of, its netlist, and what ngspice's answer says of each row."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from netlists import netlist
from ngspice import on_grid, run

MAKE_AT, BREAK_AT = 1e-3, 6e-3
GRID = np.arange(41) * 0.25e-3
Plots = Mapping[str, Mapping[str, np.ndarray]]


@dataclass(frozen=True)
class Reading:
    """One row, written `repeats` times.

    Attributes
    ----------
    across, tied, sense : str
        As in a recording: `A-B`, `B-C D-E`, `C-D`.
    quantities : tuple of str
        Columns that are read; `kick` stands for a battery made and broken.
    frequency : float or None
        Hz, 0 for direct current; None for the scenario's own.
    taken : (str, str) or None
        `across` and `tied` as they really were, where a slip is part of the story.
    """

    across: str
    tied: str = ""
    sense: str = ""
    quantities: tuple[str, ...] = ()
    frequency: float | None = None
    repeats: int = 1
    instrument: str = ""
    taken: tuple[str, str] | None = None


@dataclass(frozen=True)
class Scenario:
    """An invented device, the instruments and the readings.

    Attributes
    ----------
    inductance : n x n
        H, signed for the first leads; the truth at every frequency.
    resistance, direct : n x n
        ohm, at `frequency` and at 0 Hz.
    columns : dict of column name to (unit, decimals)
        How values are printed.
    instruments : dict of table name to dict of key to text or list of text
    """

    name: str
    device: str
    story: str
    windings: tuple[tuple[str, str, str], ...]
    frequency: float
    inductance: Sequence[Sequence[float]]
    resistance: Sequence[Sequence[float]]
    columns: Mapping[str, tuple[str, int]]
    instruments: Mapping[str, Mapping[str, str | list[str]]]
    readings: tuple[Reading, ...]
    seed: int
    direct: Sequence[Sequence[float]] | None = None
    arrangement: str = ""
    notes: Mapping[str, str] = field(default_factory=dict)

    def case(self, reading: Reading) -> dict[str, Any]:
        """The hookup as it really was, with the device at that frequency, as plain data."""
        across, tied = reading.taken or (reading.across, reading.tied)
        frequency = self.frequency if reading.frequency is None else reading.frequency
        return {
            "windings": [list(w) for w in self.windings],
            "L": [list(row) for row in self.inductance],
            "R": [list(row) for row in (self.direct if frequency == 0 and self.direct else self.resistance)],
            "frequency": frequency,
            "across": across.split("-"),
            "tied": [pair.split("-") for pair in tied.split()],
            "sense": reading.sense.split("-") if reading.sense else None,
        }


def netlist_text(scenario: Scenario) -> str:
    """The device as a subcircuit, then one copy of it for every hookup, kicks apart."""
    cases = [(f"h{i}", scenario.case(r)) for i, r in enumerate(scenario.readings, 1) if r.quantities != ("kick",)]
    lines = [f"* {scenario.name}: {scenario.device} (invented); 1 A into every hookup"]
    direct = any(case["frequency"] == 0 for _, case in cases)
    for name, frequency in [("device", scenario.frequency), *([("device_dc", 0.0)] if direct else [])]:
        lines += netlist.subcircuit(name, next(case for _, case in cases if case["frequency"] == frequency))
    for copy, case in cases:
        lines.append(f"* {copy}: {netlist.describe(case)}" + (" (direct current)" if case["frequency"] == 0 else ""))
        lines += netlist.driven("device_dc" if case["frequency"] == 0 else "device", case, case, copy)
    lines += [".op"] if direct else []
    return "\n".join([*lines, f".ac lin 1 {scenario.frequency!r} {scenario.frequency!r}", ".end", ""])


def kick_netlist_text(scenario: Scenario) -> str | None:
    """The kicks of a scenario in time: 1.5 V behind 15 ohm, made at 1 ms and gone at 6 ms; a 10 kohm meter on `sense`.

    The break is the battery's voltage falling to nil behind the same resistor; an arc would change the size of the
    deflection, not its sign.
    """
    kicks = [(f"h{i}", scenario.case(r)) for i, r in enumerate(scenario.readings, 1) if r.quantities == ("kick",)]
    if not kicks:
        return None
    lines = [f"* {scenario.name}: {scenario.device} (invented); kicks by a battery, direct-current resistances"]
    lines += netlist.subcircuit("device", {**kicks[0][1], "R": scenario.direct or scenario.resistance})
    for copy, case in kicks:
        node = netlist.nodes(case, case, copy)
        plus, minus = (node[lead] for lead in case["across"])
        high, low = (node[lead] for lead in case["sense"])
        pulse = f"0 0 {MAKE_AT!r} 0 {MAKE_AT + 1e-5!r} 1.5 {BREAK_AT!r} 1.5 {BREAK_AT + 1e-5!r} 0"
        lines += [
            f"* {copy}: battery {netlist.describe(case)}",
            f"X{copy} " + " ".join(node[lead] for lead in netlist.leads(case)) + " device",
            f"V{copy} {copy}_battery {minus} PWL({pulse})",
            f"R{copy} {copy}_battery {plus} 15",
            f"Rmeter{copy} {high} {low} 10k",
            f".save v({high})",
        ]
    return "\n".join([*lines, ".tran 1u 10m 0 1u", ".end", ""])


def solve(text: str) -> dict[str, dict[str, np.ndarray]]:
    """ngspice's answer to a netlist, transients on a fixed grid."""
    plots = run(text)
    return {kind: on_grid(vectors, GRID) if kind == "tran" else vectors for kind, vectors in plots.items()}


def dumps(plots: Plots) -> str:
    """ngspice's answer as text, 17 significant digits."""
    lines = ["analysis,point,vector,real,imaginary"]
    for kind, vectors in sorted(plots.items()):
        for name, values in sorted(vectors.items()):
            for point, value in enumerate(values):
                lines.append(f"{kind},{point},{name},{value.real:.16e},{value.imag:.16e}")
    return "\n".join([*lines, ""])


def loads(text: str) -> dict[str, dict[str, np.ndarray]]:
    """The inverse of `dumps`; all vectors complex."""
    found: dict[str, dict[str, list[complex]]] = {}
    for line in text.splitlines()[1:]:
        kind, point, name, real, imaginary = line.split(",")
        values = found.setdefault(kind, {}).setdefault(name, [])
        if int(point) != len(values):
            raise ValueError(f"points out of order: {line}")
        values.append(complex(float(real), float(imaginary)))
    return {kind: {name: np.array(v) for name, v in vectors.items()} for kind, vectors in found.items()}


def difference(first: Plots, second: Plots) -> float:
    """Largest relative difference: of each number for `ac` and `op`, of each vector's largest value for `tran`."""
    if {k: set(v) for k, v in first.items()} != {k: set(v) for k, v in second.items()}:
        return np.inf
    worst = 0.0
    for kind, vectors in first.items():
        for name, values in vectors.items():
            other = second[kind][name]
            if values.shape != other.shape:
                return np.inf
            size = np.abs(other) if kind != "tran" else np.max(np.abs(other))
            worst = max(worst, float(np.max(np.abs(values - other) / size)))
    return worst


def response(scenario: Scenario, number: int, plots: Plots) -> tuple[complex, complex | None]:
    """Impedance and transfer impedance (None without `sense`) of reading `number` (from 1), ohm."""
    case = scenario.case(scenario.readings[number - 1])
    vectors = plots["op" if case["frequency"] == 0 else "ac"]
    across, sensed = (
        None if pair is None else netlist.voltage(vectors, case, case, f"h{number}", pair)
        for pair in (case["across"], case["sense"])
    )
    assert across is not None
    return across, sensed


def deflections(scenario: Scenario, number: int, plots: Plots) -> tuple[str, str]:
    """Signs of the sensed voltage just after make and just after break."""
    case = scenario.case(scenario.readings[number - 1])
    high = netlist.nodes(case, case, f"h{number}")[case["sense"][0]]
    vectors = plots["tran"]
    time, volts = vectors["time"].real, vectors[f"v({high})".lower()].real
    signs = []
    for begin, end in ((MAKE_AT, BREAK_AT), (BREAK_AT, np.inf)):
        after = volts[(time > begin) & (time < end)]
        # What stays (a battery across the meter itself) is not the kick: only what dies away is.
        kick = after - after[-1]
        signs.append("+" if kick[np.argmax(np.abs(kick))] > 0 else "-")
    return signs[0], signs[1]
