"""Several recordings of one device: one declaration, and instruments that are kept apart where they differ."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

from mutual.device import Device, Winding
from mutual.errors import RefusedInput
from mutual.quoting import plain, shown
from mutual.recording.columns import DEFAULT_INSTRUMENTS
from mutual.recording.hookups import check
from mutual.recording.model import Accuracy, Recording
from mutual.result import Finding

T = TypeVar("T")


@dataclass(frozen=True)
class Together:
    """Recordings that are to be evaluated together.

    Attributes
    ----------
    device : Device
        Windings of all files; the first file that says something else than the default stands for the rest.
    recordings : tuple of Recording
        As they were, but for `instruments`: the key is still the name that rows use, `Accuracy.name` is one
        and the same for one instrument and differs for two ("meter" and "meter (b.csv)").
    findings : tuple of Finding
        Only those of joining; the recordings keep their own.
    """

    device: Device
    recordings: tuple[Recording, ...]
    findings: tuple[Finding, ...] = ()


def common_device(recordings: Sequence[Recording]) -> Together:
    """Join what recordings of one device declare.

    Raises
    ------
    RefusedInput
        Two files contradict each other; both are named.
    ValueError
        No recording at all.
    """
    if not recordings:
        raise ValueError("no recording")
    first = recordings[0]
    if len(recordings) == 1:
        return Together(first.device, (first,))
    device = Device(
        name=next((r.device.name for r in recordings if r.device.name), ""),
        windings=_windings(recordings),
        arrangement=_agreed(recordings, "arrangement", "free"),
        leads=tuple(lead for r in recordings for lead in r.device.leads),
        internal=tuple(dict.fromkeys(lead for r in recordings for lead in r.device.internal)),
        earthed=_agreed(recordings, "earthed", ()),
        tie_resistance=_agreed(recordings, "tie_resistance", 0.0),
        tie_inductance=_agreed(recordings, "tie_inductance", 0.0),
        shared_loss=_agreed(recordings, "shared_loss", Device("", ()).shared_loss),
    )
    for recording in recordings:
        _check_rows(device, recording)
    return Together(device, _kept_apart(recordings), tuple(_names(recordings)))


def _windings(recordings: Sequence[Recording]) -> tuple[Winding, ...]:
    found: dict[str, tuple[Winding, Recording]] = {}
    by_leads: dict[frozenset[str], tuple[Winding, Recording]] = {}
    for recording in recordings:
        for winding in recording.device.windings:
            known, its = found.setdefault(winding.name, (winding, recording))
            if known != winding:
                raise RefusedInput(
                    f"winding {shown(winding.name)} has other leads in {plain(its.file)}",
                    file=plain(recording.file),
                    column=f"windings.{winding.name}",
                    found=f"{winding.first}-{winding.second}",
                    expected=f"{known.first}-{known.second}, in this order",
                )
            twin, its = by_leads.setdefault(frozenset((winding.first, winding.second)), (winding, recording))
            if twin.name != winding.name:
                raise RefusedInput(
                    f"the winding between these leads has another name in {plain(its.file)}",
                    file=plain(recording.file),
                    column=f"windings.{winding.name}",
                    found=winding.name,
                    expected=twin.name,
                )
    return tuple(winding for winding, _ in found.values())


def _agreed(recordings: Sequence[Recording], name: str, default: T) -> T:
    """What the files that state it say; the default where none does."""
    stated: T = default
    by: Recording | None = None
    for recording in recordings:
        value: T = getattr(recording.device, name)
        if value == default:
            continue
        if by is not None and value != stated:
            raise RefusedInput(
                f"{name.replace('_', ' ')} differs from that in {plain(by.file)}",
                file=plain(recording.file),
                column=name,
                found=shown(value),
                expected=shown(stated),
            )
        stated, by = value, recording
    return stated


def _check_rows(device: Device, recording: Recording) -> None:
    """Check hookups again: another file may declare a winding where this one reads open, or a lead internal."""
    for row in recording.rows:
        reads_open = any(v.value == float("inf") for v in row.values.values())
        try:
            check(device, row.hookup, reads_open)
        except RefusedInput as error:
            raise error.with_place(file=plain(recording.file), row=row.number, line=row.line) from None


def _kept_apart(recordings: Sequence[Recording]) -> tuple[Recording, ...]:
    """Tables of one name and other contents become two instruments.

    A file without a table of a default name has an instrument of unknown accuracy, which is not the one
    that another file describes.
    """
    taken: dict[str, Accuracy] = {}
    renamed = []
    for recording in recordings:
        undescribed = {name: Accuracy(name) for name in DEFAULT_INSTRUMENTS if _described(recordings, name)}
        instruments = {}
        for name, accuracy in {**undescribed, **recording.instruments}.items():
            label, more = name, 0
            while label in taken and replace(taken[label], name=name) != accuracy:
                more += 1
                label = f"{name} ({plain(recording.file)}{f', {more}' if more > 1 else ''})"
            instruments[name] = taken.setdefault(label, replace(accuracy, name=label))
        renamed.append(replace(recording, instruments=instruments))
    return tuple(renamed)


def _described(recordings: Sequence[Recording], name: str) -> bool:
    return any(name in recording.instruments for recording in recordings)


def _names(recordings: Sequence[Recording]) -> list[Finding]:
    named = [r for r in recordings if r.device.name]
    return [
        Finding(
            "caution",
            "other device",
            f"the device is called {shown(r.device.name)} here and {shown(named[0].device.name)} "
            f"in {plain(named[0].file)}: the first name stands",
            plain(r.file),
        )
        for r in named[1:]
        if r.device.name != named[0].device.name
    ]
