"""Random devices read in random hookups, with one slip. Nothing here shares code with the package but its data classes.

Circuit truth comes from tests/loops.py. What a set of readings leaves over to test with is counted here as well,
from the currents of that solver: singular values of the whitened sensitivities, as the package defines them.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))
import loops

from mutual.device import Device, Hookup, Winding
from mutual.recording.model import Accuracy, Recording, Row, Value

LETTERS = "ABCDEFGHIJKL"
DIGITS = 5
KINDS = (
    "ties exchanged",
    "leads swapped",
    "prefix",
    "winding shorted",
    "tie left open",
    "coil moved",
    "coil moved, from then on",
    "parallel for series",
    "parallel for series, all rows",
    "typed in two rows",
)


@dataclass(frozen=True)
class Bench:
    """A device and a meter. `sizes` are limits (gains, phases, floors) and standard deviations (noise)."""

    windings: list[tuple[str, str, str]]
    inductance: np.ndarray
    resistance: np.ndarray
    frequency: float
    second: str | None
    sizes: dict[str, float]

    @property
    def omega(self) -> float:
        return 2 * np.pi * self.frequency

    @property
    def device(self) -> Device:
        return Device("drawn", tuple(Winding(*w) for w in self.windings))

    def case(self, hookup: Hookup, inductance: np.ndarray | None = None) -> dict[str, Any]:
        """The hookup for the independent solver."""
        return {
            "windings": self.windings,
            "L": self.inductance if inductance is None else inductance,
            "R": self.resistance,
            "frequency": self.frequency,
            "across": hookup.across,
            "tied": hookup.tied,
            "sense": hookup.sense,
        }

    def impedance(self, hookup: Hookup, inductance: np.ndarray | None = None) -> complex:
        """Impedance, or transfer impedance where a voltage is sensed."""
        own, other = loops.solve(self.case(hookup, inductance))
        return own if other is None else other

    def same_circuit(self, a: Hookup, b: Hookup) -> bool:
        """Whether two hookups show the same."""
        one, two = self.impedance(a), self.impedance(b)
        return abs(one - two) <= 1e-9 * max(abs(one), abs(two))


@dataclass(frozen=True)
class Read:
    """One row: the hookup as written down, as it was, and the columns that were read."""

    written: Hookup
    was: Hookup
    columns: tuple[str, ...]
    inductance: np.ndarray | None = None
    parallel: bool = False


@dataclass(frozen=True)
class Slipped:
    """Readings with one slip. `row` counts from 0; `was` is the hookup it truly had; `column`, `factor` of a prefix."""

    kind: str
    bench: Bench
    recording: Recording
    spare: int
    row: int
    was: Hookup | None = None
    column: str | None = None
    factor: float = 1.0
    rows: list[Read] = field(default_factory=list)


def draw(kind: str, spare: int, seed: tuple[int, ...]) -> Slipped:
    """One set with a slip of a kind and about `spare` values left over (1, 2; 3 stands for 3 to 6)."""
    rng = np.random.default_rng(seed)
    while True:
        bench = _bench(rng, kind.startswith("parallel for"))
        reads, left = _reads(bench, rng, spare)
        if reads is None:
            continue
        bench = _without_unseen_loss(bench, reads)
        found = _slip(kind, bench, reads, rng)
        if found is None:
            continue
        recording = _record(bench, found.rows, rng)
        recording = _mistype(found, recording, rng)
        if recording is not None:
            return replace(found, recording=recording, spare=left)


def _bench(rng: np.random.Generator, low_q: bool) -> Bench:
    n = int(rng.choice([2, 3, 4], p=[0.5, 0.3, 0.2]))
    names = list(LETTERS[: 2 * n])
    ends = [[names[2 * i], names[2 * i + 1]] for i in range(n)]
    if rng.random() < 0.3:
        # A tap or a star point: the second winding begins where the first ends, or where it begins.
        ends[1][0] = ends[0][int(rng.integers(2))]
    windings = [(f"w{i + 1}", *pair) for i, pair in enumerate(ends)]
    while True:
        kappa = np.eye(n)
        for i, j in zip(*np.triu_indices(n, 1), strict=True):
            kappa[i, j] = kappa[j, i] = rng.uniform(0.05, 0.98) * rng.choice([-1, 1])
        if np.linalg.eigvalsh(kappa)[0] > 0.01:
            break
    root = np.sqrt(10 ** rng.uniform(-6, -2) * 10 ** rng.uniform(-0.5, 0.5, n))
    frequency = float(rng.choice([100.0, 1e3, 1e4, 1e5]))
    quality = 10 ** (rng.uniform(-0.1, 0.8, n) if low_q else rng.uniform(1, 2.3, n))
    second = str(rng.choice(["resistance", "quality"])) if low_q or rng.random() < 0.6 else None
    own = 2 * np.pi * frequency * root**2 / quality
    part = rng.uniform(-0.08, 0.08, (n, n)) if second else np.zeros((n, n))
    resistance = (part + part.T) / 2 * np.sqrt(np.outer(own, own))
    np.fill_diagonal(resistance, own)
    typical = float(np.exp(np.mean(np.log(root**2))))
    gain = 10 ** rng.uniform(-4, -2.5)
    phase = 10 ** rng.uniform(-4, -2.7)
    sizes = {
        "gain_common": gain,
        "gain_each": 10 ** rng.uniform(-4, -3),
        "phase_common": phase,
        "phase_each": phase * rng.uniform(0.1, 1),
        "floor_H": typical * 10 ** rng.uniform(-5, -3.7),
        "floor_ohm": float(own.min()) * 10 ** rng.uniform(-4, -2.5),
        "noise_H": typical * 10 ** rng.uniform(-5, -3.7),
        "noise_ohm": float(own.min()) * 10 ** rng.uniform(-4, -2.5),
        "noise_1": float(quality.min()) * 10 ** rng.uniform(-4, -3),
    }
    return Bench(windings, kappa * np.outer(root, root), resistance, frequency, second, sizes)


def _valid(bench: Bench, hookup: Hookup) -> bool:
    """Whether the meter sees a circuit: neither shorted nor open."""
    if any(a == b for a, b in (hookup.across, *hookup.tied)) or (hookup.sense and hookup.sense[0] == hookup.sense[1]):
        return False
    try:
        z = bench.impedance(hookup)
    except (ValueError, np.linalg.LinAlgError):
        return False
    return abs(z) > 1e-6 * bench.omega * float(np.diag(bench.inductance).min())


def _pool(bench: Bench) -> list[Hookup]:
    """Hookups that people use, other than single windings."""
    ends = [(a, b) for _, a, b in bench.windings]
    found = []
    for i, (a, b) in enumerate(ends):
        for j, (c, d) in enumerate(ends):
            if i != j:
                found += [Hookup((a, b), ((c, d),)), Hookup((a, b), (), (c, d))]
            if i < j:
                found += [Hookup((a, d), ((b, c),)), Hookup((a, c), ((b, d),))]
                found += [Hookup((a, b), ((a, c), (b, d))), Hookup((a, b), ((a, d), (b, c)))]
                if len({a, b, c, d}) == 3:
                    (shared,) = {a, b} & {c, d}
                    (x,), (y,) = {a, b} - {shared}, {c, d} - {shared}
                    found += [Hookup((x, y)), Hookup((a, b), ((x, y),))]
                rest = [e for k, e in enumerate(ends) if k not in (i, j)]
                if rest:
                    e, f = rest[0]
                    found += [Hookup((a, f), ((b, c), (d, e))), Hookup((a, d), ((b, c), (e, f)))]
    return [h for h in found if _valid(bench, h)]


def _sensitivities(bench: Bench, hookup: Hookup) -> tuple[complex, np.ndarray]:
    """Impedance and its derivatives by the upper triangle of the impedance matrix (Tellegen)."""
    across, sense, around = loops.paths(bench.case(hookup))
    drive = loops.currents(bench.case(hookup), across, around)
    other = drive if sense is None else loops.currents(bench.case(hookup), sense, around)
    z = loops.impedances(bench.case(hookup))
    first, second = np.triu_indices(len(z))
    direct = drive[first] * other[second]
    return other @ z @ drive, np.where(first == second, direct, direct + drive[second] * other[first])


def left_over(bench: Bench, reads: list[Read]) -> tuple[int, int]:
    """Values less the directions that they determine, and the directions left open."""
    s, omega = bench.sizes, bench.omega
    own = np.diag(bench.inductance)
    first, second = np.triu_indices(len(own))
    size_l = np.sqrt(own[first] * own[second])
    lossy = np.maximum(np.diag(bench.resistance), 0.1 * omega * own)
    if bench.second:
        size_r = np.sqrt(lossy[first] * lossy[second])
    else:
        # The unknown is the square of a winding's own resistance; no loss is shared.
        size_r = np.where(first == second, (omega * own[first]) ** 2 / (2 * np.diag(bench.resistance)[first]), 0.0)
    rows = []
    for read in reads:
        z, by = _sensitivities(bench, read.written)
        for column in read.columns:
            g, p = np.hypot(s["gain_common"], s["gain_each"]), np.hypot(s["phase_common"], s["phase_each"])
            if column.endswith("inductance"):
                slope = np.concatenate([by.real * size_l, by.imag / omega * size_r])
                sigma = np.hypot(np.hypot(g * z.imag, p * z.real) / omega / 1.7, s["noise_H"] + s["floor_H"] / 1.7)
            elif column.endswith("resistance"):
                slope = np.concatenate([-omega * by.imag * size_l, by.real * size_r])
                sigma = np.hypot(np.hypot(g * z.real, p * z.imag) / 1.7, s["noise_ohm"] + s["floor_ohm"] / 1.7)
            else:
                every = np.concatenate([1j * omega * by * size_l, by * size_r])
                slope = every.real / z.imag - every.imag * z.real / z.imag**2
                sigma = np.hypot(p / 1.7 * abs(z / z.imag) ** 2, s["noise_1"] * (z.real / z.imag) ** 2)
            rows.append(slope / sigma)
    values = np.linalg.svd(np.array(rows), compute_uv=False)
    rank = int(np.sum(values > 1 / 30))
    return len(rows) - rank, rank


def _without_unseen_loss(bench: Bench, reads: list[Read]) -> Bench:
    """The same with no shared loss, unless the readings determine all of it."""
    n = len(bench.windings)
    if left_over(bench, reads)[1] == n * (n + 1):
        return bench
    return replace(bench, resistance=np.diag(np.diag(bench.resistance)))


def _reads(bench: Bench, rng: np.random.Generator, spare: int) -> tuple[list[Read] | None, int]:
    """Single windings, then random hookups until all is determined that can be, and as much left over as wanted."""
    pool = _pool(bench)
    order = [pool[k] for k in rng.permutation(len(pool))]
    reads = [_with_columns(bench, Hookup((a, b)), rng) for _, a, b in bench.windings]
    whole = left_over(bench, [_full(bench, h) for h in [r.written for r in reads] + order])[1]
    limit = 2 if spare == 1 else 3 if spare == 2 else 7
    left, rank = left_over(bench, reads)
    rest = []
    for hookup in order:
        more = [*reads, _with_columns(bench, hookup, rng)]
        new_left, new_rank = left_over(bench, more)
        if new_rank > rank and new_left < limit:
            reads, left, rank = more, new_left, new_rank
        else:
            rest.append(hookup)
    if rng.random() < 0.3:
        rest.insert(0, reads[int(rng.integers(len(reads)))].written)  # a repeat
    for hookup in rest:
        if left >= spare:
            break
        more = [*reads, _with_columns(bench, hookup, rng)]
        new_left, rank = left_over(bench, more)
        if left < new_left < limit:
            reads, left = more, new_left
    good = spare <= left < limit and rank >= whole - (0 if bench.second is None else 2)
    return (reads if good else None), left


def _full(bench: Bench, hookup: Hookup) -> Read:
    names = ["inductance"]
    if bench.second == "resistance" or (bench.second and hookup.sense):
        names.append("resistance")
    elif bench.second:
        names.append("quality")
    columns = tuple(f"transfer {name}" if hookup.sense else name for name in names)
    return Read(hookup, hookup, columns)


def _with_columns(bench: Bench, hookup: Hookup, rng: np.random.Generator) -> Read:
    read = _full(bench, hookup)
    return replace(read, columns=read.columns[:1]) if rng.random() < 0.2 else read


def _slip(kind: str, bench: Bench, reads: list[Read], rng: np.random.Generator) -> Slipped | None:
    """Make the slip in a row where it can be made; None where there is none."""
    found = Slipped(kind, bench, Recording(bench.device), 0, -1, rows=list(reads))
    rows = [int(k) for k in rng.permutation(len(reads))]
    hooked = {
        "ties exchanged": _exchanged,
        "leads swapped": _swapped,
        "winding shorted": _shorted,
        "tie left open": _opened,
    }
    if kind in hooked:
        for row in rows:
            every = [h for h in hooked[kind](bench, reads[row].written) if _valid(bench, h)]
            every = [h for h in every if not bench.same_circuit(h, reads[row].written)]
            if every:
                was = every[int(rng.integers(len(every)))]
                found.rows[row] = replace(reads[row], was=was)
                return replace(found, row=row, was=was)
        return None
    if kind.startswith("coil moved"):
        return _moved(found, bench, rows, rng)
    if kind.startswith("parallel for series"):
        return _parallel(found, rows)
    row = rows[0]
    if kind == "prefix":
        column = str(rng.choice(reads[row].columns))
        if column == "quality":
            return None
        return replace(found, row=row, column=column, factor=float(rng.choice([1e3, 1e-3])))
    return replace(found, row=row)


def _exchanged(bench: Bench, hookup: Hookup) -> Iterator[Hookup]:
    if len(hookup.tied) == 2:
        (p, q), (r, s) = hookup.tied
        yield replace(hookup, tied=((p, s), (r, q)))
        yield replace(hookup, tied=((p, r), (q, s)))


def _swapped(bench: Bench, hookup: Hookup) -> Iterator[Hookup]:
    def turned(pair: tuple[str, str], a: str, b: str) -> tuple[str, str]:
        turn = {a: b, b: a}
        return turn.get(pair[0], pair[0]), turn.get(pair[1], pair[1])

    for _, a, b in bench.windings:
        sense = None if hookup.sense is None else turned(hookup.sense, a, b)
        yield Hookup(turned(hookup.across, a, b), tuple(turned(t, a, b) for t in hookup.tied), sense)


def _shorted(bench: Bench, hookup: Hookup) -> Iterator[Hookup]:
    for _, a, b in bench.windings:
        yield replace(hookup, tied=(*hookup.tied, (a, b)))


def _opened(bench: Bench, hookup: Hookup) -> Iterator[Hookup]:
    for k in range(len(hookup.tied)):
        yield replace(hookup, tied=tuple(t for j, t in enumerate(hookup.tied) if j != k))


def _moved(found: Slipped, bench: Bench, rows: list[int], rng: np.random.Generator) -> Slipped | None:
    n = len(bench.windings)
    coil = int(rng.integers(n))
    factor = float(rng.choice([rng.uniform(0.5, 0.97), rng.uniform(1.03, 1.3)]))
    moved = bench.inductance.copy()
    others = np.arange(n) != coil
    moved[coil, others] *= factor
    moved[others, coil] *= factor
    root = np.sqrt(np.diag(moved))
    if np.linalg.eigvalsh(moved / np.outer(root, root))[0] < 0.01:
        return None
    shows = [abs(bench.impedance(r.written, moved) / bench.impedance(r.written) - 1) > 1e-6 for r in found.rows]
    rows = [k for k in rows if shows[k]]
    if not rows:
        return None
    row = rows[0]
    after = found.kind.endswith("from then on")
    if after and (sum(shows[row:]) < 2 or sum(shows[:row]) < 2):
        # One reading that differs from all others is the other kind.
        return None
    for k in range(row, len(found.rows) if after else row + 1):
        found.rows[k] = replace(found.rows[k], inductance=moved)
    return replace(found, row=row)


def _parallel(found: Slipped, rows: list[int]) -> Slipped | None:
    able = [k for k in rows if found.rows[k].was.sense is None and len(found.rows[k].columns) == 2]
    if not able:
        return None
    for k in rows if found.kind.endswith("all rows") else able[:1]:
        found.rows[k] = replace(found.rows[k], parallel=found.rows[k].was.sense is None)
    return replace(found, row=able[0])


def _record(bench: Bench, reads: list[Read], rng: np.random.Generator) -> Recording:
    """Read the bench: errors of each kind drawn once for what shares them."""
    s, omega = bench.sizes, bench.omega

    def error(name: str) -> float:
        return float(rng.uniform(-s[name], s[name]))

    common = complex(error("gain_common"), error("phase_common"))
    floor = complex(error("floor_ohm"), omega * error("floor_H"))
    each: dict[Hookup, complex] = {}
    rows = []
    for number, read in enumerate(reads, 1):
        if read.was not in each:
            each[read.was] = complex(error("gain_each"), error("phase_each"))
        z = bench.impedance(read.was, read.inductance) * (1 + common + each[read.was]) + floor
        part = abs(z) ** 2
        shown = {
            "inductance": part / (omega * z.imag) if read.parallel else z.imag / omega,
            "resistance": part / z.real if read.parallel else z.real,
            "quality": z.imag / z.real,
        }
        values = {}
        for column in read.columns:
            name = column.removeprefix("transfer ")
            noise = {"inductance": "noise_H", "resistance": "noise_ohm", "quality": "noise_1"}[name]
            values[column] = _printed(shown[name] + s[noise] * float(rng.standard_normal()))
        rows.append(Row(number, read.written, None, bench.frequency, values))
    return Recording(bench.device, tuple(rows), instruments={"meter": _accuracy(bench)})


def _printed(value: float) -> Value:
    step = 10.0 ** (np.floor(np.log10(max(abs(value), 1e-300))) - DIGITS + 1)
    return Value(float(np.round(value / step) * step), float(step))


def _accuracy(bench: Bench) -> Accuracy:
    """What the data sheet says."""
    s = bench.sizes
    return Accuracy(
        "meter",
        gain_common=s["gain_common"],
        gain_each=s["gain_each"],
        phase_common=s["phase_common"],
        phase_each=s["phase_each"],
        floor={"H": s["floor_H"], "ohm": s["floor_ohm"]},
        noise={"H": s["noise_H"], "ohm": s["noise_ohm"], "1": s["noise_1"]},
    )


def _mistype(found: Slipped, recording: Recording, rng: np.random.Generator) -> Recording | None:
    """Slips made in writing the numbers down."""
    rows = list(recording.rows)
    row = rows[found.row]
    if found.kind == "prefix":
        assert found.column is not None
        value = row.values[found.column]
        assert value.step is not None
        wrong = Value(value.value / found.factor, value.step / found.factor)
        rows[found.row] = replace(row, values={**row.values, found.column: wrong})
    elif found.kind == "typed in two rows":
        others = [r for r in rows if r.hookup != row.hookup and set(r.values) & set(row.values)]
        if not others:
            return None
        other = others[int(rng.integers(len(others)))]
        shared = [c for c in row.values if c in other.values]
        copied = shared if rng.random() < 0.5 else shared[:1]
        rows[found.row] = replace(row, values={**row.values, **{c: other.values[c] for c in copied}})
    return replace(recording, rows=tuple(rows))
