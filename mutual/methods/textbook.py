"""Textbook formulas found in the rows of a recording: what people can redo by hand.

They never make the estimate. They stand beside it, serve as starting values, and check it in the tests.
Symbols: L1 and L2 are the windings of the pair alone, the others open; La and Lo the two in series, passed
from first lead to second in both (La) or against that in one (Lo); Lpa and Lpo the two in parallel, the first
leads together (Lpa) or not (Lpo); Ls and Zs a winding with the other shorted, Zo the same winding with it open.
M belongs to the first leads, so it is negative where they are not of like polarity; k is |M|/sqrt(L1 L2).

All but one follow at once from L = L1 + L2 + 2 M (series), (L1 L2 - M^2)/(L1 + L2 - 2 M) (parallel) and
L1 - M^2/L2 (shorted). The one with impedances holds for a shorted winding of any resistance: with
Zo = R1 + j omega L1 and Zs = Zo + (omega M)^2/(R2 + j omega L2), the imaginary part of 1/(Zs - Zo) is
L2/(omega M^2), hence k^2 = 1/(omega L1 Im(1/(Zs - Zo))), as long as the two share no loss.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations
from typing import Any

from mutual.device import Device
from mutual.methods.gathered import State, Term, Use, gather, split
from mutual.methods.shapes import alone, both
from mutual.recording.model import Row

Answer = tuple[float | None, float | None]


@dataclass(frozen=True)
class Candidate:
    """A formula for which the rows hold everything it needs.

    Attributes
    ----------
    name : str
        The test in words; windings appear only where their part in it differs.
    expression : str
        Right-hand side, of M; of k where it begins with ``sqrt(1``, as that of the tests with a winding shorted.
    pair : (str, str)
        Names of windings, in the order of the device.
    uses : tuple of (int, str)
        Each reading that goes in, once: position in `rows`, column. All repeats are among them.
    evaluate : callable
        Takes the readings (SI units) in the order of `uses` and gives (M in H or None, k or None). M is signed,
        or a magnitude where the test has no sign; k is what the formula says, even above 1. None stands for
        what the readings do not give, such as the root of a negative number.
    frequency : float or None
        Hz, of all readings used.
    point : mapping
        The point of all readings used.
    """

    name: str
    expression: str
    pair: tuple[str, str]
    uses: tuple[Use, ...]
    evaluate: Callable[[Sequence[float]], Answer]
    frequency: float | None = None
    point: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class _Formula:
    """A formula with its terms; one that is `rival` to another is shown only where it gives k <= 1."""

    name: str
    expression: str
    terms: Sequence[Term]
    of: Callable[..., Answer]
    rival: bool = False


def find(device: Device, rows: Sequence[Row]) -> list[Candidate]:
    """Find the formulas that can be redone by hand from these rows.

    Parameters
    ----------
    device : Device
    rows : sequence of Row
        Of any number of recordings of that device. Rows serve together where frequency and point are the same.

    Returns
    -------
    list of Candidate
        By frequency and point in order of appearance, then by pair.
    """
    found = []
    for state in gather(device, rows):
        for i, j in combinations(range(len(device.windings)), 2):
            pair = (device.windings[i].name, device.windings[j].name)
            for method in (_transfer, _series, _parallel, _shorted):
                for formula in method(state, i, j, pair):
                    candidate = _candidate(formula, pair, state)
                    if not formula.rival or _possible(candidate, rows):
                        found.append(candidate)
    return found


def _candidate(formula: _Formula, pair: tuple[str, str], state: State) -> Candidate:
    numbers = split(formula.terms)

    def evaluate(values: Sequence[float]) -> Answer:
        try:
            return formula.of(*numbers(values))
        except (ZeroDivisionError, OverflowError):  # two readings that differ by nothing, a Q of nothing
            return None, None

    uses = tuple(use for term in formula.terms for use in term.uses)
    return Candidate(formula.name, formula.expression, pair, uses, evaluate, state.frequency, state.point)


def _possible(candidate: Candidate, rows: Sequence[Row]) -> bool:
    _, k = candidate.evaluate([rows[position].values[column].value for position, column in candidate.uses])
    return k is not None and k <= 1


def _transfer(state: State, i: int, j: int, pair: tuple[str, str]) -> Iterator[_Formula]:
    transfer = state.transfer(i, j)
    if transfer is not None:
        own = state.own(i, j)
        yield _Formula("induced voltage", "transfer inductance", [transfer, *own], lambda m, *own: _with_k(m, own))


def _series(state: State, i: int, j: int, pair: tuple[str, str]) -> Iterator[_Formula]:
    la, lo = (state.inductance(both("series", i, j, sign)) for sign in (1, -1))
    own = state.own(i, j)
    if la is not None and lo is not None:
        yield _Formula(
            "series both ways", "(La - Lo)/4", [la, lo, *own], lambda a, o, *own: _with_k((a - o) / 4, own)
        )
    if la is not None and own:
        yield _Formula(
            "series one way", "(La - L1 - L2)/2", [la, *own], lambda a, *own: _with_k((a - sum(own)) / 2, own)
        )
    if lo is not None and own:
        yield _Formula(
            "series other way", "(L1 + L2 - Lo)/2", [lo, *own], lambda o, *own: _with_k((sum(own) - o) / 2, own)
        )


def _parallel(state: State, i: int, j: int, pair: tuple[str, str]) -> Iterator[_Formula]:
    own = state.own(i, j)
    if not own:
        return
    lpa, lpo = (state.inductance(both("parallel", i, j, sign)) for sign in (1, -1))
    if lpa is not None and lpo is not None:
        yield _Formula(
            "parallel both ways",
            "(L1 + L2)/2 (Lpa - Lpo)/(Lpa + Lpo)",
            [lpa, lpo, *own],
            lambda a, o, *own: _with_k(sum(own) / 2 * (a - o) / (a + o), own),
        )
    # One way alone leaves a quadratic in M, and often both of its roots are possible: then both are said.
    for lp, sign, name, symbol in ((lpa, 1, "parallel one way", "Lpa"), (lpo, -1, "parallel other way", "Lpo")):
        if lp is None:
            continue
        root = f"sqrt(({symbol} - L1)({symbol} - L2))"
        near, far = (f"{symbol} - {root}", f"{symbol} + {root}")
        if sign < 0:
            near, far = (f"{root} - {symbol}", f"-{symbol} - {root}")
        yield _Formula(name, near, [lp, *own], _parallel_root(sign, -1))
        yield _Formula(f"{name}, other root", far, [lp, *own], _parallel_root(sign, 1), rival=True)


def _parallel_root(sign: int, branch: int) -> Callable[..., Answer]:
    """M = sign (Lp + branch sqrt((Lp - L1)(Lp - L2))), which solves Lp (L1 + L2 - 2 sign M) = L1 L2 - M^2."""

    def formula(lp: float, *own: float) -> Answer:
        root = _sqrt((lp - own[0]) * (lp - own[1]))
        return _with_k(None if root is None else sign * (lp + branch * root), own)

    return formula


def _shorted(state: State, i: int, j: int, pair: tuple[str, str]) -> Iterator[_Formula]:
    both_own = state.own(i, j)
    for seen, other, number in ((i, j, 0), (j, i, 1)):
        text = f"{pair[1 - number]} shorted"
        name = f"L{number + 1}"
        opened, shorted = state.inductance(alone(seen)), state.inductance(alone(seen, (other,)))
        if opened is not None and shorted is not None:
            own = both_own or [opened]
            yield _Formula(text, f"sqrt(1 - Ls/{name})", [shorted, *own], _short(min(number, len(own) - 1)))
        z_opened, z_shorted = state.impedance(alone(seen)), state.impedance(alone(seen, (other,)))
        if z_opened is not None and z_shorted is not None and state.frequency is not None:
            further = state.inductance(alone(other))
            yield _Formula(
                f"{text}, impedances",
                f"sqrt(1/(omega {name} Im(1/(Zs - Zo))))",
                [z_opened, z_shorted, *([] if further is None else [further])],
                _short_impedance(2 * math.pi * state.frequency),
            )


def _short(seen: int) -> Callable[..., Answer]:
    def formula(shorted: float, *own: float) -> Answer:
        return _with_m(_sqrt(1 - shorted / own[seen]), own)

    return formula


def _short_impedance(omega: float) -> Callable[..., Answer]:
    def formula(opened: complex, shorted: complex, *further: float) -> Answer:
        reflected = (1 / (shorted - opened)).imag
        return _with_m(_sqrt(1 / (opened.imag * reflected)), (opened.imag / omega, *further))

    return formula


def _sqrt(x: float) -> float | None:
    return math.sqrt(x) if x >= 0 else None


def _with_k(m: float | None, own: Sequence[float]) -> Answer:
    """M with its k, where both self-inductances are at hand and positive."""
    if m is None or len(own) < 2 or min(own) <= 0:
        return m, None
    return m, abs(m) / math.sqrt(own[0] * own[1])


def _with_m(k: float | None, own: Sequence[float]) -> Answer:
    """k with the magnitude of its M, where both self-inductances are at hand and positive."""
    if k is None or len(own) < 2 or min(own) <= 0:
        return None, k
    return k * math.sqrt(own[0] * own[1]), k
