"""Random devices of two to six windings in random hookups, as plain data, with what ngspice says of them.

Every case is drawn from a seed: windings that may share leads (taps, stars, deltas), coupling matrices from loose to
0.99999, resistances, mutual resistances, one hookup, one of a few common frequencies (one netlist holds all cases of
one frequency, and one `.ac` serves them all). `random_devices.json` keeps a set with its results.
"""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
from netlists import netlist
from ngspice import run

STORE = Path(__file__).with_name("random_devices.json")
KINDS = ("single", "shorted thirds", "series", "parallel", "bridged", "random")


def generate(count: int, seed: int, frequencies: int = 8) -> list[dict[str, Any]]:
    """Draw `count` cases over `frequencies` frequencies between 10 Hz and 1 MHz (no results yet)."""
    rng = np.random.default_rng(seed)
    table = [_rounded(10 ** rng.uniform(1, 6), 4) for _ in range(frequencies)]
    cases: list[dict[str, Any]] = []
    while len(cases) < count:
        kind = KINDS[len(cases) % len(KINDS)]
        case = {"kind": kind, "frequency": table[len(cases) * frequencies // count]}
        case["windings"] = _windings(rng, int(rng.integers(2, 7)))
        hookup = _hookup(rng, kind, case["windings"])
        if hookup is None:
            continue
        case |= hookup | _matrices(rng, len(case["windings"]), 2 * math.pi * case["frequency"])
        cases.append(case)
    return cases


def solve(cases: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """The cases with `impedance` and `transfer` ([re, im] in ohm; None without `sense`), by one run per frequency."""
    solved: dict[int, dict[str, Any]] = {}
    for frequency in dict.fromkeys(case["frequency"] for case in cases):
        chosen = [i for i, case in enumerate(cases) if case["frequency"] == frequency]
        lines = [f"* random devices at {frequency!r} Hz"]
        for i in chosen:
            lines += netlist.subcircuit(f"device{i}", cases[i])
            lines += netlist.driven(f"device{i}", cases[i], cases[i], f"c{i}")
        vectors = run("\n".join([*lines, f".ac lin 1 {frequency!r} {frequency!r}", ".end", ""]))["ac"]
        for i in chosen:
            seen = {"impedance": cases[i]["across"], "transfer": cases[i]["sense"]}
            solved[i] = dict(cases[i])
            for name, pair in seen.items():
                volts = None if pair is None else netlist.voltage(vectors, cases[i], cases[i], f"c{i}", pair)
                solved[i][name] = None if volts is None else [volts.real, volts.imag]
    return [solved[i] for i in range(len(cases))]


def difference(first: list[dict[str, Any]], second: list[dict[str, Any]]) -> float:
    """Largest relative difference of impedances and transfers of two solved sets of the same cases."""
    worst = 0.0
    for one, other in zip(first, second, strict=True):
        for name in ("impedance", "transfer"):
            if one[name] is not None:
                a, b = complex(*one[name]), complex(*other[name])
                worst = max(worst, abs(a - b) / abs(b))
    return worst


def load(path: Path = STORE) -> list[dict[str, Any]]:
    """The stored cases with full L and R matrices."""
    cases = json.loads(path.read_text(encoding="utf-8"))["cases"]
    for case in cases:
        for name in ("L", "R"):
            n = len(case[name])
            case[name] = [[case[name][max(i, j)][min(i, j)] for j in range(n)] for i in range(n)]
    return cases


def dumps(cases: list[dict[str, Any]]) -> str:
    """Text of the store: one case a line, lower triangles of L and R."""
    lines = []
    for case in cases:
        short = {**case, **{name: [row[: i + 1] for i, row in enumerate(case[name])] for name in ("L", "R")}}
        lines.append(json.dumps(short, separators=(",", ":")))
    about = "invented devices; impedance and transfer computed by ngspice; L and R are lower triangles"
    return f'{{"about":{json.dumps(about)},"cases":[\n' + ",\n".join(lines) + "\n]}\n"


def _windings(rng: np.random.Generator, count: int) -> list[list[str]]:
    """Windings with names and leads; about a third share a lead with an earlier one."""
    windings: list[list[str]] = []
    free = iter("ABCDEFGHJKLM")
    for w in range(count):
        pair = [next(free), next(free)]
        if windings and rng.random() < 0.35:
            used = [lead for _, a, b in windings for lead in (a, b)]
            pair[int(rng.integers(2))] = str(rng.choice(used))
            if rng.random() < 0.2:
                pair[0 if pair[1] in used else 1] = str(rng.choice(used))
        if pair[0] == pair[1]:
            pair[1] = next(lead for lead in "NOPQRS" if lead not in {x for _, *ends in windings for x in ends})
        windings.append([f"w{w + 1}", *pair])
    return windings


def _hookup(rng: np.random.Generator, kind: str, windings: list[list[str]]) -> dict[str, Any] | None:
    """One hookup of a kind, or None when these windings and this draw do not allow it."""
    order = [windings[i] for i in rng.permutation(len(windings))]
    ends = [list(rng.permutation(w[1:])) for w in order]
    leads = list(dict.fromkeys(lead for pair in ends for lead in pair))
    (a, b), (c, d) = (map(str, pair) for pair in ends[:2])
    across, tied, sense = [a, b], [], None
    if kind == "shorted thirds":
        tied = [list(map(str, pair)) for pair in ends[1:] if rng.random() < 0.6] or [[c, d]]
    elif kind == "series":
        across, tied = [a, d], [[b, c]]
    elif kind == "parallel":
        tied = [[a, c], [b, d]]
    elif kind == "bridged":
        across, tied, sense = [a, b], [[b, c]], [a, d]
    elif kind == "random":
        tied = [list(map(str, rng.choice(leads, 2, replace=False))) for _ in range(int(rng.integers(0, len(windings))))]
        across = list(map(str, rng.choice(leads, 2, replace=False)))
    if sense is None and rng.random() < 0.6:
        sense = list(map(str, rng.choice(leads, 2, replace=False)))
    node = netlist.joined(leads, tied)
    part = netlist.joined(leads, [*tied, *(w[1:] for w in windings)])
    for pair in [across, *([] if sense is None else [sense])]:
        if node[pair[0]] == node[pair[1]] or part[pair[0]] != part[pair[1]]:
            return None
    if any(x == y for x, y in tied):
        return None
    return {"across": across, "tied": tied, "sense": sense}


def _matrices(rng: np.random.Generator, n: int, omega: float) -> dict[str, Any]:
    """L and R with windings of unlike size, couplings loose or tight, and mutual resistance in two cases of three."""
    size = 10 ** (rng.uniform(-7, 0) + rng.uniform(-2, 2, n))
    if rng.random() < 0.5:
        factor = rng.normal(size=(n, n + int(rng.integers(0, 4))))
        k = factor @ factor.T
        k = rng.uniform(0.3, 0.99) * k / np.sqrt(np.outer(np.diag(k), np.diag(k)))
    else:
        leak = 10 ** rng.uniform(-4.9, -0.5, n)
        sign = rng.choice([-1.0, 1.0], n)
        k = np.outer(sign * np.sqrt(1 - leak), sign * np.sqrt(1 - leak))
    inductance = _symmetric(k, size, 9)
    ohms = omega * size / 10 ** rng.uniform(-1, 2.5, n)
    shared = rng.normal(size=(n, n + 1))
    c = shared @ shared.T
    c = rng.uniform(0.1, 0.8) * c / np.sqrt(np.outer(np.diag(c), np.diag(c)))
    if rng.random() < 1 / 3:
        c = np.zeros((n, n))
    return {"L": inductance, "R": _symmetric(c, ohms, 5)}


def _symmetric(ratio: np.ndarray, diagonal: np.ndarray, digits: int) -> list[list[float]]:
    """diagonal and ratio * sqrt(d_i d_j) beside it, each printed with so many digits; exactly symmetric."""
    scale = np.sqrt(np.outer(diagonal, diagonal))
    n = len(diagonal)
    scale *= np.where(np.eye(n, dtype=bool), 1.0, ratio)
    return [[_rounded(float(scale[max(i, j), min(i, j)]), digits) for j in range(n)] for i in range(n)]


def _rounded(value: float, digits: int) -> float:
    return float(f"{value:.{digits}g}")
