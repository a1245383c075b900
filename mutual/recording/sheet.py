"""A recording to fill in by hand: which hookups are worth reading, with the values left empty."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

from mutual.device import Device, Hookup, Winding
from mutual.errors import RefusedInput
from mutual.recording.hookups import check
from mutual.recording.write import head, preface, table
from mutual.units import printed, unit_of

# With the mark kept, these stay comments: the user takes the second `#` away and writes what the data sheet says.
_ACCURACY = (
    "# What the meter's data sheet says; take the inner # away and correct it:",
    "# [meter]",
    '# gain = "0.1 %"',
    '# floor = ["5 nH", "1 mohm"]',
    '# noise = ["1 nH", "0.5 mohm"]',
)


def sheet(
    device: Device, *, frequency: float | None = None, inductance_unit: str = "H", resistance_unit: str = "ohm"
) -> str:
    """Text of a recording with hookups written and values empty.

    Parameters
    ----------
    device : Device
    frequency : float, optional
        Test frequency in Hz, written into every row.
    inductance_unit, resistance_unit : str
        Such as "uH" and "mohm".

    Raises
    ------
    RefusedInput
        A unit is none of an inductance or resistance.
    """
    inductance, resistance = unit_of(inductance_unit, "H"), unit_of(resistance_unit, "ohm")
    at = "" if frequency is None else printed(frequency, unit_of("Hz"))
    titles = [
        "across", "tied", "frequency [Hz]", f"inductance [{inductance.symbol}]", f"resistance [{resistance.symbol}]",
    ]  # fmt: skip
    rows = [
        ["-".join(h.across), " ".join("-".join(pair) for pair in h.tied), at, "", ""] for h in hookups_to_read(device)
    ]
    return preface([*head(device), *_ACCURACY]) + table(titles, rows)


def hookups_to_read(device: Device) -> tuple[Hookup, ...]:
    """Each winding alone, each pair in series both ways, each winding with each other one shorted.

    Where two windings share a lead they are in series one way only, so they are put in parallel as well; where the
    shared lead is internal, one of the others is joined to a third. Hookups that the device does not allow, or that
    are another one once more, are left out.
    """
    found: dict[tuple[frozenset[str], frozenset[frozenset[str]]], Hookup] = {}
    for hookup in _candidates(device):
        same = (frozenset(hookup.across), frozenset(map(frozenset, hookup.tied)))
        try:
            check(device, hookup)
        except RefusedInput:
            continue
        found.setdefault(same, hookup)
    return tuple(found.values())


def _candidates(device: Device) -> Iterator[Hookup]:
    for w in device.windings:
        yield Hookup((w.first, w.second))
    for one, two in combinations(device.windings, 2):
        yield from _in_series(device, one, two)
    for one, two in combinations(device.windings, 2):
        yield Hookup((one.first, one.second), ((two.first, two.second),))
        yield Hookup((two.first, two.second), ((one.first, one.second),))


def _in_series(device: Device, one: Winding, two: Winding) -> Iterator[Hookup]:
    shared = {one.first, one.second} & {two.first, two.second}
    if not shared:
        yield Hookup((one.first, two.second), ((one.second, two.first),))
        yield Hookup((one.first, two.first), ((one.second, two.second),))
        return
    (joint,) = shared
    a = one.second if one.first == joint else one.first
    b = two.second if two.first == joint else two.first
    yield Hookup((a, b))
    yield Hookup((a, joint), ((a, b),))
    if joint in device.internal:
        for third in device.windings:
            if joint in (third.first, third.second) and third not in (one, two):
                yield Hookup((a, b), ((b, third.second if third.first == joint else third.first),))
