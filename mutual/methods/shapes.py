"""Which of the circuits that textbooks have a formula for a hookup makes, found from its graph alone."""

from __future__ import annotations

from dataclasses import dataclass

from mutual.device import Device, Hookup, merged_nodes

Edge = tuple[int, int]


@dataclass(frozen=True)
class Shape:
    """Windings in one chain, or two side by side, with the rest open or shorted.

    Two hookups of equal shape must show the same inductance, so equal shapes are repeats of one another.

    Attributes
    ----------
    kind : {"series", "parallel"}
        A winding alone is a series of one.
    windings : tuple of int
        Positions in the device of the windings that carry the meter's current, ascending.
    signs : tuple of int
        +1 or -1 for each of them: whether it is passed from its first lead to its second, as the
        first one is. The first sign is +1, since turning the whole chain round changes nothing.
    shorted : tuple of int
        Positions of the windings whose two leads are joined.
    """

    kind: str
    windings: tuple[int, ...]
    signs: tuple[int, ...]
    shorted: tuple[int, ...] = ()


def alone(winding: int, shorted: tuple[int, ...] = ()) -> Shape:
    """The shape of one winding at the meter."""
    return Shape("series", (winding,), (1,), shorted)


def both(kind: str, first: int, second: int, sign: int) -> Shape:
    """The shape of two windings, `first` before `second` in the device, the first leads alike for `sign` +1.

    In series the inductance is L1 + L2 + 2 sign M, in parallel (L1 L2 - M^2)/(L1 + L2 - 2 sign M).
    """
    return Shape(kind, (first, second), (1, sign))


def recognise(device: Device, hookup: Hookup) -> Shape | None:
    """The shape that a hookup makes of a device.

    Parameters
    ----------
    device : Device
    hookup : Hookup
        Any; `sense` is not looked at, as a voltmeter carries no current.

    Returns
    -------
    Shape or None
        None where no textbook formula of two windings serves: rings, bridges, chains beside other windings.
    """
    node, edges = _graph(device, hookup)
    start, end = (node[lead] for lead in hookup.across)
    shorted = tuple(i for i, (a, b) in edges.items() if a == b)
    carrying = _without_dead_ends({i: e for i, e in edges.items() if i not in shorted}, {start, end})
    found = _parallel(carrying, start, end) or _chain(carrying, start, end)
    if found is None:
        return None
    kind, signs = found
    windings = tuple(sorted(signs))
    turn = signs[windings[0]]
    return Shape(kind, windings, tuple(turn * signs[i] for i in windings), shorted)


def induced(device: Device, hookup: Hookup) -> tuple[int, int, int] | None:
    """Which winding is driven and which is sensed, where that is one of each with nothing else carrying current.

    Parameters
    ----------
    device : Device
    hookup : Hookup

    Returns
    -------
    (int, int, int) or None
        Positions of the driven and of the sensed winding, and the sign by which the transfer
        inductance must be multiplied to give M between their first leads.
    """
    shape = recognise(device, hookup)
    if hookup.sense is None or shape is None or len(shape.windings) > 1 or shape.shorted:
        return None
    node, edges = _graph(device, hookup)
    (driven,) = shape.windings
    plus, minus = (node[lead] for lead in hookup.sense)
    for winding, (a, b) in edges.items():
        if winding != driven and {a, b} == {plus, minus}:
            into_first_lead = edges[driven][0] == node[hookup.across[0]]
            return driven, winding, 1 if into_first_lead == (a == plus) else -1
    return None


def _graph(device: Device, hookup: Hookup) -> tuple[dict[str, int], dict[int, Edge]]:
    """Nodes of the leads, and of each winding the nodes of its first and second lead."""
    earth = tuple((device.earthed[0], lead) for lead in device.earthed[1:])
    node = merged_nodes(device.leads, hookup.tied + earth)
    return node, {i: (node[w.first], node[w.second]) for i, w in enumerate(device.windings)}


def _without_dead_ends(edges: dict[int, Edge], kept: set[int]) -> dict[int, Edge]:
    """The windings left when those that hang on one end only, which carry no current, are taken away."""
    while True:
        ends = [n for edge in edges.values() for n in edge]
        dead = {i for i, edge in edges.items() if any(ends.count(n) == 1 and n not in kept for n in edge)}
        if not dead:
            return edges
        edges = {i: edge for i, edge in edges.items() if i not in dead}


def _parallel(edges: dict[int, Edge], start: int, end: int) -> tuple[str, dict[int, int]] | None:
    if len(edges) != 2 or any({a, b} != {start, end} for a, b in edges.values()):
        return None
    return "parallel", {i: 1 if a == start else -1 for i, (a, _) in edges.items()}


def _chain(edges: dict[int, Edge], start: int, end: int) -> tuple[str, dict[int, int]] | None:
    """Walk from the meter's first lead to its second; the only way must take in every winding that is left."""
    signs: dict[int, int] = {}
    at = start
    while at != end:
        ways = [i for i, edge in edges.items() if at in edge and i not in signs]
        if len(ways) != 1:
            return None
        a, b = edges[ways[0]]
        signs[ways[0]], at = (1, b) if a == at else (-1, a)
    return ("series", signs) if signs and len(signs) == len(edges) else None
