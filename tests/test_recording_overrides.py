"""What the command line says in place of a preface, and foreign files that it maps."""

from __future__ import annotations

from pathlib import Path

import pytest
from texts import HEADER, PREFACE, ROWS, read_text, refused

from mutual.device import Hookup, Winding
from mutual.recording import Overrides
from mutual.recording.model import Value

PAIR = {"pad": ("A", "B"), "latch": ("C", "D")}
EXPORT = """\
Some bench; export of sweep 7
Date,2024-05-01

Freq,Ls,Rs,Status
1000,48.40,0.21,N
100000,48.38,0.25,N
"""
MAPPED = {"Freq": "frequency [Hz]", "Ls": "inductance [uH]", "Rs": "resistance [ohm]"}


def test_a_file_without_a_preface(tmp_path: Path) -> None:
    settings = {"meter.gain": "0.3%", "arrangement": "one limb", "shared_loss": "0.5", "earthed": "B, D"}
    recording = read_text(tmp_path, HEADER + ROWS, Overrides(PAIR, settings))
    assert recording.device.windings == (Winding("pad", "A", "B"), Winding("latch", "C", "D"))
    assert recording.device.arrangement == "one limb"
    assert recording.device.shared_loss == 0.5
    assert recording.device.earthed == ("B", "D")
    assert recording.instruments["meter"].gain == 0.003
    assert len(recording.rows) == 2


@pytest.mark.parametrize(
    ("key", "text", "where", "value"),
    [
        ("meter.floor", '["5 nH", "1 mohm"]', lambda r: r.instruments["meter"].floor, {"H": 5e-9, "ohm": 1e-3}),
        ("meter.floor", "5nH", lambda r: r.instruments["meter"].floor, {"H": 5e-9}),
        ("meter.counts", "3", lambda r: r.instruments["meter"].counts, 3.0),
        ("kick.misread", "0.05", lambda r: r.kick.misread, 0.05),
        ("device", "2024-05-01", lambda r: r.device.name, "2024-05-01"),
        ("device", '"quoted"', lambda r: r.device.name, "quoted"),
        ("leads", '["E", "F"]', lambda r: r.device.leads[-2:], ("E", "F")),
        ("ties.resistance", "10 mohm", lambda r: r.device.tie_resistance, 0.01),
        ("limits.coupling pad latch.lower", "0.11", lambda r: r.limits[0].lower, 0.11),
        ("limits.inductance pad", '{upper = "25 uH"}', lambda r: r.limits[0].upper, 25e-6),
    ],
)
def test_settings(tmp_path: Path, key: str, text: str, where: object, value: object) -> None:
    recording = read_text(tmp_path, HEADER + ROWS, Overrides(PAIR, {key: text}))
    assert where(recording) == value  # type: ignore[operator]


def test_what_the_preface_says_likewise_is_no_contradiction(tmp_path: Path) -> None:
    text = PREFACE + '# [meter]\n# gain = "0.3 %"\n' + HEADER + ROWS
    overrides = Overrides({"pad": ("A", "B")}, {"meter.gain": "0.30%", "meter.floor": "5 nH"})
    recording = read_text(tmp_path, text, overrides)
    assert recording.instruments["meter"].gain == 0.003
    assert recording.instruments["meter"].floor == {"H": 5e-9}


@pytest.mark.parametrize(
    ("overrides", "column", "line", "found", "expected"),
    [
        (Overrides({"pad": ("B", "A")}), "windings.pad", 5, "B, A", "A, B"),
        (Overrides({"other": ("B", "A")}), "windings.other", 4, "B-A", ""),
        (Overrides(settings={"meter.gain": "0.4%"}), "meter.gain", 8, "0.4%", "0.3 %"),
        (Overrides(settings={"device": "another"}), "device", 3, "another", "two coils"),
        (Overrides(settings={"device.name": "x"}), "device.name", 3, None, ""),
        (Overrides(settings={"metre.gain": "1 %"}), "metre", None, "metre", "meter"),
        (Overrides(settings={"meter.gian": "1 %"}), "meter.gian", 7, "gian", "gain"),
        (Overrides(settings={"meter.floor": "5"}), "meter.floor", 7, "5", "5 nH"),
    ],
)
def test_contradictions_and_faults(
    tmp_path: Path, overrides: Overrides, column: str, line: int | None, found: str | None, expected: str
) -> None:
    text = PREFACE + '# [meter]\n# gain = "0.3 %"\n' + HEADER + ROWS
    error = refused(tmp_path, text, overrides)
    assert (error.column, error.line) == (column, line)
    assert found is None or found in str(error.found)
    assert expected in str(error.expected)


def test_an_export_of_one_hookup(tmp_path: Path) -> None:
    recording = read_text(tmp_path, EXPORT, Overrides(PAIR, columns=MAPPED, across="A-D", tied="B-C"))
    first, second = recording.rows
    assert first.hookup == Hookup(("A", "D"), (("B", "C"),))
    assert first.values == {"inductance": Value(48.4e-6, 1e-8), "resistance": Value(0.21, 0.01)}
    assert (first.number, first.line, second.number, second.line) == (1, 5, 2, 6)
    assert [(f.level, f.code) for f in recording.findings] == [("note", "before header"), ("note", "not mapped")]
    assert "Status" in recording.findings[1].text


def test_our_own_columns_beside_a_mapped_one_are_used(tmp_path: Path) -> None:
    text = "across,tied,frequency [Hz],Ls\nA-B,,1000,24.3\n"
    recording = read_text(tmp_path, text, Overrides(PAIR, columns={"Ls": "inductance [uH]"}))
    assert recording.rows[0].frequency == 1000.0
    assert recording.findings == ()


@pytest.mark.parametrize(
    ("columns", "found", "expected"),
    [
        ({"Lp": "inductance [uH]"}, "'Lp'", "'Ls'"),
        ({"Ls": "inductence [uH]"}, "'inductence [uH]'", "'inductance'"),
        ({"Ls": "inductance [MH]"}, "'MH'", "mH"),
        ({"Ls": "inductance [uH]", "Rs": "inductance [mH]"}, "'Ls' and 'Rs'", "one of them"),
    ],
)
def test_faulty_mappings(tmp_path: Path, columns: dict[str, str], found: str, expected: str) -> None:
    error = refused(tmp_path, EXPORT, Overrides(PAIR, columns=columns, across="A-D", tied="B-C"))
    assert found in str(error.found)
    assert expected in str(error.expected)


def test_a_mapped_column_is_named_as_the_file_names_it(tmp_path: Path) -> None:
    text = EXPORT.replace("48.38", '"48,38"')
    error = refused(tmp_path, text, Overrides(PAIR, columns=MAPPED, across="A-D", tied="B-C"))
    assert (error.row, error.line, error.column) == (2, 6, "Ls")


def test_an_export_without_its_hookup(tmp_path: Path) -> None:
    error = refused(tmp_path, EXPORT, Overrides(PAIR, columns=MAPPED))
    assert "--across" in str(error.expected)


def test_an_export_with_semicolons(tmp_path: Path) -> None:
    text = "Freq;Ls\n1000;48,4\n"
    error = refused(tmp_path, text, Overrides(PAIR, columns={"Ls": "inductance [uH]"}, across="A-D", tied="B-C"))
    assert "semicolons" in error.reason


@pytest.mark.parametrize(
    ("overrides", "column", "row"),
    [
        (Overrides(across="C-D"), "across", 1),
        (Overrides(tied="C-D"), "tied", 2),
        (Overrides(across="A-E"), "across", 1),
    ],
)
def test_a_hookup_that_the_file_contradicts(tmp_path: Path, overrides: Overrides, column: str, row: int) -> None:
    error = refused(tmp_path, f"{PREFACE}{HEADER}A-B,C-D,1e3,5\nA-B,A-C,1e3,5\n", overrides)
    assert (error.column, error.row) == (column, row)


def test_a_hookup_that_the_file_repeats(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,C-D,1e3,5\nA-B,,1e3,5\n", Overrides(tied="C-D"))
    assert [str(row.hookup) for row in recording.rows] == ["A-B tied C-D"] * 2
