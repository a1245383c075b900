"""Reading errors drawn from a stated accuracy, and the text of a recording. Nothing here is shared with the package."""

from __future__ import annotations

import cmath
import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from netlists.scenario import Plots, Scenario, deflections, response

PREFIX = {"": 1.0, "n": 1e-9, "u": 1e-6, "m": 1e-3, "k": 1e3}
UNITS = ("ohm", "Hz", "H", "rad", "deg", "V", "A")
ORIGIN = "invented; impedances computed by a circuit simulator, reading errors drawn at random"


def quantity(text: str) -> tuple[float, str]:
    """Read `0.1 %`, `5 nH`, `0.05 deg`; relative numbers have the unit "1" and angles are in rad."""
    number, _, unit = text.partition(" ")
    if unit == "%":
        return float(number) / 100, "1"
    base = next(u for u in UNITS if unit.endswith(u))
    scale = PREFIX[unit.removesuffix(base)]
    return (math.radians(float(number) * scale), "rad") if base == "deg" else (float(number) * scale, base)


def unit_scale(unit: str) -> float:
    """SI value of one `unit` ("" for plain numbers)."""
    return 1.0 if unit == "" else quantity(f"1 {unit}")[0]


class Meter:
    """One instrument with the errors it happens to have.

    An impedance is shown as Z (1 + g + j p), to which the floor of that unit and the noise of that reading are added;
    limits are rectangular, noise is normal. What repeats of a hookup share is drawn once.
    """

    def __init__(self, accuracy: Mapping[str, str | list[str]], rng: np.random.Generator) -> None:
        self.rng = rng
        self.accuracy = accuracy
        self.each: dict[Any, tuple[float, float]] = {}
        self.common: dict[float, tuple[float, float]] = {}
        self.split = rng.random()
        self.floor = {unit: self._limit(value) for value, unit in self.listed("floor")}

    def listed(self, key: str) -> list[tuple[float, str]]:
        """The values of a key with their units, one or several."""
        said = self.accuracy.get(key, [])
        return [quantity(text) for text in ([said] if isinstance(said, str) else said)]

    def _limit(self, value: float) -> float:
        return float(self.rng.uniform(-value, value))

    def _drawn(self, share: str) -> tuple[float, float]:
        """One gain and one phase, of the part "common" or "each"; an unknown split is split at a random place."""
        part = self.split if share == "common" else 1 - self.split
        drawn = []
        for name in ("gain", "phase"):
            size = sum(v for v, _ in self.listed(f"{name}_{share}")) + part * sum(v for v, _ in self.listed(name))
            drawn.append(self._limit(size))
        return drawn[0], drawn[1]

    def shown(self, z: complex, hookup: Any, frequency: float) -> complex:
        """Z with gain and phase errors, ohm."""
        if frequency not in self.common:
            self.common[frequency] = self._drawn("common")
        if (hookup, frequency) not in self.each:
            self.each[hookup, frequency] = self._drawn("each")
        (g, p), (g_each, p_each) = self.common[frequency], self.each[hookup, frequency]
        return z * (1 + g + g_each + 1j * (p + p_each))

    def read(self, value: float, unit: str) -> float:
        """A value with floor and noise, in the unit that was stated ("H", "ohm", "rad")."""
        noise = sum(sigma for sigma, u in self.listed("noise") if u == unit)
        return value + self.floor.get(unit, 0.0) + noise * float(self.rng.standard_normal())


def values(
    quantities: tuple[str, ...], z: complex, sensed: complex | None, omega: float, meter: Meter
) -> dict[str, float]:
    """What the columns show, SI units (phase in rad), from impedances that already have gain and phase errors."""
    shown: dict[str, float] = {}
    for name in quantities:
        if name == "inductance":
            shown[name] = meter.read(z.imag / omega, "H")
        elif name == "resistance":
            shown[name] = meter.read(z.real, "ohm")
        elif name == "quality":
            shown[name] = z.imag / z.real
        elif name == "dissipation":
            shown[name] = z.real / z.imag
        elif name == "impedance":
            shown[name] = meter.read(abs(z), "ohm")
        elif name == "phase":
            shown[name] = meter.read(cmath.phase(z), "rad")
        elif name == "transfer inductance" and sensed is not None:
            shown[name] = meter.read(sensed.imag / omega, "H")
        elif name == "transfer resistance" and sensed is not None:
            shown[name] = meter.read(sensed.real, "ohm")
        else:
            raise ValueError(f"{name} cannot be read here")
    return shown


def recording_text(scenario: Scenario, plots: Plots) -> str:
    """The recording as it ships: preface, header and rows."""
    rng = np.random.default_rng(scenario.seed)
    meters = {name: Meter(accuracy, rng) for name, accuracy in scenario.instruments.items()}
    kicks = any(r.quantities == ("kick",) for r in scenario.readings)
    used = {
        "tied": any(r.tied for r in scenario.readings),
        "sense": any(r.sense for r in scenario.readings),
        "instrument": any(r.instrument for r in scenario.readings),
    }
    head = ["across", *(c for c in ("tied", "sense") if used[c]), "frequency [Hz]"]
    head += [f"{name} [{unit}]" if unit else name for name, (unit, _) in scenario.columns.items()]
    head += ["kick on make", "kick on break"] * kicks + ["instrument"] * used["instrument"]
    rows = []
    for number, reading in enumerate(scenario.readings, 1):
        for _ in range(reading.repeats):
            cells = {"across": reading.across, "tied": reading.tied, "sense": reading.sense}
            cells["instrument"] = reading.instrument
            if reading.quantities == ("kick",):
                cells["kick on make"], cells["kick on break"] = deflections(scenario, number, plots)
            else:
                cells |= _cells(scenario, number, plots, meters[reading.instrument or "meter"])
            rows.append(",".join(cells.get(column, "") for column in head))
    return "\n".join([*preface(scenario), ",".join(head), *rows, ""])


def _cells(scenario: Scenario, number: int, plots: Plots, meter: Meter) -> dict[str, str]:
    """The printed values of one row."""
    reading = scenario.readings[number - 1]
    frequency = scenario.frequency if reading.frequency is None else reading.frequency
    z, sensed = (None if v is None else meter.shown(v, number, frequency) for v in response(scenario, number, plots))
    assert z is not None
    cells = {"frequency [Hz]": f"{frequency:.0f}"}
    for name, value in values(reading.quantities, z, sensed, 2 * math.pi * frequency, meter).items():
        unit, decimals = scenario.columns[name]
        cells[f"{name} [{unit}]" if unit else name] = f"{value / unit_scale(unit):.{decimals}f}"
    return cells


def preface(scenario: Scenario) -> list[str]:
    """The lines before the header."""
    lines = ['format = "mutual-recording-1"', 'kind = "readings"', f'device = "{scenario.device}"']
    if scenario.arrangement:
        lines.append(f'arrangement = "{scenario.arrangement}"')
    lines += ["[windings]", *(f'{name} = ["{a}", "{b}"]' for name, a, b in scenario.windings)]
    for table, accuracy in scenario.instruments.items():
        lines.append(f"[{table}]")
        for key, said in accuracy.items():
            text = f'"{said}"' if isinstance(said, str) else "[" + ", ".join(f'"{s}"' for s in said) + "]"
            lines.append(f"{key} = {text}")
    notes = {"origin": ORIGIN, "story": scenario.story, **scenario.notes}
    lines += ["[notes]", *(f'{key} = "{text}"' for key, text in notes.items())]
    return [f"# {line}" for line in lines]
