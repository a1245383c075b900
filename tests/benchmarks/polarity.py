"""How often verdicts on polarity are given, and how often they are wrong, beside an enumeration by brute force.

    python tests/benchmarks/polarity.py [--count 2000] [--seed 1]

Devices of 2 to 4 windings, some with shared leads, free or with a declared arrangement that holds; kicks that are wrong
with the stated chances; and one series reading of a pair whose noise leaves its sign at odds from 1 to about a million.
The exact probabilities come from all sign patterns and both senses of the meter, the numbers entering by the normal
distribution of M within +-sqrt(L1 L2). In the line "any hookup" the battery and the voltmeter sit across any leads, so
that a jump may be the sum of several M and L; what can be said there depends on magnitudes, so only errors are counted.
"""

from __future__ import annotations

import argparse
import math
import sys
import warnings
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import combinations, product
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
sys.path.insert(0, str(Path(__file__).parents[1]))
import loops
from drawn import draw_windings

from mutual.collect import collect
from mutual.device import Device, Hookup, Winding
from mutual.evaluate import signs_of
from mutual.joint import explain
from mutual.polarity import Signs, combine, marks
from mutual.recording.model import Accuracy, KickTable, Recording, Row, Value

KINDS = ("kicks", "numbers", "both", "both, often reversed", "any hookup")
ARRANGEMENTS = ("free", "one limb", "three-phase")
ASKED = {"one limb": 1, "three-phase": -1}
ODDS = 1000.0
# Odds that differ by less than this part are the same.
SLACK = 0.05

Pair = tuple[int, int]


@dataclass
class Evidence:
    """For the enumeration: kicks as (pair, or None for the fed winding itself, and sign), and P(M > 0) by numbers."""

    misread: float
    reversed: float
    kicks: list[tuple[Pair | None, int]] = field(default_factory=list)
    numbers: dict[Pair, float] = field(default_factory=dict)


@dataclass
class Case:
    """One device, what was read of it, and what follows by brute force."""

    device: Device
    inductance: np.ndarray
    recording: Recording
    evidence: Evidence
    exact: dict[Pair, float] | None


def draw_device(rng: np.random.Generator, shared: bool) -> tuple[Device, np.ndarray]:
    """Windings and inductances that keep to the declared arrangement; all with shared leads, or some."""
    arrangement = str(rng.choice(ARRANGEMENTS))
    n = 3 if arrangement == "three-phase" else int(rng.integers(2, 5))
    inductance, _ = draw_windings(rng, n)
    root = np.sqrt(np.diag(inductance))
    if arrangement != "free":
        turned = rng.choice([-1.0, 1.0], n)
        share = (
            rng.uniform(0.05, 0.99, n) if arrangement == "one limb" else np.full(n, math.sqrt(rng.uniform(0.05, 0.45)))
        )
        kappa = ASKED[arrangement] * np.outer(turned * share, turned * share)
        np.fill_diagonal(kappa, 1.0)
        inductance = kappa * np.outer(root, root)
    shape = rng.uniform(0.6 if shared else 0.0, 1.0)
    if shape < 0.6:
        ends = [("ACEG"[i], "BDFH"[i]) for i in range(n)]
    elif shape < 0.8:
        ends = [("ACEG"[i], "N") if rng.random() < 0.5 else ("N", "ACEG"[i]) for i in range(n)]  # a star
    else:
        ends = [("ABCDE"[i], "ABCDE"[i + 1]) for i in range(n)]  # a winding with taps
    return Device("drawn", tuple(Winding(f"w{i}", *e) for i, e in enumerate(ends)), arrangement), inductance


def draw(rng: np.random.Generator, kind: str) -> Case:
    """One case of a kind."""
    device, inductance = draw_device(rng, kind == "any hookup")
    pairs = list(combinations(range(len(device.windings)), 2))
    reversed_chance = float(rng.choice([0.01, 0.1, 0.3])) if "reversed" in kind else 1e-4
    evidence = Evidence(float(rng.choice([0.02, 0.1, 0.2])), reversed_chance)
    meters: dict[str, Accuracy] = {}
    rows: list[Row] = []
    if kind != "numbers":
        turned = -1 if rng.random() < reversed_chance else 1
        rows += draw_kicks(rng, device, inductance, evidence, turned, kind == "any hookup")
    if kind not in ("kicks", "any hookup"):
        rows += draw_readings(rng, device, inductance, evidence, meters)
    rows = [Row(k + 1, r.hookup, None, r.frequency, r.values, r.kicks, r.instrument) for k, r in enumerate(rows)]
    table = KickTable(evidence.misread, evidence.reversed)
    recording = Recording(device, tuple(rows), instruments=meters, kick=table)
    exact = None if kind == "any hookup" else enumerate_signs(device.arrangement, pairs, evidence)
    return Case(device, inductance, recording, evidence, exact)


def draw_kicks(
    rng: np.random.Generator, device: Device, inductance: np.ndarray, evidence: Evidence, turned: int, anywhere: bool
) -> list[Row]:
    """One to six kicks for most of the pairs, and some across the fed winding itself; or kicks between any leads."""
    rows = []
    windings = device.windings
    ends = [(w.first, w.second) for w in windings]

    def kick(across: tuple[str, str], sense: tuple[str, str], sign: float) -> int:
        seen = int(np.sign(sign)) * turned * (-1 if rng.random() < evidence.misread else 1)
        both, word = rng.random(), {1: "+", -1: "-"}
        shown = {"kick on make": word[seen], "kick on break": word[-seen]}
        if both < 0.4:
            shown["kick on make" if both < 0.2 else "kick on break"] = "0"
        rows.append(Row(0, Hookup(across, (), sense), kicks=shown))
        return seen

    if anywhere:
        for _ in range(int(rng.integers(2, 7))):
            across, sense = (tuple(rng.choice(device.leads, 2, replace=False)) for _ in range(2))
            case = {"windings": [(w.name, w.first, w.second) for w in windings], "tied": (), "across": across}
            try:
                path, other, _ = loops.paths({**case, "sense": sense})
            except ValueError:
                continue
            for _ in range(int(rng.integers(1, 21))):
                kick(across, sense, float(path @ inductance @ other))
        return rows
    for i, j in combinations(range(len(windings)), 2):
        for _ in range(int(rng.integers(1, 7)) if rng.random() < 0.8 else 0):
            # Leads exchanged at the battery or at the voltmeter turn the jump round.
            a, b = (1 if rng.random() < 0.5 else -1 for _ in range(2))
            driven, sensed = (i, j) if rng.random() < 0.5 else (j, i)
            seen = kick(ends[driven][::a], ends[sensed][::b], a * b * inductance[i, j])
            evidence.kicks.append(((i, j), a * b * seen))
    for _ in range(int(rng.integers(0, 5)) if rng.random() < 0.5 else 0):
        a = 1 if rng.random() < 0.5 else -1
        evidence.kicks.append((None, a * kick(ends[0], ends[0][::a], float(a))))
    return rows


def draw_readings(
    rng: np.random.Generator, device: Device, inductance: np.ndarray, evidence: Evidence, meters: dict[str, Accuracy]
) -> list[Row]:
    """Every winding alone with a fine meter, and most pairs in series one way with noise of its own."""
    meters["fine"] = Accuracy("fine", noise={"H": 1e-7 * float(np.diag(inductance).min())}, stated_as="standard")
    own = np.diag(inductance)
    rows = [
        Row(
            0,
            Hookup((w.first, w.second)),
            frequency=1e4,
            values={"inductance": Value(float(own[i]))},
            instrument="fine",
        )
        for i, w in enumerate(device.windings)
    ]
    for i, j in combinations(range(len(own)), 2):
        hookup, way = series(device, i, j)
        case = {"windings": [(w.name, w.first, w.second) for w in device.windings], "tied": hookup.tied}
        if rng.random() > 0.8 or loops.paths({**case, "across": hookup.across})[2].size:
            continue  # some pairs are not read; between two parts of a tapped winding the tie would short the third
        # The sign stands at up to five standard deviations, which is odds of three million to one.
        noise = float(2 * abs(inductance[i, j]) / rng.uniform(0.01, 5.0))
        read = float(own[i] + own[j] + 2 * way * inductance[i, j] + noise * rng.standard_normal())
        meters[f"coarse {i} {j}"] = Accuracy(f"coarse {i} {j}", noise={"H": noise}, stated_as="standard")
        values = {"inductance": Value(read)}
        rows.append(Row(0, hookup, frequency=1e4, values=values, instrument=f"coarse {i} {j}"))
        middle, spread = way * (read - own[i] - own[j]) / 2, noise / 2
        most = math.sqrt(own[i] * own[j])
        up = normal(middle / spread) - normal((middle - most) / spread)
        down = normal(-middle / spread) - normal((-middle - most) / spread)
        evidence.numbers[i, j] = up / (up + down)
    return rows


def normal(x: float) -> float:
    """Distribution function of the standard normal."""
    return math.erfc(-x / math.sqrt(2)) / 2


def series(device: Device, i: int, j: int) -> tuple[Hookup, int]:
    """Two windings in series, and the sign of 2 M in their inductance."""
    a, b = device.windings[i], device.windings[j]
    for p, q, way in ((a.first, a.second, 1), (a.second, a.first, -1)):
        for r, s, turn in ((b.first, b.second, 1), (b.second, b.first, -1)):
            if q == r:
                return Hookup((p, s)), way * turn
    return Hookup((a.first, b.second), ((a.second, b.first),)), 1


def enumerate_signs(arrangement: str, pairs: list[Pair], evidence: Evidence) -> dict[Pair, float]:
    """P(M > 0) of every pair from all sign patterns that the arrangement allows and both senses of the meter."""
    asked = ASKED.get(arrangement)
    windings = sorted({i for pair in pairs for i in pair})
    total, above = 0.0, dict.fromkeys(pairs, 0.0)
    for pattern in product((1, -1), repeat=len(pairs)):
        sign: dict[Pair | None, int] = {**dict(zip(pairs, pattern, strict=True)), None: 1}
        triples = [sign[i, j] * sign[j, k] * sign[i, k] for i, j, k in combinations(windings, 3)]
        if asked is not None and any(t != asked for t in triples):
            continue
        for turned, prior in ((1, 1 - evidence.reversed), (-1, evidence.reversed)):
            weight = prior
            for pair, seen in evidence.kicks:
                weight *= 1 - evidence.misread if seen == turned * sign[pair] else evidence.misread
            for pair, up in evidence.numbers.items():
                weight *= up if sign[pair] > 0 else 1 - up
            total += weight
            for pair in pairs:
                above[pair] += weight * (sign[pair] > 0)
    return {pair: p / total for pair, p in above.items()}


@dataclass
class Tally:
    """Counts of one kind.

    `clear`: pairs whose exact odds are 1000 to 1 or better; `answered`: those of them that got a verdict; `given` and
    `wrong`: all verdicts, and those that the device contradicts; `early`: verdicts where exact odds are below;
    `bold`: those where they are below by more than 5 %; `refused`: pairs of a device whose true declaration the
    data contradict, which is refused (exit 3); of these only the number is counted.
    """

    pairs: int = 0
    clear: int = 0
    answered: int = 0
    given: int = 0
    wrong: int = 0
    early: int = 0
    bold: int = 0
    refused: int = 0

    def add(self, other: Mapping[str, int]) -> None:
        """Count one pair."""
        for name, value in other.items():
            setattr(self, name, getattr(self, name) + int(value))

    @property
    def allowed(self) -> int:
        """Wrong verdicts that 1000 to 1 allows: exceeded by chance in one run of a thousand, were all at that limit."""
        mean, k, term, reached = self.given / (1 + ODDS), 0, 0.0, 0.0
        while True:
            term = math.exp(-mean) if k == 0 else term * mean / k
            reached += term
            if reached >= 0.999:
                return k
            k += 1


def signs(recording: Recording) -> Signs:
    """What an estimate says of the signs, without the bounds that it takes most of its time for."""
    collected = collect([recording])
    if collected.items:
        return signs_of(collected, explain(collected, 0.95), 0)
    n = len(collected.device.windings)
    return combine(collected.device, np.zeros((n, n)), collected.kicks.each, collected.kicks.reversed)


def judge(case: Case) -> list[dict[str, int]]:
    """Every pair of one case."""
    found = signs(case.recording)
    out: list[dict[str, int]] = []
    refused = any(f.level == "refusal" and f.code == "arrangement" for f in marks(case.device, found).findings)
    for i, j in combinations(range(len(case.device.windings)), 2):
        if refused:
            out.append({"pairs": 1, "refused": 1})
            continue
        word = found.verdict(i, j)
        right = "same" if case.inductance[i, j] > 0 else "opposite"
        given = word != "undetermined"
        counts = {"pairs": 1, "given": given, "wrong": given and word != right}
        if case.exact is not None:
            p = case.exact[i, j]
            odds = max(p, 1 - p) / max(min(p, 1 - p), 1e-300)
            said = p if word == "same" else 1 - p
            own = said / max(1 - said, 1e-300)
            counts |= {
                "clear": odds >= ODDS,
                "answered": odds >= ODDS and given,
                "early": given and own < ODDS,
                "bold": given and own < ODDS * (1 - SLACK),
            }
        out.append(counts)
    return out


def run(count: int, seed: int) -> dict[str, Tally]:
    """Draw and judge `count` recordings, the kinds in turn."""
    rng = np.random.default_rng(seed)
    table: dict[str, Tally] = defaultdict(Tally)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        for k in range(count):
            kind = KINDS[k % len(KINDS)]
            for counts in judge(draw(rng, kind)):
                table[kind].add(counts)
    return table


def report(table: dict[str, Tally]) -> str:
    """The table."""
    lines = [
        f"{'':22s} {'pairs':>6s} {'exact odds':>11s} {'of these':>9s} {'all':>9s} {'wrong':>6s} {'allowed':>8s}"
        f" {'exact odds':>11s} {'by more':>8s}",
        f"{'evidence':22s} {'':6s} {'over 1000':>11s} {'answered':>9s} {'verdicts':>9s} {'':6s} {'':8s}"
        f" {'below 1000':>11s} {'than 5 %':>8s}",
    ]
    for kind in KINDS:
        t = table[kind]
        share = f"{100 * t.answered / t.clear:.1f} %" if t.clear else "-"
        exact: list[Any] = [t.clear, share] if kind != "any hookup" else ["-", "-"]
        below: list[Any] = [t.early, t.bold] if kind != "any hookup" else ["-", "-"]
        lines.append(
            f"{kind:22s} {t.pairs:6d} {exact[0]:>11} {exact[1]:>9} {t.given:9d} {t.wrong:6d} {t.allowed:8d}"
            f" {below[0]:>11} {below[1]:>8}"
        )
    refused = sum(t.refused for t in table.values())
    lines.append(f"pairs of devices whose data contradict their (true) declaration, which is refused: {refused}")
    return "\n".join(lines)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--count", type=int, default=2000)
    parser.add_argument("--seed", type=int, default=1)
    chosen = parser.parse_args()
    print(report(run(chosen.count, chosen.seed)))


if __name__ == "__main__":
    main()
