"""From recordings to evidence: which rows count, what the data sheets leave open, which frequencies there are."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import product

from mutual.device import Device
from mutual.methods.errors_of_instruments import Choice
from mutual.methods.kick import Kicks, kicks
from mutual.methods.readings import Item
from mutual.recording.model import Accuracy, KickTable, Recording, Row
from mutual.recording.together import common_device
from mutual.result import Finding
from mutual.states import Point, point_key

# With more open splits than this only the two outermost choices are computed.
_MOST_AXES = 3


@dataclass(frozen=True)
class Collected:
    """Everything that recordings of one device say.

    Attributes
    ----------
    device : Device
    items : tuple of Item
        Rows with values that are functions of an impedance.
    kicks : Kicks
    findings : tuple of Finding
    seen : tuple of (frequency or None, point)
        As they occur, direct current included.
    """

    device: Device
    items: tuple[Item, ...]
    kicks: Kicks
    findings: tuple[Finding, ...]
    seen: tuple[tuple[float | None, Point], ...]

    @property
    def alternating(self) -> tuple[tuple[float | None, Point], ...]:
        """Frequencies and points, direct current not counted."""
        return tuple((f, p) for f, p in self.seen if f != 0)


def collect(recordings: Sequence[Recording]) -> Collected:
    """Join recordings of one device.

    Raises
    ------
    RefusedInput
        They contradict one another about the device.
    """
    together = common_device(recordings)
    findings = [*(f for r in together.recordings for f in r.findings), *together.findings]
    items: list[Item] = []
    struck: list[tuple[Row, str]] = []
    table: KickTable | None = None
    for recording in together.recordings:
        for row in recording.rows:
            item = Item(row, instrument_of(recording, row), recording.where(row))
            if item.columns():
                items.append(item)
            elif row.values and not any(v.value == float("inf") for v in row.values.values()):
                text = f"{', '.join(row.values)}: no method uses this column alone yet"
                findings.append(Finding("caution", "left out", text, item.where))
            if row.kicks:
                struck.append((row, item.where))
                table = table or recording.kick
    kicked, more = kicks(together.device, struck, table or KickTable())
    seen = tuple(dict.fromkeys((item.row.frequency, point_key(item.row.point)) for item in _filled(items)))
    return Collected(together.device, tuple(_filled(items)), kicked, (*findings, *more), seen)


def _filled(items: Sequence[Item]) -> list[Item]:
    """Rows without a frequency take the only one there is, if there is only one."""
    stated = {item.row.frequency for item in items if item.row.frequency}
    if len(stated) != 1:
        return list(items)
    (only,) = stated
    return [_at(item, only) if item.row.frequency is None else item for item in items]


def _at(item: Item, frequency: float) -> Item:
    from dataclasses import replace

    return replace(item, row=replace(item.row, frequency=frequency))


def instrument_of(recording: Recording, row: Row) -> Accuracy:
    """The accuracy table that holds for an impedance in a row."""
    name = row.instrument or "meter"
    return recording.instruments.get(name, Accuracy(name))


def choices(collected: Collected) -> Iterator[Choice]:
    """Every extreme of what the data sheets leave open."""
    axes = list(_axes(collected))
    combinations = list(product((True, False), repeat=len(axes)))
    if len(axes) > _MOST_AXES:
        combinations = [combinations[0], combinations[-1]]
    for values in combinations:
        setting = dict(zip(axes, values, strict=True))
        yield Choice(
            common={(name, part): v for (name, part), v in setting.items() if part != "frequencies"},
            between_frequencies={name: v for (name, part), v in setting.items() if part == "frequencies"},
        )


def _axes(collected: Collected) -> Iterator[tuple[str, str]]:
    frequencies = {f for f, _ in collected.alternating}
    for name, a in {item.accuracy.name: item.accuracy for item in collected.items}.items():
        if a.gain is not None:
            yield name, "gain"
        if a.phase is not None and a.low_q_factor is None:
            yield name, "phase"
        shared = (a.gain_common, a.gain, a.phase_common, a.phase, a.shunt_floor)
        if len(frequencies) > 1 and any(x is not None for x in shared):
            yield name, "frequencies"
