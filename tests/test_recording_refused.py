"""Bad input: each refused in one sentence that names row, line and column, what was found and what is expected."""

from __future__ import annotations

import time
from pathlib import Path

import pytest
from texts import FIRST_ROW_LINE, HEADER, PREFACE, ROWS, read_text, refused

from mutual.errors import RefusedInput
from mutual.recording import read

SENSED = "across,tied,sense,frequency [Hz],transfer inductance [uH],kick on make\n"


def test_a_missing_file(tmp_path: Path) -> None:
    with pytest.raises(RefusedInput, match="no such file") as caught:
        read(tmp_path / "none.csv")
    assert caught.value.file == str(tmp_path / "none.csv")


def test_a_folder(tmp_path: Path) -> None:
    with pytest.raises(RefusedInput, match="folder"):
        read(tmp_path)


def test_a_name_that_no_file_can_have() -> None:
    with pytest.raises(RefusedInput, match="cannot be read") as caught:
        read("a\0b\x1b[31m.csv")
    assert str(caught.value).isprintable()


@pytest.mark.parametrize(
    ("data", "reason", "line"),
    [
        (b"", "empty", None),
        (b" \r\n\n", "empty", None),
        (b"\xef\xbb\xbf", "empty", None),
        ((PREFACE + HEADER).encode("utf-16"), "UTF-16", None),
        ((PREFACE + HEADER).encode("utf-16-le"), "UTF-16", None),
        ((PREFACE + HEADER).encode("utf-16-be"), "UTF-16", None),
        (b"PK\x03\x04 and so on", "workbook", None),
        ((PREFACE + HEADER).encode() + b"A-B\0", "binary", 8),
        (PREFACE.encode() + b"across,tied,inductance [\xb5H]\n", "UTF-8", 7),
        (PREFACE.encode(), "no header", None),
        (b"# \n", "no header", None),
        ((PREFACE + HEADER).encode(), "no row", None),
        ((PREFACE + HEADER + "\n\n").encode(), "no row", None),
    ],
)
def test_files_with_nothing_to_read(tmp_path: Path, data: bytes, reason: str, line: int | None) -> None:
    error = refused(tmp_path, data)
    assert reason in error.reason
    assert error.line == line
    assert error.row is None


# Line of the preface to add before [windings] or after the windings, then line, column, found, expected.
@pytest.mark.parametrize(
    ("before", "after", "line", "column", "found", "expected"),
    [
        ("Measured on the bench today", "", 4, None, "Measured on", "device"),
        ("shared_loss = ", "", 4, None, "shared_loss", "device"),
        ('device = "again"', "", 4, None, "again", ""),
        ("shared_loss = 1.5", "", 4, "shared_loss", "1.5", "0 to 1"),
        ('shared_loss = "0.5"', "", 4, "shared_loss", "0.5", "0 to 1"),
        ("shared_loss = nan", "", 4, "shared_loss", "nan", "0 to 1"),
        ('arangement = "one limb"', "", 4, "arangement", "arangement", "arrangement"),
        ('arrangement = "one limbs"', "", 4, "arrangement", "one limbs", "one limb"),
        ('internal = ["N"]', "", 4, "internal", "N", ""),
        ('earthed = "B"', "", 4, "earthed", "B", '["A", "B"]'),
        ('earthed = ["b"]', "", 4, "earthed", "b", "B"),
        ('leads = ["E F"]', "", 4, "leads", "E F", "no space"),
        ("leads = [1.5]", "", 4, "leads", "1.5", "such as"),
        ("loads = {}", "", 4, "loads", None, "nothing connected"),
        ("meter = 5", "", 4, "meter", "5", "[meter]"),
        ("limits = 5", "", 4, "limits", "5", "[limits]"),
        ("", 'spare = ["E"]', 7, "windings.spare", "E", "two"),
        ("", 'spare = ["E", "F", "G"]', 7, "windings.spare", "G", "two"),
        ("", 'spare = "E-F"', 7, "windings.spare", "E-F", '["A", "B"]'),
        ("", 'spare = ["E", "E"]', 7, "windings.spare", "E", "two leads"),
        ("", 'spare = ["B", "A"]', 7, "windings.spare", "B-A", ""),
        ("", 'spare = ["E-1", "F"]', 7, "windings.spare", "E-1", "no space, hyphen"),
        ("", 'spare = ["E", ""]', 7, "windings.spare", None, ""),
        ("", 'spare = ["E", "F\\u001b"]', 7, "windings.spare", "F\\x1b", "no space"),
        ("", '"my coil" = ["E", "F"]', 7, "windings.my coil", "my coil", "no space"),
        ("", 'spare = ["E", true]', 7, "windings.spare", "True", "such as"),
        ("", '[metre]\n# gain = "1 %"', 7, "metre", "metre", "meter"),
        ("", '[meter]\n# gian = "1 %"', 8, "meter.gian", "gian", "gain"),
        ("", '[meter]\n# gain = "-1 %"', 8, "meter.gain", "-1 %", ""),
        ("", '[meter]\n# gain = "1 uH"', 8, "meter.gain", "1 uH", "%"),
        ("", "[meter]\n# gain = true", 8, "meter.gain", "True", "0.1 %"),
        ("", "[meter]\n# gain = inf", 8, "meter.gain", "inf", "0.1 %"),
        ("", '[meter]\n# phase = "1 %"', 8, "meter.phase", "1 %", "deg"),
        ("", "[meter]\n# phase = 0.1", 8, "meter.phase", "0.1", "deg"),
        ("", "[meter]\n# floor = 5e-9", 8, "meter.floor", "5e-09", "5 nH"),
        ("", '[meter]\n# floor = "5"', 8, "meter.floor", "5", "5 nH"),
        ("", '[meter]\n# noise = "0.1 %"', 8, "meter.noise", "0.1 %", "5 nH"),
        ("", '[meter]\n# noise = ["1 nH", "-2 mohm"]', 8, "meter.noise", "-2 mohm", ""),
        ("", '[meter]\n# noise = ["1 nH", "2 nH"]', 8, "meter.noise", "1 nH, 2 nH", ""),
        ("", '[meter]\n# resolution = "1 MH"', 8, "meter.resolution", "1 MH", "mH"),
        ("", '[meter]\n# floor = "5 mm"', 8, "meter.floor", "5 mm", "5 nH"),
        ("", "[meter]\n# counts = -1", 8, "meter.counts", "-1", "steps"),
        ("", '[meter]\n# stated_as = "limits"', 8, "meter.stated_as", "limits", "expanded"),
        ("", '[meter]\n# low_q_factor = "1 + Q"', 8, "meter.low_q_factor", "1 + Q", "1 + 1/Q"),
        ("", '[meter]\n# shunt_floor = "1 nH"', 8, "meter.shunt_floor", "1 nH", "S"),
        ("", '["bridge 2"]\n# gain = "1 %"', 7, "bridge 2", "bridge 2", ""),
        ("", "[kick]\n# misread = 0.6", 8, "kick.misread", "0.6", "0 to 0.5"),
        ("", "[kick]\n# missread = 0.1", 8, "kick.missread", "missread", "misread"),
        ("", '[ties]\n# resistance = "1 uH"', 8, "ties.resistance", "1 uH", "mohm"),
        ("", '[ties]\n# inductance = "-1 nH"', 8, "ties.inductance", "-1 nH", "nH"),
        ("", '[ties]\n# resistence = "1 ohm"', 8, "ties.resistence", "resistence", "resistance"),
        ("", '[limits]\n# "copling pad latch" = {upper = 1}', 8, "limits.copling pad latch", "copling", "coupling"),
        ("", '[limits]\n# "coupling pad lach" = {upper = 1}', 8, "limits.coupling pad lach", "lach", "latch"),
        ("", '[limits]\n# "coupling pad" = {upper = 1}', 8, "limits.coupling pad", "coupling pad", "two"),
        ("", '[limits]\n# "inductance pad" = {upper = 1}', 8, "limits.inductance pad", "1", "H"),
        ("", '[limits]\n# "inductance pad" = {uper = "1 H"}', 8, "limits.inductance pad", "uper", "upper"),
        ("", '[limits]\n# "inductance pad" = {}', 8, "limits.inductance pad", "{}", "upper"),
        ("", '[limits]\n# "coupling pad latch" = {lower = 0.2, upper = 0.1}', 8, "limits.coupling pad latch", "", ""),
        ("", "x = " + "[" * 20000, 1, None, None, ""),
        ("", "a." * 100000 + "b = 1", 7, None, "a.a.a.", ""),
    ],
)
def test_prefaces(
    tmp_path: Path, before: str, after: str, line: int, column: str | None, found: str | None, expected: str
) -> None:
    lines = PREFACE.splitlines()
    if before:
        lines.insert(3, f"# {before}")
    if after:
        lines.append(f"# {after}")
    error = refused(tmp_path, "\n".join([*lines, HEADER + ROWS]))
    assert (error.line, error.column, error.row) == (line, column, None)
    assert found is None or found in str(error.found)
    assert expected in str(error.expected)


@pytest.mark.parametrize(
    ("key", "value", "reason", "expected"),
    [
        ("format", "mutual-recording-2", "newer", "mutual-recording-1"),
        ("format", "mutual-device-1", "unknown format", "mutual-recording-1"),
        ("kind", "waveform", "waveform recordings are not read yet", "readings"),
        ("kind", "reading", "unknown kind", "readings"),
    ],
)
def test_another_format_or_kind(tmp_path: Path, key: str, value: str, reason: str, expected: str) -> None:
    old = {"format": "mutual-recording-1", "kind": "readings"}[key]
    error = refused(tmp_path, PREFACE.replace(f'{key} = "{old}"', f'{key} = "{value}"') + HEADER + ROWS)
    assert reason in error.reason
    assert error.column == key
    assert error.line == {"format": 1, "kind": 2}[key]
    assert value in str(error.found)
    assert expected in str(error.expected)


def test_no_winding_at_all(tmp_path: Path) -> None:
    error = refused(tmp_path, HEADER + ROWS)
    assert "no winding" in error.reason
    assert "--winding" in str(error.expected)


@pytest.mark.parametrize(
    ("header", "column", "found", "expected"),
    [
        ("across,tied,frequency [Hz],inductence [uH]", "inductence [uH]", "inductence", "'inductance'"),
        ("across,tied,frequency [Hz],Inductance [uH]", "Inductance [uH]", "Inductance", "'inductance'"),
        ("acros,tied,frequency [Hz],inductance [uH]", "acros", "acros", "'across'"),
        ("across,tied,frequency [Hz],inductance [uh]", "inductance [uh]", "'uh'", "uH"),
        ("across,tied,frequency [Hz],inductance [MH]", "inductance [MH]", "'MH'", "mH"),
        ("across,tied,frequency [Hz],inductance [ohm]", "inductance [ohm]", "'ohm'", "uH"),
        ("across,tied,frequency [rpm],inductance [uH]", "frequency [rpm]", "'rpm'", "Hz"),
        ("across,tied,level [ohm],inductance [uH]", "level [ohm]", "'ohm'", "V or A"),
        ("across,tied,frequency [Hz],inductance (uH)", "inductance (uH)", "(uH)", "'inductance'"),
        ("across,tied [V],frequency [Hz],inductance [uH]", "tied [V]", "tied [V]", "'tied'"),
        ("across,tied,point [mm],inductance [uH]", "point [mm]", "point", "gap"),
        ("across,tied,inductance [mH],inductance [uH]", "inductance", "[mH]' and ", "one of them"),
        ("across,across,frequency [Hz],inductance [uH]", "across", "'across' and 'across'", "one of them"),
        ("across,tied,point gap [mm],point gap [um],inductance [uH]", "point gap", "point gap", "one of them"),
        ("across,tied,frequency [Hz],temperature [degC]", None, "temperature", "inductance"),
        ("tied,sense,frequency [Hz],inductance [uH]", None, None, "--across"),
    ],
)
def test_headers(tmp_path: Path, header: str, column: str | None, found: str | None, expected: str) -> None:
    error = refused(tmp_path, f"{PREFACE}{header}\n{ROWS}")
    assert error.row is None
    assert error.column == column
    assert found is None or found in str(error.found)
    assert expected in str(error.expected)


@pytest.mark.parametrize(("sign", "name"), [(";", "semicolons"), ("\t", "tabs"), ("|", "bars")])
def test_other_delimiters(tmp_path: Path, sign: str, name: str) -> None:
    error = refused(tmp_path, PREFACE + (HEADER + ROWS).replace(",", sign))
    assert name in error.reason
    assert error.line == 7
    assert "commas" in str(error.expected)


# The bad row stands second: row 2, line FIRST_ROW_LINE + 1.
@pytest.mark.parametrize(
    ("row", "column", "found", "expected"),
    [
        ("A-E,,100e3,24", "across", "'A-E'", "A, B, C, D"),
        ("a-B,,100e3,24", "across", "'a-B'", "nearest: A"),
        ("A,,100e3,24", "across", "'A'", "A-B"),
        ("A-B-C,,100e3,24", "across", "'A-B-C'", "A-B"),
        ("A\u2013B,,100e3,24", "across", "A\u2013B", "plain hyphen"),
        (",,100e3,24", "across", "empty", "A-B"),
        ("A-A,,100e3,24", "across", "A-A", ""),
        ("A-B,C-E,100e3,24", "tied", "'C-E'", "A, B, C, D"),
        ("A-B,C D,100e3,24", "tied", "'C'", "A-B"),
        ("A-B,C-C,100e3,24", "tied", "C-C", ""),
        ("A-B,A-B,100e3,24", "tied", "A-B tied A-B", ""),
        ("A-B,A-C C-B,100e3,24", "tied", "A-B tied A-C C-B", ""),
        ("A-C,,100e3,24", "across", "A-C", ""),
        ("A-B,,100e3,24,3", None, "5 fields", "decimal comma"),
        ("A-B,,100e3,24,x", None, "5 fields", "4 fields"),
        ("A-B,,100e3,24,", None, "5 fields", "4 fields"),
        ("A-B,,100e3", None, "3 fields", "4 fields"),
        ("A-B", None, "1 fields", "4 fields"),
        ('A-B,,100e3,"24,3"', "inductance [uH]", "'24,3'", "decimal point"),
        ("# A-B,,100e3,24", None, "# A-B", ""),
        ("A-B,,0,24", "inductance [uH]", "0 Hz", "frequency"),
        ("A-B,,-50,24", "frequency [Hz]", "-50", "zero or more"),
        ('A-B,"C-D,100e3,24', None, "A-B", "RFC 4180"),
        ('A-B,"C"-D,100e3,24', None, "A-B", "RFC 4180"),
        ("\x1b[31mA-B,,100e3,24", "across", "\\x1b[31mA", "A, B"),
        ("02-Jan,,100e3,24", "across", "02-Jan", "text"),
        (f"A-B,{'A-C ' * 1000}C-B,100e3,24", "tied", "A-B tied A-C A-C", ""),
    ],
)
def test_rows(tmp_path: Path, row: str, column: str | None, found: str, expected: str) -> None:
    error = refused(tmp_path, f"{PREFACE}{HEADER}A-B,,100e3,24.30\n{row}\nC-D,,100e3,18.90\n")
    assert (error.row, error.line) == (2, FIRST_ROW_LINE + 1)
    assert error.column == column
    assert found in str(error.found)
    assert expected in str(error.expected)


@pytest.mark.parametrize(
    ("header", "row", "column", "found"),
    [
        ("quality", "0,30", "quality", "0 Hz"),
        ("dissipation", "0,0.1", "dissipation", "0 Hz"),
        ("parallel inductance [uH]", "0,24", "parallel inductance [uH]", "0 Hz"),
        ("impedance [ohm]", "100,-3", "impedance [ohm]", "-3.000 ohm"),
        ("resistance [ohm]", "0,open", "resistance [ohm]", "A-B"),
    ],
)
def test_values_that_mean_nothing(tmp_path: Path, header: str, row: str, column: str, found: str) -> None:
    error = refused(tmp_path, f"{PREFACE}across,frequency [Hz],{header}\nA-B,{row}\n")
    assert (error.row, error.line, error.column) == (1, FIRST_ROW_LINE, column)
    assert found in str(error.found)


@pytest.mark.parametrize("row", ["A-B,,,1e3,5,", "A-B,,,,,+", "A-B,,C-E,1e3,5,", "A-B,,C-C,1e3,5,", "A-B,,A-C,1e3,5,"])
def test_a_sensed_voltage_needs_leads_that_define_it(tmp_path: Path, row: str) -> None:
    error = refused(tmp_path, f"{PREFACE}{SENSED}{row}\n")
    assert (error.row, error.line) == (1, FIRST_ROW_LINE)
    assert error.column in ("sense", "transfer inductance [uH]", "kick on make")


def test_open_leaves_nothing_else_to_read(tmp_path: Path) -> None:
    error = refused(tmp_path, f"{PREFACE}across,frequency [Hz],inductance [uH],resistance [ohm]\nA-C,1e3,5,open\n")
    assert error.column == "resistance [ohm]"
    assert error.row == 1


def test_an_internal_lead_cannot_be_used(tmp_path: Path) -> None:
    preface = PREFACE.replace("# [windings]", '# internal = ["D"]\n# [windings]')
    error = refused(tmp_path, f"{preface}{HEADER}A-B,,1e3,5\nC-D,,1e3,5\n")
    assert "internal" in error.reason
    assert (error.row, error.line, error.column) == (2, FIRST_ROW_LINE + 2, "across")


def test_earthed_leads_can_short_the_meter(tmp_path: Path) -> None:
    preface = PREFACE.replace("# [windings]", '# earthed = ["B", "D"]\n# [windings]')
    error = refused(tmp_path, f"{preface}{HEADER}A-B,,1e3,5\nB-D,A-C,1e3,5\n")
    assert "earthed" in error.reason
    assert error.row == 2


def test_a_named_instrument_needs_its_table(tmp_path: Path) -> None:
    preface = PREFACE + '# [bridge]\n# gain = "1 %"\n'
    header = "across,inductance [uH],instrument\n"
    error = refused(tmp_path, f"{preface}{header}A-B,5,bridge\nC-D,5,bridges\n")
    assert (error.row, error.column, error.found) == (2, "instrument", "'bridges'")
    assert "'bridge'" in str(error.expected)


@pytest.mark.parametrize(
    "date",
    [
        "02-Jan", "2-Jan", "1-Feb-24", "Jan-02", "Feb 2024", "2024-01-02", "2024-01-02 00:00:00", "1/2/2024",
        "01.02.2024", "02-Mrz", "2. Mai", "3-ao\u00fbt", "02/01/24", "02-J\u00e4n",
    ],
)  # fmt: skip
@pytest.mark.parametrize("column", ["across", "tied"])
def test_leads_turned_into_dates_are_recognised(tmp_path: Path, date: str, column: str) -> None:
    preface = PREFACE.replace('["A", "B"]', '["1", "2"]').replace('["C", "D"]', '["3", "4"]')
    row = f'"{date}",,1e3,5' if column == "across" else f'1-2,"{date}",1e3,5'
    error = refused(tmp_path, f"{preface}{HEADER}3-4,,1e3,5\n{row}\n")
    assert "date" in error.reason
    assert (error.row, error.line, error.column) == (2, FIRST_ROW_LINE + 1, column)
    assert date in str(error.found) or "\\x" in str(error.found)
    assert "text" in str(error.expected)


def test_leads_may_look_like_dates_where_they_are_declared(tmp_path: Path) -> None:
    preface = PREFACE.replace('["A", "B"]', '["2", "Jan"]')
    assert read_text(tmp_path, f"{preface}{HEADER}2-Jan,,1e3,5\n").rows[0].hookup.across == ("2", "Jan")


@pytest.mark.parametrize(
    ("table", "value", "refuses"),
    [
        ("", "-0.001", False),  # one display step below zero, 1 nH
        ("", "-0.002", True),
        ('# [meter]\n# floor = "5 nH"\n# noise = "1 nH"\n', "-0.009", False),  # 5 + 3 x 1 + 1 nH
        ('# [meter]\n# floor = "5 nH"\n# noise = "1 nH"\n', "-0.010", True),
        ('# [meter]\n# floor = "5 nH"\n# resolution = "4 nH"\n', "-0.009", False),
        ('# [meter]\n# floor = "5 nH"\n# resolution = "4 nH"\n', "-0.010", True),
        ("# [meter]\n# counts = 3\n", "-0.004", False),
        ("# [meter]\n# counts = 3\n", "-0.005", True),
        ('# [meter]\n# floor = "5 nH"\n# stated_as = "standard"\n', "-0.016", False),
        ('# [meter]\n# floor = "5 nH"\n# stated_as = "standard"\n', "-0.017", True),
    ],
)
def test_a_negative_inductance_within_the_accuracy_passes(
    tmp_path: Path, table: str, value: str, refuses: bool
) -> None:
    text = f"{PREFACE}{table}{HEADER}A-B,,1e5,24.300\nC-D,,1e5,{value}\n"
    if not refuses:
        assert read_text(tmp_path, text).rows[1].values["inductance"].value == float(f"{value}e-6")
        return
    error = refused(tmp_path, text)
    assert "beyond what floor, noise and resolution allow" in error.reason
    assert (error.row, error.column) == (2, "inductance")
    assert error.line == FIRST_ROW_LINE + 1 + table.count("\n")
    assert str(error.found).startswith(f"{float(value) * 1000:.2f}")


@pytest.mark.parametrize("header", ["inductance [uH]", "parallel inductance [uH]"])
def test_far_below_zero_the_reason_is_self_resonance(tmp_path: Path, header: str) -> None:
    error = refused(tmp_path, f"{PREFACE}across,frequency [Hz],{header}\nA-B,1e5,24.3\nA-B,2e6,-31.0\n")
    assert "self-resonance" in error.reason
    assert (error.row, error.line) == (2, FIRST_ROW_LINE + 1)
    assert error.found == "-31.00 uH"


def test_a_transfer_inductance_is_signed(tmp_path: Path) -> None:
    recording = read_text(tmp_path, f"{PREFACE}{SENSED}A-B,,C-D,1e5,-2.6,\n")
    assert recording.rows[0].values["transfer inductance"].value == -2.6e-6


def test_where_no_row_remains_the_first_cause_is_named(tmp_path: Path) -> None:
    error = refused(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,\nA-B,,1e5,9.9E37\nC-D,,1e5,none\n")
    assert (error.row, error.line, error.column) == (2, FIRST_ROW_LINE + 1, "inductance [uH]")
    assert error.found == "'9.9E37'"


def test_a_sheet_that_was_not_filled_in(tmp_path: Path) -> None:
    error = refused(tmp_path, f"{PREFACE}{HEADER}A-B,,1e5,\nC-D,,1e5,\n")
    assert "no value" in error.reason
    assert (error.row, error.line) == (1, FIRST_ROW_LINE)


@pytest.mark.parametrize(
    "line",
    [
        '# captured.text = "{}"'.format("x" * 10_000_000),
        "# # {}".format("x" * 10_000_000),
        "# captured.list = [{}]".format(('"' + "x" * 97 + '",') * 100_000),
    ],
    ids=["a long string", "a long comment", "a long list"],
)
def test_ten_megabytes_on_one_line_of_the_preface_are_read(tmp_path: Path, line: str) -> None:
    recording = read_text(tmp_path, f"{line}\n{PREFACE}{HEADER}{ROWS}")
    assert len(recording.rows) == 2


def test_ten_megabytes_in_a_note_are_read(tmp_path: Path) -> None:
    text = f"{PREFACE}across,inductance [uH],note\nA-B,5,{'x' * 10_000_000}\n"
    assert len(read_text(tmp_path, text).rows) == 1


@pytest.mark.parametrize(
    "text",
    [
        f"{PREFACE}across,inductance [uH]\nA-B,{'5' * 10_000_000}x\n",
        f"{PREFACE}across,inductance [uH]\nA-B{',5' * 5_000_000}\n",
        f"{PREFACE}across,inductance [uH]\n{'A' * 10_000_000},5\n",
        f"{PREFACE}{'across' * 2_000_000}\n",
        f"{PREFACE}{',' * 10_000_000}\n",
        f'{PREFACE}across,inductance [uH]\nA-B,"{"5" * 10_000_000}\n',
        f"# {'x' * 10_000_000}\n{PREFACE}{HEADER}{ROWS}",
        f"# {'x' * 10_000_000} = 1\n{PREFACE}{HEADER}{ROWS}",
        f"# x = {'1' * 10_000_000}\n{PREFACE}{HEADER}{ROWS}",
        f"# {'x.' * 5_000_000}y = 1\n{PREFACE}{HEADER}{ROWS}",
        f'# device = "{"[" * 10_000_000}\n{PREFACE}{HEADER}{ROWS}',
    ],
    ids=range(11),
)
def test_ten_megabytes_that_mean_nothing_are_refused_quickly(tmp_path: Path, text: str) -> None:
    start = time.perf_counter()
    refused(tmp_path, text)
    assert time.perf_counter() - start < 20


@pytest.mark.parametrize(
    "line",
    ["# a comment, 1", "captured.k{n} = {n}", 'notes.n{n} = {{x = ["y"]}}'],
    ids=["comments", "keys", "tables"],
)
def test_two_hundred_thousand_lines_of_preface_are_read_within_twenty_seconds(tmp_path: Path, line: str) -> None:
    text = "".join(f"# {line.format(n=n)}\n" for n in range(200_000))
    start = time.perf_counter()
    assert len(read_text(tmp_path, text + PREFACE + HEADER + ROWS).rows) == 2
    assert time.perf_counter() - start < 20


@pytest.mark.parametrize("line", ["k{n} = {n}", 'w{n} = ["a{n}", "b{n}"]', "[t{n}]"])
def test_two_hundred_thousand_lines_that_are_wrong_are_refused_within_twenty_seconds(tmp_path: Path, line: str) -> None:
    text = PREFACE + "".join(f"# {line.format(n=n)}\n" for n in range(200_000)) + HEADER + ROWS
    start = time.perf_counter()
    refused(tmp_path, text)
    assert time.perf_counter() - start < 20
