"""Leads, windings and hookups: what is joined to what, with no numbers in it."""

from __future__ import annotations

from dataclasses import dataclass

from mutual.errors import RefusedInput

ARRANGEMENTS = ("free", "one limb", "three-phase")
FORBIDDEN_IN_NAMES = " -,#\"'"


@dataclass(frozen=True)
class Winding:
    """Two leads joined by one conductor; the order of the leads gives the sign of M."""

    name: str
    first: str
    second: str


@dataclass(frozen=True)
class Hookup:
    """How the device is wired for one reading.

    Attributes
    ----------
    across : (str, str)
        Where the meter or source sits; the first lead is its positive terminal.
    tied : tuple of (str, str)
        Leads joined by wire.
    sense : (str, str) or None
        Where a voltage is sensed; the first lead is its positive terminal.
    """

    across: tuple[str, str]
    tied: tuple[tuple[str, str], ...] = ()
    sense: tuple[str, str] | None = None

    def __str__(self) -> str:
        text = "-".join(self.across)
        if self.tied:
            text += " tied " + " ".join("-".join(pair) for pair in self.tied)
        if self.sense is not None:
            text += " sense " + "-".join(self.sense)
        return text


@dataclass(frozen=True)
class Device:
    """The device under test as declared.

    Attributes
    ----------
    name : str
        Free text.
    windings : tuple of Winding
        In the order of the preface.
    arrangement : {"free", "one limb", "three-phase"}
    leads : tuple of str
        All leads, those of windings first in order, then further ones named by `leads`.
    internal : tuple of str
        Leads that nothing can be connected to.
    earthed : tuple of str
        Leads that the instruments join to earth.
    tie_resistance, tie_inductance : float
        Largest impedance of each wire of `tied`, ohm and H.
    shared_loss : float
        Bound of mutual resistance as a fraction of sqrt(R1 R2) where the data leave it open.
    """

    name: str
    windings: tuple[Winding, ...]
    arrangement: str = "free"
    leads: tuple[str, ...] = ()
    internal: tuple[str, ...] = ()
    earthed: tuple[str, ...] = ()
    tie_resistance: float = 0.0
    tie_inductance: float = 0.0
    shared_loss: float = 0.1

    def __post_init__(self) -> None:
        names: list[str] = []
        for winding in self.windings:
            names += [winding.first, winding.second]
        object.__setattr__(self, "leads", tuple(dict.fromkeys([*names, *self.leads])))

    def index(self, name: str) -> int:
        """Position of the winding called `name`.

        Raises
        ------
        KeyError
            No such winding.
        """
        for i, winding in enumerate(self.windings):
            if winding.name == name:
                return i
        raise KeyError(name)


def merged_nodes(leads: tuple[str, ...], joined: tuple[tuple[str, str], ...]) -> dict[str, int]:
    """Number the nodes that remain when pairs of leads are joined (union of sets), in order of appearance."""
    parent = {lead: lead for lead in leads}

    def root(lead: str) -> str:
        while parent[lead] != lead:
            lead = parent[lead]
        return lead

    for a, b in joined:
        parent[root(b)] = root(a)
    order: dict[str, int] = {}
    return {lead: order.setdefault(root(lead), len(order)) for lead in leads}


def check_hookup(device: Device, hookup: Hookup) -> None:
    """Refuse a hookup that the declared windings make impossible or senseless.

    Raises
    ------
    RefusedInput
        Unknown or internal lead, a lead paired with itself, a meter that is shorted by
        the ties or left open, or a sensed voltage that nothing defines.
    """
    pairs = [("across", hookup.across), *(("tied", pair) for pair in hookup.tied)]
    if hookup.sense is not None:
        pairs.append(("sense", hookup.sense))
    for column, (a, b) in pairs:
        for lead in (a, b):
            if lead not in device.leads:
                raise RefusedInput(
                    "unknown lead", column=column, found=repr(lead), expected=f"one of {', '.join(device.leads)}"
                )
            if lead in device.internal:
                raise RefusedInput(
                    "an internal lead, to which nothing can be connected, is used", column=column, found=repr(lead)
                )
        if a == b:
            raise RefusedInput("a lead is paired with itself", column=column, found=f"{a}-{b}")
    node = merged_nodes(device.leads, hookup.tied)
    wires = tuple((w.first, w.second) for w in device.windings)
    part = merged_nodes(device.leads, hookup.tied + wires)
    a, b = hookup.across
    if node[a] == node[b]:
        raise RefusedInput("the ties short the meter", column="tied", found=str(hookup))
    if part[a] != part[b]:
        raise RefusedInput(
            "no winding or tie joins the two leads, so the meter is left open", column="across", found=str(hookup)
        )
    if hookup.sense is not None and part[hookup.sense[0]] != part[hookup.sense[1]]:
        raise RefusedInput(
            "no winding or tie joins the sensed leads, so their voltage is not defined",
            column="sense",
            found=str(hookup),
        )
