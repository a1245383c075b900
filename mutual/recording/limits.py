"""`[limits]` of a preface: what the device must keep (interface contract, section 2.3)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from mutual.device import Device
from mutual.errors import RefusedInput
from mutual.quoting import nearest, shown
from mutual.recording.model import LimitSpec
from mutual.recording.preface import Preface, is_number
from mutual.units import parse

# Kind of quantity -> (number of windings named, unit).
KINDS = {
    "coupling": (2, "1"),
    "mutual": (2, "H"),
    "inductance": (1, "H"),
    "resistance": (1, "ohm"),
    "mutual resistance": (2, "ohm"),
}


def limits_of(preface: Preface, device: Device) -> tuple[LimitSpec, ...]:
    """Limits with the windings of each pair in the order of the device.

    Raises
    ------
    RefusedInput
        Unknown quantity, winding or key; a wrong unit; lower above upper.
    """
    table = preface.tables.get("limits", {})
    if not isinstance(table, Mapping):
        raise preface.refused("this should be a table", "limits", found=table, expected="[limits]")
    specs: dict[str, LimitSpec] = {}
    for key, value in table.items():
        quantity, unit = _quantity(preface, str(key), device)
        if quantity in specs:
            raise preface.refused("the quantity is limited twice", "limits", key, found=key)
        specs[quantity] = _spec(preface, str(key), quantity, value, unit)
    return tuple(specs.values())


def _quantity(preface: Preface, key: str, device: Device) -> tuple[str, str]:
    words = key.split()
    names = [w.name for w in device.windings]
    kind = next((k for k in sorted(KINDS, key=len, reverse=True) if words[: len(k.split())] == k.split()), None)
    if kind is None:
        near = nearest(words[0] if words else "", KINDS)
        raise preface.refused("unknown quantity", "limits", key, found=key, expected=f"{shown(near)} and windings")
    count, unit = KINDS[kind]
    windings = words[len(kind.split()) :]
    if len(windings) != count or len(set(windings)) != count:
        which = "two windings" if count == 2 else "one winding"
        raise preface.refused(f"{kind} belongs to {which}", "limits", key, found=key, expected=which)
    for winding in windings:
        if winding not in names:
            raise preface.refused("unknown winding", "limits", key, found=winding, expected=nearest(winding, names))
    return " ".join([kind, *sorted(windings, key=names.index)]), unit


def _spec(preface: Preface, key: str, quantity: str, value: Any, unit: str) -> LimitSpec:
    example = "such as {lower = 0.11, upper = 0.14}" if unit == "1" else f'such as {{upper = "25 {unit}"}}'
    if not isinstance(value, Mapping) or not value:
        raise preface.refused("not a limit", "limits", key, found=value, expected=example)
    ends: dict[str, float] = {}
    for side, text in value.items():
        if side not in ("lower", "upper"):
            near = nearest(str(side), ("lower", "upper"))
            raise preface.refused("unknown key", "limits", key, found=side, expected=shown(near))
        if unit == "1" and is_number(text):
            ends[side] = float(text)
            continue
        try:
            ends[side] = parse(text if isinstance(text, str) else "", unit).value
        except RefusedInput as error:
            raise preface.refused(error.reason, "limits", key, found=text, expected=example) from None
    if ends.get("lower", float("-inf")) > ends.get("upper", float("inf")):
        raise preface.refused("the lower limit is above the upper one", "limits", key, found=value)
    return LimitSpec(quantity, ends.get("lower"), ends.get("upper"))
