"""Findings: what the user should know of the estimate, and what would help."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from mutual.collect import Collected
from mutual.headline import Headline
from mutual.quantities import pair_measures
from mutual.result import Consistency, Finding, PairResult, Quantity, WindingResult

_CLOSURE = 0.05
_SHARED_NOTABLE = 0.1
_LOW_Q = 5.0


def reasons(
    collected: Collected,
    head: Headline,
    windings: Mapping[str, WindingResult],
    pairs: Sequence[PairResult],
    consistency: Consistency,
) -> list[Finding]:
    """All findings about one estimate."""
    out = list(_accuracy(collected, head))
    if head.group is not None:
        out += _nulls(windings, pairs)
        out += _losses(head)
        out += _shorts(head)
    return out


def _accuracy(collected: Collected, head: Headline) -> Iterator[Finding]:
    tables = {item.accuracy.name: item.accuracy for item in collected.items}
    for name, table in tables.items():
        if not table.stated:
            text = (
                f"no accuracy is stated for {name!r}: the bounds hold repeats and the last printed digit alone, "
                "and the instrument's own error is in neither; state it, e.g. gain = \"0.3 %\""
            )
            yield Finding("caution", "no accuracy", text)
        if table.gain is not None or table.phase is not None:
            text = (
                f"{name!r}: how its error splits into a part common to all readings and a part of each is not stated; "
                "both extremes were computed and the wider bound of each quantity is given "
                "(gain_common and gain_each state it)"
            )
            yield Finding("note", "gain split unknown", text)
    if not all(t.stated for t in tables.values()):
        miss = _closure(head)
        if miss > _CLOSURE:
            text = (
                f"the readings miss one another by up to {100 * miss:.1f} %, more than any meter should; "
                "check the hookups"
            )
            yield Finding("caution", "closure", text)


def _closure(head: Headline) -> float:
    """Largest relative distance of a reading from the fit."""
    free = head.joint.main.main.free
    values = head.joint.main.main.problem.body.values
    size = np.maximum(np.abs(values), 1e-300)
    return float(np.max(np.abs(values - free.prediction.values) / size, initial=0.0))


def _nulls(windings: Mapping[str, WindingResult], pairs: Sequence[PairResult]) -> Iterator[Finding]:
    missing, sided = [], []
    for name, winding in windings.items():
        if winding.inductance is None:
            missing.append(f"inductance {name}")
    for pair in pairs:
        both = " ".join(pair.windings)
        quantities: tuple[tuple[str, Quantity | None], ...] = (
            ("mutual", pair.mutual_magnitude),
            ("coupling", pair.coupling),
        )
        for word, q in quantities:
            if q is None:
                missing.append(f"{word} {both}")
            elif q.bound != "both" and q.standard_uncertainty is None:
                sided.append(f"{word} {both} is known from one side only: at {_side(q)}")
        if pair.mutual_magnitude is not None and pair.mutual is None:
            text = (
                f"only the magnitude of M between {pair.windings[0]} and {pair.windings[1]} is known: either sign "
                "explains the readings. "
                "Two readings in series, one way and the other, or a kick, would tell"
            )
            yield Finding("note", "sign", text)
    if missing:
        text = f"not determined by these readings: {', '.join(missing)}"
        yield Finding("note", "undetermined", text)
    for text in sided:
        yield Finding("note", "bounded", text)


def _side(q: Quantity) -> str:
    return f"least {q.lower:.4g}" if q.bound == "lower" and q.lower is not None else f"most {q.upper or 0:.4g}"


def _losses(head: Headline) -> Iterator[Finding]:
    """What open mutual resistances do to k."""
    main, names = head.joint.main, head.joint.names
    for shared in main.shared:
        group = head.group or 0
        measure = pair_measures(main.unknowns, names, group, shared.i, shared.j).coupling
        alone, _ = main.main.bounds.interval(measure), ""
        whole, _ = main.interval(measure)
        if alone is None or whole is None:
            continue
        added = (whole.upper - whole.lower) - (alone.upper - alone.lower)
        if added < _SHARED_NOTABLE * (alone.upper - alone.lower):
            continue
        pair = f"{names[shared.i]} and {names[shared.j]}"
        if shared.most is not None:
            text = (
                f"losses that {pair} may share (core, shield, a plate nearby) are not told from M by these readings; "
                "with what their resistances exceed those to direct current, k lies in "
                f"{whole.lower:.4g} to {whole.upper:.4g}"
            )
        else:
            most = main.over_shared(measure, alone, 1.0)[0]
            low, high = most.lower, most.upper
            text = (
                f"losses that {pair} may share (core, shield, a plate nearby) are not told from M by these readings; "
                f"taken as at most {main.part:g} of sqrt(R1 R2) (shared_loss), k lies in {whole.lower:.4g} to "
                f"{whole.upper:.4g}; at 1 it would lie in {low:.4g} to {high:.4g}. The open and short readings of the "
                "other side as well would tell"
            )
        yield Finding("note", "losses shared", text)


def _shorts(head: Headline) -> Iterator[Finding]:
    """Windings shorted in a reading whose own resistance was not read, or makes the lossless formula wrong."""
    main, names = head.joint.main, head.joint.names
    u, free = main.unknowns, main.main.free
    bears = np.zeros(u.size, dtype=bool)
    bears[free.free] = np.linalg.norm(free.jacobian, axis=0) > 1e-9
    for f, omega in enumerate(u.omegas):
        for i, name in enumerate(names):
            position = u.resistance(f, i, i)
            if omega == 0 or not bears[position]:
                continue
            if u.squared[position]:
                text = (
                    f"{name} is shorted in a reading and nothing was read of its resistance: k is at least what the "
                    "lossless formula says, and more if it is resistive. A resistance or Q of that reading would tell; "
                    "losses shared between windings are taken as nil"
                )
                yield Finding("caution", "resistive short", text)
            elif main.main.problem.body.linear is False:
                own = float(main.main.best.theta[u.inductance(head.group or 0, i, i)])
                loss = float(main.main.best.theta[position])
                closed = main.main.problem.body.closed
                if closed and loss > 0 and omega * own / loss < _LOW_Q:
                    text = (
                        f"{name} has a Q of {omega * own / loss:.2g} where it is shorted: the formula "
                        "sqrt(1 - Ls/L) is wrong there; the estimate takes the resistance into account"
                    )
                    yield Finding("note", "resistive short", text)
