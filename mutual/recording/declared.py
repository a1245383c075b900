"""What a preface declares: format, device, windings, ties, limits, and which accuracy tables there are."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable, Mapping
from typing import Any

from mutual.device import ARRANGEMENTS, FORBIDDEN_IN_NAMES, Device, Winding
from mutual.errors import RefusedInput
from mutual.quoting import has_control, nearest, shown
from mutual.recording.accuracy import accuracy
from mutual.recording.columns import DEFAULT_INSTRUMENTS
from mutual.recording.model import Accuracy
from mutual.recording.preface import Preface, is_number
from mutual.units import parse

FORMAT = "mutual-recording-1"
KINDS = ("readings", "waveform")
FREE = ("notes", "captured")
KEYS = (
    "format", "kind", "device", "arrangement", "windings", "leads", "internal", "earthed", "ties", "loads",
    "shared_loss", "limits", "kick", *FREE,
)  # fmt: skip
# The unknowns grow with the square of the windings: far below this, memory has an end.
MOST_WINDINGS = 1000


def check_format(preface: Preface) -> None:
    """Refuse another format, one from the future, or a kind that is not read.

    Raises
    ------
    RefusedInput
    """
    found = preface.tables.get("format", FORMAT)
    if found != FORMAT:
        version = re.fullmatch(r"mutual-recording-([0-9]+)", str(found))
        reason = "this format is newer than the program" if version and int(version[1][:9]) > 1 else "unknown format"
        raise preface.refused(reason, "format", found=found, expected=shown(FORMAT))
    kind = preface.tables.get("kind", "readings")
    if kind not in KINDS:
        raise preface.refused("unknown kind", "kind", found=kind, expected=shown(nearest(str(kind), KINDS)))
    if kind == "waveform":
        raise preface.refused("waveform recordings are not read yet", "kind", found=kind, expected="'readings'")


def instruments_of(preface: Preface, used: Collection[str]) -> dict[str, Accuracy]:
    """The accuracy tables: those of the default names and those that the column `instrument` uses.

    Raises
    ------
    RefusedInput
        An unknown key of the preface, or a fault in a table.
    """
    names = [*DEFAULT_INSTRUMENTS, *used]
    for key, value in preface.tables.items():
        if key not in KEYS and key not in names:
            known = [*KEYS, *names] if not isinstance(value, Mapping) else [*names, *KEYS]
            why = "unknown table, and no row names such an instrument" if isinstance(value, Mapping) else "unknown key"
            raise preface.refused(why, key, found=key, expected=shown(nearest(key, known)))
    return {name: accuracy(preface, name) for name in preface.tables if name in names}


def device_of(preface: Preface) -> Device:
    """The device as declared.

    Raises
    ------
    RefusedInput
        Faults in windings, leads, arrangement, ties or shared loss; the key and its line are named.
    """
    tables = preface.tables
    if "loads" in tables:
        raise preface.refused("loads are not supported yet", "loads", expected="a device with nothing connected")
    name = tables.get("device", "")
    if not isinstance(name, str) or has_control(name):
        raise preface.refused("not a plain text", "device", found=name, expected="a name, without control characters")
    arrangement = tables.get("arrangement", "free")
    if arrangement not in ARRANGEMENTS:
        near = nearest(str(arrangement), ARRANGEMENTS)
        raise preface.refused("unknown arrangement", "arrangement", found=arrangement, expected=shown(near))
    windings = _windings(preface)
    own = [lead for w in windings for lead in (w.first, w.second)]
    leads = (*own, *_leads(preface, "leads", tables.get("leads", [])))
    known = set(leads)
    internal = _among(preface, "internal", known)
    earthed = _among(preface, "earthed", known)
    for lead in earthed:
        if lead in internal:
            raise preface.refused("an internal lead cannot be earthed by instruments", "earthed", found=lead)
    resistance, inductance = _ties(preface)
    return Device(name, windings, arrangement, leads, internal, earthed, resistance, inductance, _shared_loss(preface))


def _windings(preface: Preface) -> tuple[Winding, ...]:
    table = preface.tables.get("windings", {})
    example = 'pad = ["A", "B"]'
    if not isinstance(table, Mapping):
        raise preface.refused("this should be a table", "windings", found=table, expected=f"[windings] with {example}")
    if not table:
        missing = '[windings] in the preface, with a line such as pad = ["A", "B"], or --winding pad=A-B'
        raise RefusedInput("no winding is declared", line=preface.line_of("windings"), expected=missing)
    if len(table) > MOST_WINDINGS:
        raise preface.refused(
            "too many windings for one device", "windings", found=len(table), expected=f"{MOST_WINDINGS} at most"
        )
    windings: dict[frozenset[str], Winding] = {}
    for key, value in table.items():
        path = ("windings", str(key))
        check_name(preface, path, str(key), "a winding's name")
        ends = _leads(preface, path, value)
        if len(ends) != 2:
            raise preface.refused("a winding has two leads", *path, found=value, expected=f"two, as in {example}")
        if ends[0] == ends[1]:
            raise preface.refused("both ends of a winding are one lead", *path, found=ends[0], expected="two leads")
        twin = windings.get(frozenset(ends))
        if twin is not None:
            reason = f"winding {shown(twin.name)} already joins these leads, and nothing could tell the two apart"
            raise preface.refused(reason, *path, found="-".join(ends))
        windings[frozenset(ends)] = Winding(str(key), ends[0], ends[1])
    return tuple(windings.values())


def _leads(preface: Preface, path: str | tuple[str, ...], value: Any) -> tuple[str, ...]:
    """A list of leads; whole numbers are taken as names, since a spreadsheet may have lost the quotes."""
    path = (path,) if isinstance(path, str) else path
    if not isinstance(value, (list, tuple)):
        raise preface.refused("not a list of leads", *path, found=value, expected='such as ["A", "B"]')
    for lead in value:
        if not isinstance(lead, str) and (not isinstance(lead, int) or isinstance(lead, bool)):
            raise preface.refused("a lead's name is a text", *path, found=lead, expected='such as "A"')
        check_name(preface, path, str(lead), "a lead's name")
    return tuple(map(str, value))


def check_name(preface: Preface, path: tuple[str, ...], name: str, what: str) -> None:
    """Refuse a name of a lead or winding that hookups could not be written with.

    Raises
    ------
    RefusedInput
    """
    if not name:
        raise preface.refused(f"{what} is empty", *path)
    bad = next((c for c in name if c in FORBIDDEN_IN_NAMES or c.isspace() or not c.isprintable()), None)
    if bad is not None:
        raise preface.refused(
            f"{what} holds {shown(bad)}", *path, found=name, expected="no space, hyphen, comma, # or quote in it"
        )


def _among(preface: Preface, key: str, known: Iterable[str]) -> tuple[str, ...]:
    leads = _leads(preface, key, preface.tables.get(key, []))
    for lead in leads:
        if lead not in known:
            raise preface.refused("unknown lead", key, found=lead, expected=shown(nearest(lead, known)))
    return tuple(dict.fromkeys(leads))


def _ties(preface: Preface) -> tuple[float, float]:
    table = preface.tables.get("ties", {})
    if not isinstance(table, Mapping):
        raise preface.refused("this should be a table", "ties", found=table, expected="[ties]")
    units = {"resistance": "ohm", "inductance": "H"}
    sizes = dict.fromkeys(units, 0.0)
    for key, value in table.items():
        if key not in units:
            raise preface.refused("unknown key", "ties", key, found=key, expected=shown(nearest(key, units)))
        example = {"ohm": '"10 mohm"', "H": '"20 nH"'}[units[key]]
        try:
            sizes[key] = parse(value if isinstance(value, str) else "", units[key]).value
        except RefusedInput as error:
            raise preface.refused(error.reason, "ties", key, found=value, expected=example) from None
        if sizes[key] < 0.0:
            raise preface.refused("a wire's impedance cannot be negative", "ties", key, found=value, expected=example)
    return sizes["resistance"], sizes["inductance"]


def _shared_loss(preface: Preface) -> float:
    value = preface.tables.get("shared_loss", 0.1)
    if not is_number(value) or not 0.0 <= float(value) <= 1.0:
        raise preface.refused("out of range", "shared_loss", found=value, expected="a plain number from 0 to 1")
    return float(value)
