"""Writing recordings: what is written reads back as the same recording."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from texts import HEADER, PREFACE, ROWS, read_text

from mutual.device import Device, Hookup, Winding
from mutual.errors import RefusedInput
from mutual.recording import Overrides, Recording, dumps, sheet
from mutual.recording.columns import VALUE_UNITS
from mutual.recording.model import Accuracy, KickTable, LimitSpec, Row, Value

PAIR = Device("coils, invented", (Winding("pad", "A", "B"), Winding("latch", "C", "D")))


def meaning(recording: Recording) -> Recording:
    """What a recording says: without file, findings of reading, and places of rows in the file."""
    rows = tuple(replace(row, line=None, number=number) for number, row in enumerate(recording.rows, 1))
    return replace(recording, rows=rows, findings=(), source=None)


def test_a_written_recording_looks_like_one_written_by_hand(tmp_path: Path) -> None:
    table = '# [meter]\n# gain_common = "0.1 %"\n# floor = ["5 nH", "1 mohm"]\n'
    text = PREFACE + table + HEADER + "A-B,,100000,24.30\nA-D,B-C,100000,48.4\n"
    assert dumps(read_text(tmp_path, text)) == text


def test_notes_are_written_and_left_alone(tmp_path: Path) -> None:
    recording = read_text(tmp_path, PREFACE + HEADER + ROWS)
    text = dumps(recording, notes={"made by": 'a "program"'})
    assert '# [notes]\n# "made by" = "a \\"program\\""\n' in text
    assert meaning(read_text(tmp_path, text)) == meaning(recording)


def test_rows_left_out_are_not_written(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,9.9E37\n{ROWS}")
    again = read_text(tmp_path, dumps(recording))
    assert [row.number for row in again.rows] == [1, 2]
    assert meaning(again) == meaning(recording)
    assert again.findings == ()


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (Value(24.3e-6, 1e-8), "24.30"),
        (Value(24.3e-6, 1e-12), "24.300000"),
        (Value(24e-6, 1e-6), "24"),
        (Value(20e-6, 1e-5), "2e1"),
        (Value(0.0, 1e-9), "0.000"),
        (Value(24.3e-6), "24.300000000000000"),
        (Value(24.3e-6, 3e-8), "24.3"),  # no display has such a step: the value counts
        (Value(24.3456e-6, 1e-6), "24.3456"),
    ],
)
def test_digits(value: Value, text: str) -> None:
    rows = (
        Row(1, Hookup(("A", "B")), values={"inductance": Value(11e-6, 1e-6)}),
        Row(2, Hookup(("A", "B")), values={"inductance": value}),
    )
    assert dumps(Recording(PAIR, rows)).splitlines()[-1].split(",")[-1] == text


def test_an_instrument_that_only_a_left_out_row_used_is_not_written(tmp_path: Path) -> None:
    table = '# [bridge]\n# gain = "1 %"\n'
    text = f"{PREFACE}{table}across,inductance [uH],instrument\nA-B,5,\nC-D,9.9E37,bridge\n"
    recording = read_text(tmp_path, text)
    assert "bridge" in recording.instruments
    again = read_text(tmp_path, dumps(recording))
    assert again.instruments == {}
    assert len(again.rows) == 1


def test_another_kind_cannot_be_written() -> None:
    with pytest.raises(ValueError, match="waveform"):
        dumps(Recording(PAIR, kind="waveform"))


SIZES = st.floats(min_value=1e-15, max_value=1e9)
RATIOS = st.floats(min_value=0.0, max_value=2.0)
NAMES = st.text(st.characters(categories=["L", "N"]), min_size=1, max_size=5)
TEXTS = (
    st.text(st.characters(exclude_categories=["Cc", "Cs", "Zl", "Zp"]), min_size=1, max_size=12)
    .map(str.strip)
    .filter(lambda text: text != "")
)


@st.composite
def values(draw: st.DrawFn, unit: str, signed: bool) -> Value:
    """A number as an instrument prints it, or one from a computation."""
    if draw(st.booleans()):
        number = draw(st.floats(min_value=-1e6 if signed else 0.0, max_value=1e6))
        return Value(number)
    digits, power = draw(st.integers(-99999 if signed else 0, 99999)), draw(st.integers(-12, 4))
    if unit == "rad":
        # Printed in degrees, as instruments do.
        from mutual.units import read_number, unit_of

        parsed = read_number(f"{digits}e{power}", unit_of("deg"))
        assert parsed is not None
        return Value(parsed.value, parsed.step)
    return Value(float(f"{digits}e{power}"), float(f"1e{power}"))


@st.composite
def accuracies(draw: st.DrawFn, name: str) -> Accuracy:
    """Any accuracy table."""
    by_unit = st.dictionaries(st.sampled_from(["H", "ohm", "V", "A", "Hz", "F", "1", "rad"]), SIZES, max_size=3)
    maybe = lambda strategy: draw(st.none() | strategy)  # noqa: E731
    return Accuracy(
        name,
        *(maybe(RATIOS) for _ in range(6)),
        floor=draw(by_unit),
        counts=maybe(RATIOS),
        noise=draw(by_unit),
        resolution=draw(by_unit),
        shunt_floor=maybe(SIZES),
        low_q_factor=maybe(st.sampled_from(["1 + 1/Q", "sqrt(1 + 1/Q^2)"])),
        input_resistance=maybe(SIZES),
        stated_as=draw(st.sampled_from(["limit", "standard", "expanded"])),
    )


@st.composite
def rows_of(draw: st.DrawFn, device: Device, instrument: str, number: int) -> Row:
    """A row with a valid hookup and any of the columns."""
    (a, b), (c, d) = ((w.first, w.second) for w in device.windings[:2])
    across, tied = draw(st.sampled_from([((a, b), ()), ((a, d), ((b, c),)), ((a, c), ((b, d),)), ((c, d), ((a, b),))]))
    names = draw(st.lists(st.sampled_from(list(VALUE_UNITS)), min_size=1, max_size=4, unique=True))
    signed = {"resistance", "phase", "transfer inductance", "transfer resistance", "dissipation"}
    found = {name: draw(values(VALUE_UNITS[name], name in signed)) for name in VALUE_UNITS if name in names}
    conditions = {
        **draw(st.fixed_dictionaries({}, optional={"temperature": st.floats(-50, 500), "range": TEXTS})),
        **draw(st.sampled_from([{}, {"level": 0.1, "level unit": "V"}])),
    }
    return Row(
        number,
        Hookup(across, tied, (c, d)),
        frequency=draw(st.floats(min_value=1e-3, max_value=1e9)),
        values={**found, "inductance": draw(values("H", signed=False))},
        kicks=draw(st.dictionaries(st.sampled_from(["kick on make", "kick on break"]), st.sampled_from("+-0"))),
        instrument=draw(st.sampled_from([None, "meter", instrument])),
        conditions=conditions,
        point={"gap": draw(st.floats(0, 1)), "side": draw(st.sampled_from(["left", "right side"]))},
    )


@st.composite
def recordings(draw: st.DrawFn) -> Recording:
    """Any recording of readings."""
    leads = draw(st.lists(NAMES, min_size=7, max_size=7, unique=True))
    a, b, c, d, e, f, g = leads
    names = draw(st.lists(NAMES, min_size=3, max_size=3, unique=True))
    windings = tuple(Winding(n, *ends) for n, ends in zip(names, ((a, b), (c, d), (b, e)), strict=True))
    device = Device(
        name=draw(st.just("") | TEXTS),
        windings=windings,
        arrangement=draw(st.sampled_from(["free", "one limb", "three-phase"])),
        leads=(f, g),
        internal=draw(st.sampled_from([(), (e,)])),
        earthed=draw(st.sampled_from([(), (f,), (f, g)])),
        tie_resistance=draw(st.just(0.0) | SIZES),
        tie_inductance=draw(st.just(0.0) | SIZES),
        shared_loss=draw(st.floats(0, 1)),
    )
    keys = ("format", "kind", "device", "arrangement", "windings", "leads", "internal", "earthed", "ties", "loads")
    other = draw(TEXTS.filter(lambda t: t not in (*keys, "shared_loss", "limits", "kick", "notes", "captured")))
    ends = st.tuples(SIZES, SIZES).map(sorted)
    lower, upper = draw(ends)
    limits = (
        LimitSpec(f"coupling {names[0]} {names[1]}", draw(RATIOS), None),
        LimitSpec(f"mutual {names[0]} {names[2]}", lower, upper),
        LimitSpec(f"inductance {names[1]}", None, upper),
        LimitSpec(f"resistance {names[1]}", lower, None),
        LimitSpec(f"mutual resistance {names[1]} {names[2]}", None, upper),
    )
    rows = tuple(draw(rows_of(device, other, number)) for number in range(1, draw(st.integers(1, 3)) + 1))
    names_used = dict.fromkeys(["meter", *(row.instrument for row in rows if row.instrument)])
    return Recording(
        device=device,
        rows=rows,
        instruments={name: draw(accuracies(name)) for name in names_used},
        kick=KickTable(draw(st.floats(0, 0.5)), draw(st.floats(0, 0.5))),
        limits=draw(st.sampled_from([(), limits])),
    )


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow], deadline=None)
@given(recordings())
def test_any_recording_reads_back_as_it_was(tmp_path: Path, recording: Recording) -> None:
    text = dumps(recording)
    assert "\r" not in text
    assert text.endswith("\n")
    again = read_text(tmp_path, text)
    assert meaning(again) == meaning(recording)
    assert dumps(again) == text


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)
@given(
    st.lists(
        st.tuples(
            st.sampled_from(["A-B,", "C-D,", "A-D,B-C", "A-C,B-D"]),
            st.from_regex(r"[0-9]{1,5}(\.[0-9]{1,5})?(e-?[0-9])?", fullmatch=True),
        ),
        min_size=1,
        max_size=6,
    ),
    st.sampled_from(["H", "mH", "uH", "nH", "cH"]),
)
def test_any_file_of_printed_numbers_survives(tmp_path: Path, cells: list[tuple[str, str]], unit: str) -> None:
    text = f"{PREFACE}across,tied,inductance [{unit}]\n" + "".join(f"{hookup},{cell}\n" for hookup, cell in cells)
    recording = read_text(tmp_path, text)
    assert len(recording.rows) == len(cells)
    assert meaning(read_text(tmp_path, dumps(recording))) == meaning(recording)


def test_a_sheet_holds_the_hookups_worth_reading(tmp_path: Path) -> None:
    text = sheet(PAIR, frequency=1e5, inductance_unit="uH", resistance_unit="mohm")
    assert text.splitlines()[-7:] == [
        "across,tied,frequency [Hz],inductance [uH],resistance [mohm]",
        "A-B,,100000,,",
        "C-D,,100000,,",
        "A-D,B-C,100000,,",
        "A-C,B-D,100000,,",
        "A-B,C-D,100000,,",
        "C-D,A-B,100000,,",
    ]
    filled = text.replace(",100000,,", ",100000,24.30,110")
    recording = read_text(tmp_path, filled)
    assert recording.device == PAIR
    assert len(recording.rows) == 6
    assert recording.instruments == {}
    with pytest.raises(RefusedInput, match="no value"):
        read_text(tmp_path, text)


def test_the_accuracy_in_a_sheet_holds_once_its_marks_are_taken_away(tmp_path: Path) -> None:
    text = sheet(PAIR).replace("# # [", "# [").replace("# # gain", "# gain").replace("# # noise", "# noise")
    recording = read_text(tmp_path, text.replace(",,,,", ",,1e5,5e-6,").replace(",,,\n", ",1e5,5e-6,\n"))
    assert recording.instruments["meter"].gain == 0.001
    assert recording.instruments["meter"].noise == {"H": 1e-9, "ohm": 5e-4}


def sheet_hookups(device: Device) -> list[str]:
    """Hookups of a sheet as text."""
    lines = [line for line in sheet(device).splitlines() if not line.startswith("#")][1:]
    return [" tied ".join(filter(None, line.split(",")[:2])) for line in lines]


def test_a_sheet_for_a_tap() -> None:
    device = Device("tap", (Winding("low", "1", "2"), Winding("high", "2", "3")))
    assert sheet_hookups(device) == ["1-2", "2-3", "1-3", "1-2 tied 1-3", "1-2 tied 2-3", "2-3 tied 1-2"]


def test_a_sheet_for_a_buried_star() -> None:
    device = Device("star", tuple(Winding(x.lower(), x, "N") for x in "UVW"), internal=("N",))
    assert sheet_hookups(device) == [
        "U-V", "U-V tied V-W", "U-W", "U-W tied W-V", "V-W", "V-W tied W-U",
    ]  # fmt: skip


def test_a_sheet_of_three_windings_counts_them_all() -> None:
    device = Device("three", tuple(Winding(n, n + "1", n + "2") for n in "abc"))
    found = sheet_hookups(device)
    assert len(found) == len(set(found)) == 3 + 2 * 3 + 2 * 3


@pytest.mark.parametrize(("inductance", "resistance"), [("ohm", "ohm"), ("H", "H"), ("MH", "ohm"), ("x", "ohm")])
def test_a_sheet_in_a_wrong_unit(inductance: str, resistance: str) -> None:
    with pytest.raises(RefusedInput):
        sheet(PAIR, inductance_unit=inductance, resistance_unit=resistance)


def test_open_is_written_as_open(tmp_path: Path) -> None:
    text = f"{PREFACE}across,tied,frequency [Hz],resistance [ohm]\nA-C,,0,open\nA-B,,0,0.11\n"
    recording = read_text(tmp_path, text)
    assert recording.rows[0].values["resistance"].value == math.inf
    assert meaning(read_text(tmp_path, dumps(recording))) == meaning(recording)


def test_overrides_are_written_into_the_file(tmp_path: Path) -> None:
    overrides = Overrides({"pad": ("A", "B"), "latch": ("C", "D")}, {"meter.gain": "0.3%"}, across="A-B", tied="C-D")
    recording = read_text(tmp_path, "inductance [uH]\n5\n", overrides)
    assert meaning(read_text(tmp_path, dumps(recording))) == meaning(recording)
