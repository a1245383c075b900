"""What else a hookup may have been: ties exchanged, leads swapped, a tie left open, a winding shorted."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from mutual.circuit import compile_hookups, solve
from mutual.device import Device, Hookup, check_hookup
from mutual.errors import RefusedInput

Signature = tuple[complex, ...]


@dataclass(frozen=True)
class Shows:
    """Whether a row has values of the impedance itself, and of the transfer impedance to its sensed leads."""

    own: bool
    transfer: bool


@dataclass(frozen=True)
class Rewired:
    """Another hookup, and the slip that leads to it, as a clause without the hookup.

    `swapped` names the winding whose leads were exchanged, where that is the slip.
    """

    text: str
    hookup: Hookup
    swapped: str | None = None


class Rewiring:
    """Other hookups of one device.

    Parameters
    ----------
    device : Device
    """

    def __init__(self, device: Device) -> None:
        self.device = device
        self._found: dict[tuple[Hookup, Shows], list[Rewired]] = {}
        self._signatures: dict[tuple[Hookup, Shows], Signature] = {}

    def others(self, hookup: Hookup, shows: Shows) -> list[Rewired]:
        """Hookups one slip away that show something else; one for each circuit."""
        if (hookup, shows) in self._found:
            return self._found[hookup, shows]
        groups: dict[Signature, list[Rewired]] = {}
        for other in _one_slip_away(self.device, hookup):
            try:
                check_hookup(self.device, other.hookup)
            except RefusedInput:
                continue
            groups.setdefault(self.signature(other.hookup, shows), []).append(other)
        groups.pop(self.signature(hookup, shows), None)
        self._found[hookup, shows] = [_joined(group) for group in groups.values()]
        return self._found[hookup, shows]

    def signature(self, hookup: Hookup, shows: Shows) -> Signature:
        """What a hookup shows of a device that was made up: equal for hookups that show the same of every device."""
        key = (hookup, shows)
        if key not in self._signatures:
            n = len(self.device.windings)
            rng = np.random.default_rng(11)
            wanted = [replace(hookup, sense=None)] * shows.own + [hookup] * shows.transfer
            made = [a @ a.T + np.eye(n) for a in rng.uniform(-1, 1, (2, n, n))]
            loss, flux = (np.broadcast_to(a, (len(wanted), n, n)) for a in made)
            compiled = compile_hookups(self.device, wanted)
            response = solve(compiled, np.arange(len(wanted)), flux, loss, np.ones(len(wanted)))
            self._signatures[key] = tuple(complex(round(z.real, 9), round(z.imag, 9)) for z in response.impedance)
        return self._signatures[key]


def _joined(group: list[Rewired]) -> Rewired:
    """One entry for the slips that lead to one circuit: the likeliest words."""
    first = group[0]
    if first.swapped is None:
        return first
    names = list(dict.fromkeys(r.swapped for r in group if r.swapped is not None))
    return replace(first, text=f"the leads of {' or of '.join(names)} were exchanged")


def _one_slip_away(device: Device, hookup: Hookup) -> Iterator[Rewired]:
    """Likelier slips first."""
    tied = hookup.tied
    for a in range(len(tied)):
        for b in range(a + 1, len(tied)):
            (p, q), (r, s) = tied[a], tied[b]
            rest = tuple(t for k, t in enumerate(tied) if k not in (a, b))
            for one, two in (((p, s), (r, q)), ((p, r), (q, s))):
                yield Rewired("two ties were exchanged", replace(hookup, tied=(one, two, *rest)))
    for winding in device.windings:
        turn = {winding.first: winding.second, winding.second: winding.first}
        sense = None if hookup.sense is None else _swapped(hookup.sense, turn)
        turned = Hookup(_swapped(hookup.across, turn), tuple(_swapped(t, turn) for t in tied), sense)
        yield Rewired("", turned, winding.name)
    for k, tie in enumerate(tied):
        rest = tuple(t for j, t in enumerate(tied) if j != k)
        yield Rewired(f"the tie {tie[0]}-{tie[1]} was left open", replace(hookup, tied=rest))
    for winding in device.windings:
        short = (winding.first, winding.second)
        yield Rewired(f"{winding.name} was shorted as well", replace(hookup, tied=(*tied, short)))


def _swapped(pair: tuple[str, str], turn: dict[str, str]) -> tuple[str, str]:
    return turn.get(pair[0], pair[0]), turn.get(pair[1], pair[1])
