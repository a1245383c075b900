"""Slips that happen at a bench: what a row of readings may really have been.

Each alternative is the row as it should have been written down. Which slips are likely is
common practice, no source.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from mutual.device import Device, Hookup, check_hookup
from mutual.errors import RefusedInput
from mutual.methods.shown import SHOWN
from mutual.recording.model import Row, Value

_FACTORS = {
    1e3: "a thousand times too small (a prefix slip)",
    1e-3: "a thousand times too large (a prefix slip)",
    1e6: "a million times too small (a prefix slip)",
    1e-6: "a million times too large (a prefix slip)",
    10.0: "ten times too small (a slip of the decimal point)",
    0.1: "ten times too large (a slip of the decimal point)",
}
_PARALLEL = {
    "inductance": "parallel inductance",
    "resistance": "parallel resistance",
    "parallel inductance": "inductance",
    "parallel resistance": "resistance",
}


@dataclass(frozen=True)
class Alternative:
    """One slip.

    Attributes
    ----------
    text : str
        The slip in words, as a clause.
    rows : mapping as a tuple of (position, Row or None)
        Rows by their position among all, as they should have been; None takes the row out.
    penalty : float
        What its rarity and freedom count for beside chi-square.
    """

    text: str
    rows: tuple[tuple[int, Row | None], ...]
    penalty: float = 0.0


def of_hookup(device: Device, row: Row) -> Iterator[tuple[str, Hookup, float]]:
    """Other hookups that the row may really have had."""
    hookup = row.hookup
    seen = {_canonical(hookup)}
    for text, other, penalty in _hookups(device, hookup):
        key = _canonical(other)
        if key in seen:
            continue
        seen.add(key)
        try:
            check_hookup(device, other)
        except RefusedInput:
            continue
        yield text, other, penalty


def _hookups(device: Device, hookup: Hookup) -> Iterator[tuple[str, Hookup, float]]:
    tied = hookup.tied
    for a in range(len(tied)):
        for b in range(a + 1, len(tied)):
            (p, q), (r, s) = tied[a], tied[b]
            rest = tuple(t for k, t in enumerate(tied) if k not in (a, b))
            for one, two in (((p, s), (r, q)), ((p, r), (q, s))):
                yield "two ties were exchanged", replace(hookup, tied=(one, two, *rest)), 0.0
    for winding in device.windings:
        turn = {winding.first: winding.second, winding.second: winding.first}
        turned = Hookup(
            _swapped(hookup.across, turn),
            tuple(_swapped(t, turn) for t in tied),
            None if hookup.sense is None else _swapped(hookup.sense, turn),
        )
        yield f"the leads of {winding.name} were exchanged", turned, 0.0
    for k, tie in enumerate(tied):
        rest = tuple(t for j, t in enumerate(tied) if j != k)
        yield f"the tie {tie[0]}-{tie[1]} was left open", replace(hookup, tied=rest), 1.0
    for winding in device.windings:
        short = (winding.first, winding.second)
        yield f"{winding.name} was shorted", replace(hookup, tied=(*tied, short)), 1.0


def _swapped(pair: tuple[str, str], turn: dict[str, str]) -> tuple[str, str]:
    return turn.get(pair[0], pair[0]), turn.get(pair[1], pair[1])


def _canonical(hookup: Hookup) -> tuple[object, ...]:
    """Equal for hookups that are the same circuit seen the same way."""
    parent: dict[str, str] = {}

    def root(lead: str) -> str:
        while parent.setdefault(lead, lead) != lead:
            lead = parent[lead]
        return lead

    for a, b in hookup.tied:
        parent[root(b)] = root(a)
    nodes: dict[str, set[str]] = {}
    for lead in list(parent):
        nodes.setdefault(root(lead), set()).add(lead)
    ties = frozenset(frozenset(n) for n in nodes.values())

    def node(lead: str) -> frozenset[str]:
        return next((n for n in ties if lead in n), frozenset([lead]))

    across = (node(hookup.across[0]), node(hookup.across[1]))
    if hookup.sense is None:
        # An impedance is the same either way round.
        return ties, frozenset(across)
    sense = (node(hookup.sense[0]), node(hookup.sense[1]))
    return ties, frozenset([(across, sense), (across[::-1], sense[::-1])])


def of_row(device: Device, rows: Sequence[Row], position: int) -> Iterator[Alternative]:
    """All likely slips of one row that say what the row should have been."""
    row = rows[position]
    columns = [name for name in row.values if name in SHOWN]
    for text, hookup, penalty in of_hookup(device, row):
        yield Alternative(text, ((position, replace(row, hookup=hookup)),), penalty)
    for name in columns:
        for factor, words in _FACTORS.items():
            value = row.values[name]
            step = None if value.step is None else value.step * factor
            fixed = {**row.values, name: Value(value.value * factor, step)}
            penalty = 0.0 if factor in (1e3, 1e-3) else 2.0
            yield Alternative(f"the {name} is {words}", ((position, replace(row, values=fixed)),), penalty)
    if any(name in _PARALLEL for name in columns) and row.frequency:
        other = {_PARALLEL.get(name, name): value for name, value in row.values.items()}
        meant = "parallel" if any(name in ("inductance", "resistance") for name in columns) else "series"
        text = f"the meter showed the {meant} equivalent"
        yield Alternative(text, ((position, replace(row, values=other)),), 1.0)


def of_two(rows: Sequence[Row], first: int, second: int) -> Iterator[Alternative]:
    """Slips between two rows: their values exchanged."""
    a, b = rows[first], rows[second]
    if set(a.values) != set(b.values) or a.hookup == b.hookup:
        return
    text = f"its values and those of row {b.number} were exchanged"
    yield Alternative(text, ((first, replace(a, values=b.values)), (second, replace(b, values=a.values))), 1.0)


def unexplained(device: Device, rows: Sequence[Row], position: int) -> Iterator[Alternative]:
    """Slips that leave open what the row should have been: the reading tells nothing then."""
    row = rows[position]
    twins = [
        other.number
        for k, other in enumerate(rows)
        if k != position and other.hookup != row.hookup and other.frequency == row.frequency and _same_values(row, other)
    ]
    gone = ((position, None),)
    if twins:
        yield Alternative(f"its value is that of row {twins[0]}, typed twice", gone, 0.0)
    if len(_involved(device, row.hookup)) > 1:
        yield Alternative("the windings stood differently at this reading (a coil moved)", gone, 10.0)
    yield Alternative("this reading alone contradicts the others, by no slip that the program knows", gone, 14.0)


def _same_values(row: Row, other: Row) -> bool:
    shared = [n for n in row.values if n in SHOWN and n in other.values]
    return bool(shared) and all(row.values[n].value == other.values[n].value for n in shared)


def _involved(device: Device, hookup: Hookup) -> set[str]:
    """Windings that a lead of the hookup belongs to."""
    leads = {*hookup.across, *(x for t in hookup.tied for x in t), *(hookup.sense or ())}
    return {w.name for w in device.windings if w.first in leads or w.second in leads}


def pair_of(device: Device, hookup: Hookup) -> tuple[int, int]:
    """The two windings a hookup is about, for the answer if it is mended."""
    found = sorted(device.index(name) for name in _involved(device, hookup))
    if len(found) >= 2:
        return found[0], found[1]
    other = next(k for k in range(len(device.windings)) if k not in found)
    return tuple(sorted((found[0] if found else 0, other)))  # type: ignore[return-value]
