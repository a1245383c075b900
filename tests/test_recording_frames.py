"""Recordings built from a DataFrame."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pandas as pd
import pytest

from mutual.device import Hookup
from mutual.errors import RefusedInput
from mutual.recording import Recording, from_readings
from mutual.recording.model import Value

PAIR = {"pad": ("A", "B"), "latch": ("C", "D")}


def frame(**columns: Any) -> pd.DataFrame:
    """Two hookups and whatever else is given."""
    return pd.DataFrame({"across": ["A-B", "A-D"], "tied": ["", "B-C"], **columns})


def test_numbers_from_python_have_no_last_digit() -> None:
    data = frame(**{"frequency [kHz]": [100, 100], "inductance [uH]": [24.3, 48.4], "resistance [ohm]": ["0.110", ""]})
    recording = Recording.from_readings(data, windings=PAIR, meter={"gain_common": "0.1 %"}, device="coils, invented")
    first, second = recording.rows
    assert first.hookup == Hookup(("A", "B"))
    assert second.hookup == Hookup(("A", "D"), (("B", "C"),))
    assert first.frequency == 1e5
    assert first.values == {"inductance": Value(24.3e-6), "resistance": Value(0.11, 0.001)}
    assert second.values == {"inductance": Value(48.4e-6)}
    assert (first.number, first.line, second.number) == (1, None, 2)
    assert recording.device.name == "coils, invented"
    assert recording.instruments["meter"].gain_common == 0.001
    assert recording.source is None
    assert recording.findings == ()


def test_plain_si_columns_need_no_unit_and_raise_no_finding() -> None:
    recording = from_readings(frame(inductance=np.array([24.3e-6, 48.4e-6])), PAIR)
    assert [row.values["inductance"].value for row in recording.rows] == [24.3e-6, 48.4e-6]
    assert recording.findings == ()


@pytest.mark.parametrize("missing", [None, math.nan, np.nan, pd.NA, pd.NaT, ""])
def test_what_is_missing_was_not_read(missing: object) -> None:
    data = frame(**{"inductance [uH]": [24.3, 48.4], "quality": pd.Series([missing, 30.0], dtype=object)})
    first, second = from_readings(data, PAIR).rows
    assert set(first.values) == {"inductance"}
    assert second.values["quality"] == Value(30.0)


def test_a_missing_tie_is_none() -> None:
    data = pd.DataFrame({"across": ["A-B", "A-D"], "tied": [None, "B-C"], "inductance [uH]": [1.0, 2.0]})
    assert [row.hookup.tied for row in from_readings(data, PAIR).rows] == [(), (("B", "C"),)]


def test_rows_with_nothing_but_missing_values_are_left_out() -> None:
    recording = from_readings(frame(**{"inductance [uH]": [math.nan, 48.4]}), PAIR)
    assert [row.number for row in recording.rows] == [2]
    assert [(f.level, f.code, f.where) for f in recording.findings] == [("note", "left out", "(in memory) row 1")]


@pytest.mark.parametrize("value", [math.inf, 9.9e37, np.float32(9.91e37), "9.9E37"])
def test_overload(value: object) -> None:
    data = frame(**{"inductance [uH]": pd.Series([value, 48.4], dtype=object)})
    recording = from_readings(data, PAIR)
    assert [row.number for row in recording.rows] == [2]
    assert recording.findings[0].code == "overload"


@pytest.mark.parametrize("value", [True, 1j, [1.0]])
def test_objects_that_are_no_numbers_leave_the_row_out(value: object) -> None:
    data = frame(**{"inductance [uH]": pd.Series([value, 48.4], dtype=object)})
    recording = from_readings(data, PAIR)
    assert [row.number for row in recording.rows] == [2]


def test_gains_may_be_numbers_here() -> None:
    recording = from_readings(frame(inductance=[1e-6, 2e-6]), PAIR, meter={"gain": 0.002, "counts": np.int64(3)})
    assert recording.instruments["meter"].gain == 0.002
    assert recording.instruments["meter"].counts == 3.0
    assert recording.findings == ()


@pytest.mark.parametrize(
    ("columns", "windings", "tables", "row", "column"),
    [
        ({"inductance [uH]": [24.3, 48.4]}, {"pad": ("A", "B")}, {}, 2, "across"),
        ({"inductance [uH]": [24.3, 48.4]}, {"pad": "AB"}, {}, None, "windings.pad"),
        ({"inductance [uH]": [24.3, 48.4]}, PAIR, {"metre": {"gain": "1 %"}}, None, "metre"),
        ({"inductance [uH]": [24.3, 48.4]}, PAIR, {"meter": {"gain": -0.1}}, None, "meter.gain"),
        ({"inductance [uH]": [24.3, 48.4]}, PAIR, {"meter": {"floor": 5e-9}}, None, "meter.floor"),
        ({"inductance [uh]": [24.3, 48.4]}, PAIR, {}, None, "inductance [uh]"),
        ({"inductance [uH]": [24.3, 48.4], "frequency": [1e3, 0]}, PAIR, {}, 2, "inductance [uH]"),
        ({"inductance [uH]": [24.3, "48,4"]}, PAIR, {}, 2, "inductance [uH]"),
        ({"inductance [uH]": [24.3, -3.0]}, PAIR, {}, 2, "inductance"),
        ({3: [1, 2]}, PAIR, {}, None, "3"),
    ],
)
def test_refused(
    columns: dict[Any, Any], windings: dict[str, Any], tables: dict[str, Any], row: int | None, column: str
) -> None:
    data = pd.concat([frame(), pd.DataFrame(columns)], axis=1)
    with pytest.raises(RefusedInput) as caught:
        from_readings(data, windings, **tables)
    assert (caught.value.row, caught.value.column, caught.value.file) == (row, column, "(in memory)")


def test_doubled_columns_are_refused() -> None:
    data = pd.concat([frame(inductance=[1e-6, 2e-6]), pd.DataFrame({"inductance": [1e-6, 2e-6]})], axis=1)
    with pytest.raises(RefusedInput, match="stands twice"):
        from_readings(data, PAIR)


def test_an_empty_frame_is_refused() -> None:
    with pytest.raises(RefusedInput, match="no row"):
        from_readings(frame(inductance=[1e-6, 2e-6]).iloc[:0], PAIR)
