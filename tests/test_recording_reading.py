"""Good recordings: what each key, column and cell becomes."""

from __future__ import annotations

import hashlib
import math
import subprocess
import sys
from pathlib import Path

import pytest
from texts import FIRST_ROW_LINE, HEADER, PREFACE, ROWS, read_text

from mutual.device import Device, Hookup, Winding
from mutual.recording.model import Accuracy, KickTable, LimitSpec, Value
from mutual.result import Finding

WINDINGS = (Winding("pad", "A", "B"), Winding("latch", "C", "D"))


def test_a_small_recording(tmp_path: Path) -> None:
    text = PREFACE + HEADER + ROWS
    recording = read_text(tmp_path, text)
    assert recording.device == Device("two coils, invented", WINDINGS)
    first, second = recording.rows
    assert (first.number, first.line) == (1, FIRST_ROW_LINE)
    assert (second.number, second.line) == (2, FIRST_ROW_LINE + 1)
    assert first.hookup == Hookup(("A", "B"))
    assert first.frequency == 100e3
    assert first.values == {"inductance": Value(24.3e-6, 1e-8)}
    assert recording.findings == ()
    assert recording.kind == "readings"
    assert recording.source is not None
    assert recording.source.sha256 == hashlib.sha256(text.encode()).hexdigest()
    assert (recording.source.file, recording.source.rows) == (str(tmp_path / "a.csv"), 2)


def test_every_key_of_the_preface(tmp_path: Path) -> None:
    preface = """\
# format = "mutual-recording-1"
# device = "star, invented"
# arrangement = "three-phase"
# leads = ["E", "F"]
# internal = ["N"]
# earthed = ["U"]
# shared_loss = 0.5
# [windings]
# u = ["U", "N"]
# v = ["V", "N"]
# "w" = ["W", "N"]
# [ties]
# resistance = "10 mohm"
# inductance = "20 nH"
# [kick]
# misread = 0.05
# reversed = "0.1 %"
# [limits]
# "coupling v u" = {lower = 0.11, upper = "14 %"}
# "mutual u v" = {upper = "25 uH"}
# "inductance w" = {lower = "1 mH"}
# "resistance w" = {upper = "2 ohm"}
# [meter]
# gain_common = "0.1 %"
# gain_each = "50 ppm"
# gain = "0.2%"
# phase_common = "0.1 deg"
# phase_each = "2 mrad"
# phase = "1 mrad"
# floor = ["5 nH", "1 mohm"]
# counts = 3
# noise = ["1 nH", "0.01 1"]
# resolution = "10 nH"
# shunt_floor = "0.5 nS"
# low_q_factor = "1+1/Q"
# stated_as = "expanded"
# [voltmeter]
# input_resistance = "10 Mohm"
# ["bridge 2"]
# noise = "1 nH"
# [notes]
# whatever = "is free"
# [captured]
# at = 2024-05-01
"""
    recording = read_text(tmp_path, preface + "across,inductance [mH],instrument\nU-V,5,bridge 2\nV-W,5,\n")
    assert recording.device == Device(
        name="star, invented",
        windings=(Winding("u", "U", "N"), Winding("v", "V", "N"), Winding("w", "W", "N")),
        arrangement="three-phase",
        leads=("U", "N", "V", "W", "E", "F"),
        internal=("N",),
        earthed=("U",),
        tie_resistance=0.01,
        tie_inductance=20e-9,
        shared_loss=0.5,
    )
    assert recording.kick == KickTable(0.05, 0.001)
    assert recording.limits == (
        LimitSpec("coupling u v", 0.11, 0.14),
        LimitSpec("mutual u v", None, 25e-6),
        LimitSpec("inductance w", 1e-3, None),
        LimitSpec("resistance w", None, 2.0),
    )
    assert recording.instruments["meter"] == Accuracy(
        name="meter",
        gain_common=1e-3,
        gain_each=5e-5,
        gain=2e-3,
        phase_common=math.pi / 1800,
        phase_each=2e-3,
        phase=1e-3,
        floor={"H": 5e-9, "ohm": 1e-3},
        counts=3.0,
        noise={"H": 1e-9, "1": 0.01},
        resolution={"H": 1e-8},
        shunt_floor=5e-10,
        low_q_factor="1 + 1/Q",
        stated_as="expanded",
    )
    assert recording.instruments["voltmeter"] == Accuracy("voltmeter", input_resistance=1e7)
    assert recording.instruments["bridge 2"] == Accuracy("bridge 2", noise={"H": 1e-9})
    assert [row.instrument for row in recording.rows] == ["bridge 2", None]
    assert recording.findings == ()


def test_every_column(tmp_path: Path) -> None:
    columns = {
        "across": "A-B",
        "tied": "C-D",
        "sense": "C-D",
        "frequency [kHz]": "1.5",
        "inductance [mH]": "1.50",
        "parallel inductance [uH]": "2.5",
        "parallel resistance [kohm]": "3",
        "resistance [m\u03a9]": "4e1",
        "quality": "12.5",
        "dissipation [%]": "8",
        "impedance [ohm]": "5",
        "phase [deg]": "90",
        "resonance [MHz]": "6",
        "tuned with [pF]": "7",
        "drive [V]": "8.0",
        "sensed [mV]": "9",
        "drive current [mA]": "10",
        "transfer inductance [\u00b5H]": "-11",
        "transfer resistance [\u03bcohm]": "-12",
        "kick on make": "+",
        "kick on break": "\u2212",
        "temperature [degC]": "-5",
        "level [mA]": "10",
        "range": "10 mH",
        "point gap [mm]": "8",
        "point side": "left",
        "point turn": "3",
        "instrument": "bridge",
        "status": "0",
        "note of the operator": "anything, 1",
    }
    text = f"{PREFACE}# [bridge]\n{','.join(columns)}\n" + ",".join(f'"{cell}"' for cell in columns.values())
    row = read_text(tmp_path, text).rows[0]
    assert row.hookup == Hookup(("A", "B"), (("C", "D"),), ("C", "D"))
    assert row.frequency == 1500.0
    assert row.values == {
        "inductance": Value(1.5e-3, 1e-5),
        "parallel inductance": Value(2.5e-6, 1e-7),
        "parallel resistance": Value(3000.0, 1000.0),
        "resistance": Value(0.04, 0.01),
        "quality": Value(12.5, 0.1),
        "dissipation": Value(0.08, 0.01),
        "impedance": Value(5.0, 1.0),
        "phase": Value(math.pi / 2, math.pi / 180),
        "resonance": Value(6e6, 1e6),
        "tuned with": Value(7e-12, 1e-12),
        "drive": Value(8.0, 0.1),
        "sensed": Value(9e-3, 1e-3),
        "drive current": Value(10e-3, 1e-3),
        "transfer inductance": Value(-11e-6, 1e-6),
        "transfer resistance": Value(-12e-6, 1e-6),
    }
    assert row.kicks == {"kick on make": "+", "kick on break": "-"}
    assert row.conditions == {"temperature": -5.0, "level": 0.01, "level unit": "A", "range": "10 mH"}
    assert row.point == {"gap": 0.008, "side": "left", "turn": 3.0}
    assert row.instrument == "bridge"


@pytest.mark.parametrize(
    ("cell", "step"),
    [
        ("24.30", 1e-8),
        (" 24.3 ", 1e-7),
        ("24", 1e-6),
        ("2.43e1", 1e-7),
        ("3e-6", 1e-12),
        ("+24.30", 1e-8),
        ("24.", 1e-6),
        ("24.300000000000000", None),  # more digits than any display has
    ],
)
def test_the_last_printed_digit(tmp_path: Path, cell: str, step: float | None) -> None:
    value = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,{cell}\n").rows[0].values["inductance"]
    assert value.value == float(cell.strip() + "e-6") if "e" not in cell else float(cell) * 1e-6
    assert value.step == step


@pytest.mark.parametrize(
    "cell", ["nan", "NaN", "inf", "-inf", "9.9E37", "+9.90000E+37", "9.91e37", "-9.9e37", "OL", "----"]
)
def test_overload_leaves_the_row_out(tmp_path: Path, cell: str) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,24.30\nC-D,,1e5,{cell}\nA-B,,1e5,24.31\n")
    assert [row.number for row in recording.rows] == [1, 3]
    (finding,) = recording.findings
    assert (finding.level, finding.code, finding.where) == ("caution", "overload", f"{tmp_path / 'a.csv'} row 2")
    assert cell in finding.text


@pytest.mark.parametrize("cell", ["about 5", "24 uH", "n/a", "9.9E36x", "1 000", "=A1", "\x1b[2J"])
def test_text_leaves_the_row_out(tmp_path: Path, cell: str) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,24.30\nC-D,,1e5,{cell}\n")
    (finding,) = recording.findings
    assert (len(recording.rows), finding.level, finding.code) == (1, "caution", "left out")
    assert finding.text.isprintable()


@pytest.mark.parametrize("cell", ["9.95e37", "9.8e37", "1e37"])
def test_large_numbers_that_are_no_sentinels_stay(tmp_path: Path, cell: str) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,{cell}\n")
    assert recording.findings == ()


def test_a_bad_frequency_or_point_leaves_the_row_out(tmp_path: Path) -> None:
    text = f"{PREFACE}across,frequency [Hz],point gap [mm],inductance [uH]\nA-B,x,8,5\nA-B,1e5,y,5\nA-B,1e5,8,5\n"
    recording = read_text(tmp_path, text)
    assert [row.number for row in recording.rows] == [3]
    assert [finding.code for finding in recording.findings] == ["left out", "left out"]


@pytest.mark.parametrize(
    ("status", "good"), [("0", True), ("", True), ("0.0", True), ("+0", True), ("1", False), ("E", False)]
)
def test_status_other_than_zero_leaves_the_row_out(tmp_path: Path, status: str, good: bool) -> None:
    recording = read_text(tmp_path, f"{PREFACE}across,inductance [uH],status\nA-B,24.3,{status}\nC-D,18.9,0\n")
    assert [row.number for row in recording.rows] == ([1, 2] if good else [2])
    assert [f.code for f in recording.findings] == ([] if good else ["left out"])


def test_rows_without_values_are_left_out_with_one_note_for_each_run(tmp_path: Path) -> None:
    rows = "A-B,,,\nA-B,,1e5,5\nA-B,,1e5,\nC-D,,,\n,,,\nC-D,,1e5,6\n"
    recording = read_text(tmp_path, PREFACE + HEADER + rows)
    assert [row.number for row in recording.rows] == [2, 6]
    file = tmp_path / "a.csv"
    assert recording.findings == (
        Finding("note", "left out", "the row has no value filled in; it is left out", f"{file} row 1"),
        Finding("note", "left out", "rows 3 to 5 have no value filled in; they are left out", f"{file} row 3"),
    )
    assert recording.source is not None and recording.source.rows == 2


def test_what_was_fed_alone_is_no_reading(tmp_path: Path) -> None:
    text = f"{PREFACE}across,sense,frequency [Hz],drive [V],sensed [V]\nA-B,C-D,50,1.0,\nA-B,C-D,50,1.0,0.5\n"
    assert [row.number for row in read_text(tmp_path, text).rows] == [2]


def test_open_where_nothing_conducts(tmp_path: Path) -> None:
    row = read_text(tmp_path, f"{PREFACE}across,tied,frequency [Hz],resistance [ohm]\nA-C,,0,open\n").rows[0]
    assert row.values == {"resistance": Value(math.inf)}


def test_rows_and_lines_are_counted_past_blank_lines_and_cells_of_several_lines(tmp_path: Path) -> None:
    rows = '\nA-B,5,"two\nlines"\n\nC-D,6,\n'
    recording = read_text(tmp_path, f"{PREFACE}\nacross,inductance [uH],note\n{rows}")
    assert [(row.number, row.line) for row in recording.rows] == [(1, 10), (2, 13)]


def test_a_column_without_a_unit_takes_that_of_the_contract_and_says_so(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}across,frequency,inductance,phase\nA-B,1e5,24.3e-6,90\n")
    row = recording.rows[0]
    assert (row.frequency, row.values["inductance"].value) == (1e5, 24.3e-6)
    assert row.values["phase"].value == pytest.approx(math.pi / 2)
    assert [f.code for f in recording.findings] == ["unit"] * 3
    assert all(f.level == "caution" for f in recording.findings)


def test_a_gain_without_percent_is_a_ratio_and_says_so(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}# [meter]\n# gain = 0.001\n{HEADER}{ROWS}")
    assert recording.instruments["meter"].gain == 0.001
    (finding,) = recording.findings
    assert (finding.level, finding.code) == ("caution", "unit")
    assert "0.1 %" in finding.text


def test_a_unit_in_a_cell_is_explained(tmp_path: Path) -> None:
    (finding,) = read_text(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,24.30\nC-D,,1e5,18.9 uH\n").findings
    assert "belongs in the header" in finding.text


def test_a_note_may_begin_like_a_preface(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}note,across,inductance [uH]\n#3 again,A-B,24.3\n")
    assert len(recording.rows) == 1


def test_points_of_mixed_cells_are_text(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}across,point gap,inductance [uH]\nA-B,1,5\nA-B,wide,6\nA-B,,7\n")
    assert [row.point for row in recording.rows] == [{"gap": "1"}, {"gap": "wide"}, {}]


def test_hookups_may_share_leads_and_have_several_ties(tmp_path: Path) -> None:
    preface = PREFACE.replace('["C", "D"]', '["B", "C"]')
    recording = read_text(tmp_path, f"{preface}{HEADER}A-C,,1e5,5\nA-B, A-C ,1e5,5\n")
    assert recording.rows[0].hookup == Hookup(("A", "C"))
    assert recording.rows[1].hookup == Hookup(("A", "B"), (("A", "C"),))


def test_reading_loads_neither_pandas_nor_numpy(tmp_path: Path) -> None:
    file = tmp_path / "a.csv"
    file.write_text(PREFACE + HEADER + ROWS, encoding="utf-8")
    program = (
        "import sys, mutual.recording\n"
        f"mutual.recording.read({str(file)!r})\n"
        "print(sorted({'numpy', 'scipy', 'pandas', 'pyvisa', 'click'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
