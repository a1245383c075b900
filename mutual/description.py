"""Reading the TOML file of a described device (interface contract, section 2.4)."""

from __future__ import annotations

import os
import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import Any

from mutual.described import FORMAT, NOTHING, Described, Planned, Table
from mutual.device import Device
from mutual.errors import RefusedInput
from mutual.quoting import listed, nearest, plain, shown
from mutual.recording.accuracy import accuracy, kick_table
from mutual.recording.columns import DEFAULT_INSTRUMENTS, KICKS
from mutual.recording.declared import device_of
from mutual.recording.hookups import Hookups
from mutual.recording.limits import limits_of
from mutual.recording.preface import Preface, is_number
from mutual.recording.source import decode, load
from mutual.units import parse

KEYS = (
    "format", "device", "arrangement", "windings", "leads", "internal", "earthed", "shared_loss", "inductance",
    "resistance", "coupling", "mutual_resistance", "capacitance", "limits", "kick", "readings", "notes",
)  # fmt: skip
READING_KEYS = ("across", "tied", "sense", "frequency", "quantities", "repeats", "instrument")
MOST_REPEATS = 100_000
_PLACE = re.compile(r" \(at line (\d+), column \d+\)$| \(at end of document\)$")


def read_device(path: str | os.PathLike[str]) -> Described:
    """Read a described device from its TOML file.

    Raises
    ------
    RefusedInput
        The file cannot be used without guessing, or the device is not passive; file, line and key are named.
    """
    name = plain(os.fsdecode(path))
    try:
        text = decode(load(path))
        return _described(_document(text))
    except RefusedInput as error:
        raise error.with_place(file=name) from None


def _document(text: str) -> Preface:
    lines = list(enumerate(text.splitlines(), 1))
    try:
        return Preface(tomllib.loads(text.replace("\r\n", "\n")), lines)
    except RecursionError:
        raise RefusedInput("the description is nested too deeply") from None
    except tomllib.TOMLDecodeError as error:
        place = _PLACE.search(str(error))
        line = int(place[1]) if place and place[1] else len(lines)
        found = shown(lines[line - 1][1]) if 0 < line <= len(lines) else None
        reason = plain(_PLACE.sub("", str(error))[:120])
        raise RefusedInput(f"the description is not valid TOML ({reason})", line=line, found=found) from None


def _described(document: Preface) -> Described:
    tables = document.tables
    found = tables.get("format")
    if found != FORMAT:
        version = re.fullmatch(r"mutual-device-([0-9]{1,9})", str(found))
        newer = version is not None and int(version[1]) > 1
        reason = "this format is newer than the program" if newer else "not a described device"
        raise document.refused(reason, "format", found=found, expected=f'format = "{FORMAT}"')
    used = [r["instrument"] for r in _list_of_readings(document) if isinstance(r.get("instrument"), str)]
    instruments = [*DEFAULT_INSTRUMENTS, *used]
    _known(document, tables, (*KEYS, *instruments))
    if "capacitance" in tables:
        raise document.refused("capacitances are not simulated yet: they come with sweeps of frequency", "capacitance")
    device = device_of(document)
    described = Described(
        device=device,
        inductance=_by_winding(document, device, "inductance", "H", '"24.3 uH"'),
        resistance=_by_winding(document, device, "resistance", "ohm", '"110 mohm"'),
        coupling=_by_pair(document, device, "coupling", "1", "a number from -1 to 1"),
        mutual_resistance=_by_pair(document, device, "mutual_resistance", "ohm", '"2 mohm"'),
        instruments={name: accuracy(document, name) for name in tables if name in instruments},
        kick=kick_table(document),
        limits=limits_of(document, device),
    )
    described = replace(described, readings=tuple(_planned(document, device)))
    described.check_passive()
    return described


def _known(document: Preface, given: Iterable[str], known: Iterable[str], *path: str) -> None:
    known = tuple(dict.fromkeys(known))
    for key in given:
        if key not in known:
            raise document.refused("unknown key", *path, key, found=key, expected=shown(nearest(key, known)))


def _mapping(document: Preface, *path: str) -> Mapping[str, Any]:
    value: Any = document.tables.get(path[0], {})
    if not isinstance(value, Mapping):
        raise document.refused("this should be a table", *path, found=value, expected=f"[{path[0]}]")
    return value


def _by_winding(document: Preface, device: Device, key: str, unit: str, example: str) -> tuple[Table, ...]:
    """A table of one value for each winding; inductances must all be there and above zero."""
    given = _mapping(document, key)
    names = [w.name for w in device.windings]
    for name in given:
        if name not in names:
            raise document.refused("unknown winding", key, name, found=name, expected=listed(names))
    found = []
    for name in names:
        if name not in given:
            if unit == "H":
                raise document.refused("a winding has no inductance", key, expected=f"{name} = {example}")
            found.append(NOTHING)
            continue
        table = _table(document, (key, name), given[name], unit, example)
        if min(table.values) < 0 or (unit == "H" and min(table.values) == 0):
            wanted = "more than zero" if unit == "H" else "zero or more"
            raise document.refused("out of range", key, name, found=given[name], expected=wanted)
        found.append(table)
    return tuple(found)


def _by_pair(
    document: Preface, device: Device, key: str, unit: str, example: str
) -> dict[tuple[int, int], Table]:
    """A table of one value for each pair of windings, named in either order."""
    names = [w.name for w in device.windings]
    found: dict[tuple[int, int], Table] = {}
    for text, value in _mapping(document, key).items():
        pair = text.split()
        if len(pair) != 2 or not set(pair) <= set(names) or pair[0] == pair[1]:
            wanted = f"two of {listed(names)}, with a space between"
            raise document.refused("not a pair of windings", key, text, found=text, expected=wanted)
        i, j = sorted(names.index(name) for name in pair)
        if (i, j) in found:
            raise document.refused("this pair stands there twice", key, text, found=text)
        found[i, j] = _table(document, (key, text), value, unit, example)
    return found


def _table(document: Preface, path: tuple[str, ...], value: Any, unit: str, example: str) -> Table:
    if not isinstance(value, Mapping):
        return Table((0.0,), (_number(document, path, value, unit, example),))
    points: dict[float, float] = {}
    for text, item in value.items():
        frequency = _number(document, path, text, "Hz", '"100 kHz"')
        if frequency < 0 or frequency in points:
            raise document.refused("a frequency is negative or stands there twice", *path, found=text)
        points[frequency] = _number(document, path, item, unit, example)
    if not points:
        raise document.refused("a table without values", *path, expected=f'{{"0 Hz" = {example}}}')
    return Table(tuple(sorted(points)), tuple(points[f] for f in sorted(points)))


def _number(document: Preface, path: tuple[str, ...], value: Any, unit: str, example: str) -> float:
    if unit == "1" and is_number(value) and abs(value) < float("inf"):
        return float(value)
    if not isinstance(value, str):
        raise document.refused("not a number with its unit", *path, found=value, expected=example)
    try:
        return parse(value, unit).value
    except RefusedInput as error:
        raise document.refused(error.reason, *path, found=value, expected=error.expected or example) from None


def _list_of_readings(document: Preface) -> list[Mapping[str, Any]]:
    found = document.tables.get("readings", [])
    if not isinstance(found, list) or not all(isinstance(item, Mapping) for item in found) or not found:
        raise document.refused("nothing is said of what to read", "readings", expected="[[readings]] for each hookup")
    return found


def _planned(document: Preface, device: Device) -> Iterable[Planned]:
    hookups = Hookups(device)
    for number, given in enumerate(_list_of_readings(document), 1):
        try:
            yield _reading(document, hookups, given)
        except RefusedInput as error:
            # `line_of` finds the first table of a list only: the number of the table tells more.
            place = f"readings {number}" + (f", {error.column.removeprefix('readings.')}" if error.column else "")
            raise RefusedInput(error.reason, column=place, found=error.found, expected=error.expected) from None


def _reading(document: Preface, hookups: Hookups, given: Mapping[str, Any]) -> Planned:
    from mutual.methods.shown import SHOWN

    _known(document, given, READING_KEYS, "readings")
    texts = {}
    for key in ("across", "tied", "sense", "instrument"):
        texts[key] = given.get(key, "")
        if not isinstance(texts[key], str):
            raise document.refused("not a text", "readings", key, found=texts[key])
    hookup = hookups.read(texts["across"], texts["tied"], texts["sense"], False)
    quantities = given.get("quantities", ["inductance"])
    readable = (*SHOWN, *KICKS)
    if not isinstance(quantities, list) or not quantities:
        raise document.refused("no list of columns", "readings", "quantities", expected='["inductance", "resistance"]')
    for name in quantities:
        if name not in readable:
            raise document.refused(
                "this cannot be simulated", "readings", "quantities", found=name,
                expected=shown(nearest(str(name), readable)),
            )  # fmt: skip
    repeats = given.get("repeats", 1)
    if not isinstance(repeats, int) or isinstance(repeats, bool) or not 1 <= repeats <= MOST_REPEATS:
        raise document.refused("not a count", "readings", "repeats", found=repeats, expected=f"1 to {MOST_REPEATS}")
    frequencies = _frequencies(document, given.get("frequency"))
    return Planned(hookup, tuple(dict.fromkeys(quantities)), frequencies, repeats, texts["instrument"] or None)


def _frequencies(document: Preface, value: Any) -> tuple[float | None, ...]:
    if value is None:
        return (None,)
    found = []
    for item in value if isinstance(value, list) else [value]:
        found.append(_number(document, ("readings", "frequency"), item, "Hz", '"100 kHz"'))
        if found[-1] < 0:
            raise document.refused("a negative frequency", "readings", "frequency", found=item)
    if not found:
        raise document.refused("an empty list", "readings", "frequency", expected='"100 kHz"')
    return tuple(dict.fromkeys(found))
