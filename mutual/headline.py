"""Which fit is shown first: constants for everything where they fit, else one frequency or point, else none."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import combinations
from typing import Any

from mutual.assemble import pair_results, winding_results
from mutual.collect import Collected
from mutual.device import Device
from mutual.errors import WrongUsage
from mutual.joint import IMPROBABLE, Joint
from mutual.polarity import Signs, pair_dots
from mutual.result import Finding, PairResult, Polarity, StateResult, WindingResult
from mutual.states import Point, point_key

_SAME_FREQUENCY = 1e-6


@dataclass(frozen=True)
class Headline:
    """The fit that is shown and where in it the headline stands.

    Attributes
    ----------
    basis : {"all", "one frequency", "none"}
    joint : Joint
        The fit shown.
    apart : Joint or None
        The fit with inductances of its own for each frequency and point, where there are several.
    group, state, direct : int or None
        Sets of inductances and of resistances of the headline; of direct current.
    """

    basis: str
    joint: Joint
    apart: Joint | None
    group: int | None
    state: int | None
    direct: int | None
    frequency: float | None
    point: Mapping[str, Any] | None
    findings: tuple[Finding, ...] = ()


def choose(
    collected: Collected, explain: Callable[[bool], Joint], at: float | None, point: Mapping[str, Any] | None
) -> Headline:
    """Decide on the headline.

    Raises
    ------
    WrongUsage
        No reading at the frequency or point asked for.
    """
    seen = collected.alternating
    wanted = [s for s in seen if _matches(s, at, point)]
    if (at is not None or point is not None) and not wanted:
        there = ", ".join(sorted({f"{f:g} Hz" if f is not None else "no frequency" for f, _ in seen}))
        raise WrongUsage(f"nothing was read at the frequency or point asked for; there are {there}")
    joint = explain(False)
    apart = explain(True) if len(seen) > 1 else None
    frequencies, points = {f for f, _ in seen}, {p for _, p in seen}
    fits = any(e.p_value is None or e.p_value >= IMPROBABLE for e in joint.explanations)
    if apart is None or fits:
        one = next(iter(seen)) if len(seen) == 1 else None
        return Headline(
            basis="all",
            joint=joint,
            apart=apart,
            group=0,
            state=joint.states.state(*one) if one else None,
            direct=_direct(joint, collected),
            frequency=next(iter(frequencies)) if len(frequencies) == 1 else None,
            point=dict(next(iter(points))) or None if len(points) == 1 else None,
        )
    if len(wanted) == 1 and (at is not None or point is not None):
        f, p = wanted[0]
        place = (apart.states.group(f, p), apart.states.state(f, p))
        return Headline("one frequency", apart, apart, *place, _direct(apart, collected), f, dict(p) or None)
    text = (
        "no single set of constants explains all of it; take the headline with --at or --point, or see each "
        "frequency and point by itself"
    )
    caution = Finding("caution", "no headline", text)
    direct = _direct(apart, collected)
    return Headline("none", apart, apart, None, None, direct, None, None, (caution,))


def _direct(joint: Joint, collected: Collected) -> int | None:
    return joint.states.state(0.0, ()) if any(f == 0 for f, _ in collected.seen) else None


def _matches(seen: tuple[float | None, Point], at: float | None, point: Mapping[str, Any] | None) -> bool:
    f, p = seen
    if at is not None and (f is None or abs(f - at) > _SAME_FREQUENCY * at):
        return False
    return point is None or all(item in p for item in point_key(point))


@dataclass(frozen=True)
class ByState:
    """Results of each frequency and each point."""

    by_frequency: tuple[StateResult, ...] = ()
    by_point: tuple[StateResult, ...] = ()


def by_state(collected: Collected, head: Headline, signs: Callable[[int], Signs]) -> ByState:
    """Results with inductances of their own, where there are two frequencies or points, or more."""
    if head.apart is None:
        return ByState()
    seen = collected.alternating
    results = {}
    for f, p in seen:
        group, state = head.apart.states.group(f, p), head.apart.states.state(f, p)
        windings = winding_results(head.apart, group, state, None)
        results[f, p] = StateResult(windings, pair_results(head.apart, signs(group), group, state), f)
    frequencies, points = {f for f, _ in seen}, {p for _, p in seen}
    listed = tuple(results[s] for s in seen) if len(frequencies) > 1 else ()
    pointed: tuple[StateResult, ...] = ()
    if len(points) > 1:
        pointed = tuple(
            StateResult(results[s].windings, results[s].pairs, s[0], dict(s[1])) for s in seen if s in results
        )
    return ByState(listed, pointed)


def nothing_read(device: Device, signs: Signs) -> tuple[Mapping[str, WindingResult], tuple[PairResult, ...]]:
    """Windings and pairs of which only signs are known."""
    windings = {w.name: WindingResult((w.first, w.second)) for w in device.windings}
    pairs = []
    for i, j in combinations(range(len(device.windings)), 2):
        word = signs.verdict(i, j)
        polarity = Polarity(word, float(signs.same[i, j]), pair_dots(device, i, j, word))
        pairs.append(PairResult((device.windings[i].name, device.windings[j].name), polarity))
    return windings, tuple(pairs)
