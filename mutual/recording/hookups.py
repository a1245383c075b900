"""Cells `across`, `tied` and `sense` -> a checked hookup."""

from __future__ import annotations

import re
from itertools import pairwise

from mutual.device import Device, Hookup, Winding, check_hookup, merged_nodes
from mutual.errors import RefusedInput
from mutual.quoting import listed, nearest, shown

Pair = tuple[str, str]

_MONTHS = (
    "jan|j\u00e4n|feb|fev|f\u00e9v|mar|m\u00e4r|mrz|apr|abr|avr|may|mai|mag|maj|mei|jun|jui|giu|jul|lug|aug|ago|aou|ao\u00fb|"
    "sep|set|oct|okt|out|ott|nov|dec|dez|dic|d\u00e9c"
)
_DATE = re.compile(
    rf"""(?: [0-9]{{1,2}}[-. /]{{1,2}}(?:{_MONTHS})[a-z]{{0,6}}\.?(?:[-. /][0-9]{{2,4}})?
           | (?:{_MONTHS})[a-z]{{0,6}}\.?[-. /][0-9]{{1,4}}
           | [0-9]{{4}}[-/.][0-9]{{1,2}}[-/.][0-9]{{1,2}}(?:[ T][0-9:.]*)?
           | [0-9]{{1,2}}[-/.][0-9]{{1,2}}[-/.](?:[0-9]{{4}}|[0-9]{{2}})(?:[ T][0-9:.]*)? )""",
    re.IGNORECASE | re.VERBOSE,
)
_DASHES = dict.fromkeys(map(ord, "\u2010\u2011\u2012\u2013\u2014\u2212"), "-")


class Hookups:
    """Hookups of one device, each checked once however many rows have it."""

    def __init__(self, device: Device) -> None:
        self.device = device
        self._leads = frozenset(device.leads)
        self._known: dict[tuple[str, str, str, bool], Hookup] = {}

    def read(self, across: str, tied: str, sense: str, reads_open: bool) -> Hookup:
        """The hookup that three cells describe.

        Parameters
        ----------
        across, tied, sense : str
            Texts of the cells; `tied` and `sense` may be empty.
        reads_open : bool
            Whether the reading says that nothing conducts between the `across` leads.

        Raises
        ------
        RefusedInput
            Unknown lead, a shorted meter, one left open (or one that reads open where a winding conducts), ...;
            `column` says which cell.
        """
        key = (across, tied, sense, reads_open)
        if key not in self._known:
            self._known[key] = self._read(*key)
        return self._known[key]

    def _read(self, across: str, tied: str, sense: str, reads_open: bool) -> Hookup:
        ties = [tied] if _DATE.fullmatch(tied.strip()) else tied.split()
        hookup = Hookup(
            self._pair("across", across.strip()),
            tuple(self._pair("tied", tie) for tie in ties),
            self._pair("sense", sense.strip()) if sense.strip() else None,
        )
        check(self.device, hookup, reads_open)
        return hookup

    def _pair(self, column: str, text: str) -> Pair:
        """Two leads; what is written otherwise is refused with the likeliest reason."""
        leads = text.split("-")
        if len(leads) == 2 and self._leads.issuperset(leads):
            return leads[0], leads[1]
        if not text:
            raise RefusedInput("no leads are named", column=column, found="an empty cell", expected="such as A-B")
        if _DATE.fullmatch(text):
            raise RefusedInput(
                "a spreadsheet has turned the names of leads into a date",
                column=column,
                found=shown(text),
                expected="two leads such as 1-2; format the column as text, or name the leads L1, L2, ...",
            )
        if len(leads) != 2 or not all(leads):
            dash = text.translate(_DASHES)
            hint = "such as A-B" if dash == text else f"{shown(dash)}, with a plain hyphen"
            raise RefusedInput("not two leads", column=column, found=shown(text), expected=hint)
        stranger = next(lead for lead in leads if lead not in self._leads)
        near = nearest(stranger, self.device.leads)
        raise RefusedInput(
            f"unknown lead {shown(stranger)}",
            column=column,
            found=shown(text),
            expected=f"leads among {listed(self.device.leads)} (nearest: {near})",
        )


def check(device: Device, hookup: Hookup, reads_open: bool = False) -> None:
    """Check a hookup as `check_hookup` does, and against earthed leads and a reading of `open`.

    Raises
    ------
    RefusedInput
    """
    checked = device
    if reads_open:
        # For the reading `open` it is right that nothing joins the leads: all other checks hold as ever.
        if conducts(device, hookup):
            raise RefusedInput(
                "the reading says open, but windings and ties join the two leads",
                column="resistance",
                found=str(hookup),
                expected="a resistance, or other windings",
            )
        checked = Device(device.name, (*device.windings, Winding("", *hookup.across)), leads=device.leads,
                         internal=device.internal)  # fmt: skip
    check_hookup(checked, hookup)
    earth = merged_nodes(device.leads, (*hookup.tied, *pairwise(device.earthed)))
    if earth[hookup.across[0]] == earth[hookup.across[1]]:
        raise RefusedInput("the leads that are earthed short the meter", column="across", found=str(hookup))


def conducts(device: Device, hookup: Hookup) -> bool:
    """Whether the declared windings and the ties join the `across` leads."""
    wires = tuple((w.first, w.second) for w in device.windings)
    part = merged_nodes(device.leads, (*hookup.tied, *wires))
    return all(lead in part for pair in (hookup.across, *hookup.tied) for lead in pair) and (
        part[hookup.across[0]] == part[hookup.across[1]]
    )
