"""Random devices, hookups and accuracies, and readings of them. Circuit truth comes from tests/loops.py alone."""

from __future__ import annotations

import sys
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))
import loops

from mutual.device import Device, Hookup, Winding
from mutual.recording.model import Accuracy, Recording, Row, Value

LETTERS = "ABCDEFGHIJKL"
FREQUENCY = 1e4
OMEGA = 2 * np.pi * FREQUENCY


@dataclass
class Bench:
    """One device with the readings taken of it.

    `common`, `each` and so on are standard deviations; `limit` says that errors are rectangular.
    """

    windings: list[tuple[str, str, str]]
    inductance: np.ndarray
    resistance: np.ndarray
    hookups: list[tuple[tuple[str, str], tuple[tuple[str, str], ...], tuple[str, str] | None]]
    columns: tuple[str, ...]
    sizes: dict[str, float]
    limit: bool
    split_unknown: bool
    repeats: int = 1
    method: str = ""
    frequency: float = FREQUENCY
    direct: list[float] = field(default_factory=list)

    @property
    def device(self) -> Device:
        """The same for the package."""
        return Device("drawn", tuple(Winding(*w) for w in self.windings))

    def impedance(
        self, hookup: Any, inductance: np.ndarray | None = None, resistance: np.ndarray | None = None
    ) -> complex:
        """Impedance, or transfer impedance where a voltage is sensed."""
        across, tied, sense = hookup
        case = {
            "windings": self.windings,
            "L": self.inductance if inductance is None else inductance,
            "R": self.resistance if resistance is None else resistance,
            "frequency": self.frequency,
            "across": across,
            "tied": tied,
            "sense": sense,
        }
        own, other = loops.solve(case)
        return own if other is None else other

    def coupling(self, i: int = 0, j: int = 1) -> float:
        """Signed k of two windings."""
        m = self.inductance
        return float(m[i, j] / np.sqrt(m[i, i] * m[j, j]))


def draw_windings(rng: np.random.Generator, n: int, coupling: float | None = None) -> tuple[np.ndarray, np.ndarray]:
    """Positive definite inductances (the first pair coupled as asked) and resistances with some shared loss."""
    while True:
        kappa = np.eye(n)
        for i in range(n):
            for j in range(i + 1, n):
                kappa[i, j] = kappa[j, i] = rng.uniform(-0.9, 0.9)
        if coupling is not None and n > 1:
            kappa[0, 1] = kappa[1, 0] = coupling
        if np.linalg.eigvalsh(kappa)[0] > 0.003 or (n == 2 and abs(kappa[0, 1]) < 1):
            break
    root = np.sqrt(10 ** rng.uniform(-5, -3, n))
    inductance = kappa * np.outer(root, root)
    quality = 10 ** rng.uniform(0.7, 2, n)
    own = OMEGA * root**2 / quality
    shared = rng.uniform(-0.08, 0.08, (n, n))
    resistance = (shared + shared.T) / 2 * np.sqrt(np.outer(own, own))
    np.fill_diagonal(resistance, own)
    return inductance, resistance


def hookups_of(n: int, method: str, rng: np.random.Generator) -> list[Any]:
    """Hookups of a method for the first two windings, or at random for all."""
    ends = [(LETTERS[2 * i], LETTERS[2 * i + 1]) for i in range(n)]
    (a, b), (c, d) = ends[0], ends[1]
    alone = [(e, (), None) for e in ends]
    series = [((a, d), ((b, c),), None), ((a, c), ((b, d),), None)]
    short = [((a, b), ((c, d),), None), ((c, d), ((a, b),), None)]
    parallel = [((a, b), ((a, c), (b, d)), None), ((a, b), ((a, d), (b, c)), None)]
    transfer = [((a, b), (), (c, d)), ((c, d), (), (a, b))]
    sets = {
        "series both ways": alone[:2] + series,
        "series one way": alone[:2] + series[:1],
        "open and short": alone[:1] + short[:1],
        "open and short, both sides": alone[:2] + short,
        "parallel": alone[:2] + parallel,
        "transfer": alone[:2] + transfer[:1],
    }
    if method in sets:
        return sets[method]
    pool = [*short, *parallel, *transfer]
    for i in range(n):
        for j in range(i + 1, n):
            (p, q), (r, s) = ends[i], ends[j]
            pool += [((p, s), ((q, r),), None), ((p, r), ((q, s),), None)]
    picked = rng.permutation(len(pool))[: rng.integers(2, min(len(pool), 8) + 1)]
    return alone + [pool[k] for k in picked]


def recording(bench: Bench, rng: np.random.Generator) -> Recording:
    """Read the bench: errors of each kind drawn once for what shares them."""

    def error(size: float) -> float:
        return float(rng.uniform(-1, 1) * size * np.sqrt(3) if bench.limit else rng.standard_normal() * size)

    s = bench.sizes
    common = complex(error(s["gain_common"]), error(s["phase_common"]))
    floor = {"H": error(s["floor_H"]), "ohm": error(s["floor_ohm"])}
    rows = []
    for across, tied, sense in bench.hookups:
        each = complex(error(s["gain_each"]), error(s["phase_each"]))
        z = bench.impedance((across, tied, sense)) * (1 + common + each)
        z += floor["ohm"] + 1j * OMEGA * floor["H"]
        for _ in range(bench.repeats):
            shown = {"inductance": z.imag / OMEGA, "resistance": z.real}
            values = {}
            for column in bench.columns:
                noise = s["noise_H"] if column == "inductance" else s["noise_ohm"]
                name = column if sense is None else f"transfer {column}"
                values[name] = Value(shown[column] + noise * float(rng.standard_normal()))
            rows.append(Row(len(rows) + 1, Hookup(across, tied, sense), None, bench.frequency, values))
    return Recording(bench.device, tuple(rows), instruments={"meter": accuracy(bench)})


def accuracy(bench: Bench) -> Accuracy:
    """What the data sheet would say."""
    s = bench.sizes
    factor = np.sqrt(3) if bench.limit else 1.0
    split: dict[str, float] = {}
    if bench.split_unknown:
        # Either all common or all each was drawn: the sheet gives one number.
        split = {k: factor * max(s[f"{k}_common"], s[f"{k}_each"]) for k in ("gain", "phase")}
    else:
        names = ("gain_common", "gain_each", "phase_common", "phase_each")
        split = {k: factor * s[k] for k in names}
    return Accuracy(
        "meter",
        floor={"H": factor * s["floor_H"], "ohm": factor * s["floor_ohm"]},
        noise={"H": s["noise_H"], "ohm": s["noise_ohm"]},
        stated_as="limit" if bench.limit else "standard",
        **split,
    )


def draw_sizes(rng: np.random.Generator, inductance: np.ndarray, resistance: np.ndarray) -> dict[str, float]:
    """Standard deviations of all errors."""
    smallest, least = float(np.diag(inductance).min()), float(np.diag(resistance).min())
    base = 10 ** rng.uniform(-3.7, -2.3)
    size = {k: base * 10 ** rng.uniform(-1, 0) for k in ("gain_common", "gain_each", "phase_common", "phase_each")}
    if rng.random() < 0.3:
        size["gain_common"] = 0.0
    return size | {
        "floor_H": base * smallest * rng.choice([0.0, 0.3]),
        "floor_ohm": base * least * rng.choice([0.0, 0.3]),
        "noise_H": base * smallest * rng.uniform(0.1, 0.5),
        "noise_ohm": base * least * rng.uniform(0.1, 0.5),
    }
