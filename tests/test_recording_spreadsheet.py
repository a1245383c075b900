"""What spreadsheets do to a file when they save it: understood as the file was meant."""

from __future__ import annotations

import csv
import io
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from texts import PREFACE, ROWS, read_text, refused

from mutual.device import Device, Hookup, Winding
from mutual.recording import Recording, dumps
from mutual.recording.model import Row, Value

PLAIN = f"""\
# format = "mutual-recording-1"
# device = "latch coils, gap 8 mm, ""invented""
# shared_loss = 0.2
# # a comment, with a comma
#
# [windings]
# pad = ["A", "B"]
# latch = ["C","D"]
# [meter]
# gain_common = "0.1 %"
# floor = ["5 nH", "1 mohm"]
# noise = [
#   "1 nH",
#   "2 mohm"
# ]
# [limits]
# "coupling pad latch" = {{lower = 0.11, upper = 0.14}}
across,tied,frequency [Hz],inductance [uH]
{ROWS}A-D,B-C,100e3,48.40
""".replace('""invented""', "'invented'\"")


def as_saved(text: str, *, quote_all: bool, pad: bool, end: str = "\r\n") -> str:
    """Text as a spreadsheet saves it: each line cut at commas, quoted where needed, padded to one width."""
    rows = list(csv.reader(io.StringIO(text)))
    width = max(map(len, rows)) if pad else 0
    out = io.StringIO()
    quoting = csv.QUOTE_ALL if quote_all else csv.QUOTE_MINIMAL
    csv.writer(out, lineterminator=end, quoting=quoting).writerows(r + [""] * (width - len(r)) for r in rows)
    return out.getvalue()


def meaning(recording: Recording) -> Recording:
    """What a file says, without its name and fingerprint."""
    return replace(recording, source=None)


@pytest.mark.parametrize("mark", ["", "\ufeff"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("pad", [False, True])
@pytest.mark.parametrize("quote_all", [False, True])
def test_quoted_padded_marked_and_with_other_line_ends(
    tmp_path: Path, quote_all: bool, pad: bool, end: str, mark: str
) -> None:
    spoiled = mark + as_saved(PLAIN, quote_all=quote_all, pad=pad, end=end)
    assert spoiled != PLAIN
    meant = read_text(tmp_path, PLAIN)
    assert len(meant.rows) == 3 and len(meant.instruments["meter"].noise) == 2
    assert meaning(read_text(tmp_path, spoiled)) == meaning(meant)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends_and_a_mark_alone(tmp_path: Path, end: str) -> None:
    spoiled = "\ufeff" + PLAIN.replace("\n", end)
    assert meaning(read_text(tmp_path, spoiled)) == meaning(read_text(tmp_path, PLAIN))


def test_lines_padded_but_not_quoted(tmp_path: Path) -> None:
    spoiled = "".join(line + (",,,\n" if line.startswith("#") else "\n") for line in PLAIN.splitlines())
    assert meaning(read_text(tmp_path, spoiled)) == meaning(read_text(tmp_path, PLAIN))


def test_wide_preface_lines_pad_the_rows_as_well(tmp_path: Path) -> None:
    preface = PREFACE.replace("# [windings]", '# leads = ["E", "F", "G", "H", "I", "J", "K"]\n# [windings]')
    plain = f"{preface}across,inductance [uH]\nA-B,5\n"
    spoiled = as_saved(plain, quote_all=False, pad=True)
    assert "A-B,5,,,,," in spoiled
    assert meaning(read_text(tmp_path, spoiled)) == meaning(read_text(tmp_path, plain))


def test_rows_whose_padding_a_spreadsheet_dropped(tmp_path: Path) -> None:
    text = f"{PREFACE}across,inductance [uH],,,\nA-B,5,,,\nC-D,6\n"
    assert len(read_text(tmp_path, text).rows) == 2


def test_a_value_under_the_padding_is_refused(tmp_path: Path) -> None:
    error = refused(tmp_path, f"{PREFACE}across,inductance [uH],,,\nA-B,5,,,7\n")
    assert (error.row, error.line) == (1, 8)


def test_a_value_under_an_empty_title_is_refused(tmp_path: Path) -> None:
    error = refused(tmp_path, f"{PREFACE}across,,inductance [uH]\nA-B,,6\nA-B,5,6\n")
    assert (error.row, error.line, error.found) == (2, 9, "'5'")


def test_blank_padded_lines_between_preface_and_header(tmp_path: Path) -> None:
    text = f"{PREFACE},,\n\nacross,tied,inductance [uH]\nA-B,,5\n"
    assert read_text(tmp_path, text).rows[0].line == 10


def test_numbers_of_leads_that_lost_their_quotes(tmp_path: Path) -> None:
    plain = (
        PREFACE.replace('["A", "B"]', '["1","2"]').replace('["C", "D"]', '["3","4"]')
        + "across,inductance [uH]\n1-2,5\n"
    )
    spoiled = as_saved(plain, quote_all=False, pad=True)
    assert '",2]' in spoiled  # the quotes of the second lead are gone for good
    recording = read_text(tmp_path, spoiled)
    assert recording.device.leads == ("1", "2", "3", "4")


def test_an_error_in_a_spoiled_preface_names_the_line_of_the_file(tmp_path: Path) -> None:
    spoiled = as_saved(PLAIN.replace('gain_common = "0.1 %"', "gain_common is small"), quote_all=True, pad=True)
    error = refused(tmp_path, spoiled)
    assert error.line == 10
    assert "gain_common is small" in str(error.found)


def test_a_key_refused_in_a_spoiled_preface_names_the_line_of_the_file(tmp_path: Path) -> None:
    spoiled = as_saved(PLAIN.replace("gain_common", "gain_comon"), quote_all=False, pad=True)
    error = refused(tmp_path, spoiled)
    assert (error.line, error.column, error.expected) == (10, "meter.gain_comon", "gain_common")


def test_a_name_that_ends_in_a_comma_survives_a_spreadsheet(tmp_path: Path) -> None:
    recording = replace(read_text(tmp_path, PREFACE + "across,inductance [uH]\nA-B,5\n"), source=None)
    named = replace(recording, device=replace(recording.device, name="coils, invented,"))
    spoiled = as_saved(dumps(named), quote_all=False, pad=True)
    assert read_text(tmp_path, spoiled).device == named.device


NAMES = st.text(st.sampled_from("AbZ09_=[]{}.;:!\u00e4\u03bc"), min_size=1, max_size=4)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)
@given(
    device=st.text(st.characters(blacklist_categories=["Cc", "Cs", "Zl", "Zp"]), max_size=20),
    leads=st.lists(NAMES, min_size=4, max_size=4, unique=True),
    quote_all=st.booleans(),
    pad=st.booleans(),
)
def test_any_device_and_leads_survive_a_spreadsheet(
    tmp_path: Path, device: str, leads: list[str], quote_all: bool, pad: bool
) -> None:
    a, b, c, d = leads
    row = Row(1, Hookup((a, b), ((c, d),)), frequency=1e3, values={"inductance": Value(5e-6, 1e-8)})
    recording = Recording(Device(device, (Winding("one", a, b), Winding("two", c, d))), (row,))
    spoiled = as_saved(dumps(recording), quote_all=quote_all, pad=pad)
    again = read_text(tmp_path, spoiled)
    assert again.device == recording.device
    assert again.rows[0].hookup == row.hookup
