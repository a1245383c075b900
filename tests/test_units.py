"""Numbers with units: read, written, shown to people."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from mutual.errors import RefusedInput
from mutual.units import Parsed, engineering, parse, prefixed, printed, read_number, unit_of

FINITE = st.floats(allow_nan=False, allow_infinity=False)
# Sizes that instruments show, and far beyond on both sides.
SIZES = st.floats(min_value=1e-18, max_value=1e12)


@pytest.mark.parametrize(
    ("text", "value", "unit", "step"),
    [
        ("24.3uH", 24.3e-6, "H", 1e-7),
        ("24.30 uH", 24.3e-6, "H", 1e-8),
        (" 4.7 mH ", 4.7e-3, "H", 1e-4),
        ("5\u00b5H", 5e-6, "H", 1e-6),
        ("5\u03bcH", 5e-6, "H", 1e-6),
        ("3e-6 H", 3e-6, "H", 1e-6),
        ("1.50E+3ohm", 1500.0, "ohm", 10.0),
        ("1.2 k\u03a9", 1200.0, "ohm", 100.0),
        ("1.2 k\u2126", 1200.0, "ohm", 100.0),
        (".5 ohm", 0.5, "ohm", 0.1),
        ("-3 V", -3.0, "V", 1.0),
        ("\u22123 V", -3.0, "V", 1.0),
        ("100 kHz", 1e5, "Hz", 1e3),
        ("0.1 %", 1e-3, "1", 1e-3),
        ("50 ppm", 5e-5, "1", 1e-6),
        ("0.12", 0.12, "1", 0.01),
        ("0.5 nS", 5e-10, "S", 1e-10),
        ("2 mrad", 2e-3, "rad", 1e-3),
        ("180 deg", math.pi, "rad", math.pi / 180),
        ("8 mm", 8e-3, "m", 1e-3),
        ("2 in", 0.0508, "m", 0.0254),
        ("3 kg", 3.0, "kg", 1.0),
        ("21.5 \u00b0C", 21.5, "degC", 0.1),
    ],
)
def test_a_number_with_its_unit(text: str, value: float, unit: str, step: float) -> None:
    parsed = parse(text)
    assert (parsed.value, parsed.unit) == (value, unit)
    assert parsed.step == pytest.approx(step, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "unit", "found", "expected"),
    [
        ("24.3", "H", "'24.3'", "uH"),
        ("24.3u", "H", "'u'", "uH"),
        ("24.3 uh", "H", "'uh'", "uH"),
        ("35 mohm", "H", "'mohm'", "uH"),
        ("2,3 uH", "H", "'2,3 uH'", "decimal point"),
        ("uH", "H", "'uH'", "number"),
        ("", "H", "''", "number"),
        ("nan H", "H", "'nan H'", "number"),
        ("inf H", "H", "'inf H'", "number"),
        ("1e9999 H", "H", "'1e9999 H'", "number"),
        ("1 MH", "H", "'MH'", "mH"),
        ("1 MF", "F", "'MF'", "mF"),
        ("1 MH", None, "'MH'", "mH"),
        ("3 furlong", None, "'furlong'", "or the like"),
        ("3 m%", None, "'m%'", "or the like"),
        ("0.1 %", "rad", "'%'", "deg"),
        ("1", "rad", "'1'", "deg"),
        ("1_000 H", "H", "'_000 H'", "H"),
        ("\u0663 H", "H", "'\u0663 H'", "number"),
    ],
)
def test_refused_with_what_was_found_and_what_would_do(text: str, unit: str | None, found: str, expected: str) -> None:
    with pytest.raises(RefusedInput) as refused:
        parse(text, unit)
    assert refused.value.found == found
    assert expected in str(refused.value.expected)


def test_escape_codes_do_not_pass_through_a_refusal() -> None:
    with pytest.raises(RefusedInput) as refused:
        parse("3 \x1b[31mfoo\u202e", "H")
    assert str(refused.value).isprintable()


@pytest.mark.parametrize("symbol", ["MH", "MF", "Mhenry", "uf", "hz", "H m", "kkH", "daa"])
def test_unknown_units(symbol: str) -> None:
    with pytest.raises(RefusedInput):
        unit_of(symbol)


@pytest.mark.parametrize(("symbol", "base"), [("Mohm", "ohm"), ("MHz", "Hz"), ("daH", "H"), ("GH", "H"), ("cm", "m")])
def test_other_prefixes_are_taken(symbol: str, base: str) -> None:
    assert unit_of(symbol).base == base


def test_a_unit_of_another_kind_is_refused() -> None:
    with pytest.raises(RefusedInput, match="another kind"):
        unit_of("ohm", "H")


@pytest.mark.parametrize(
    "text", ["", "abc", "1,5", "nan", "inf", "1 2", "1e", "0x10", "1e12345", "--1", "1.2.3", "\u0661"]
)
def test_not_a_number(text: str) -> None:
    assert read_number(text, unit_of("H")) is None


def test_a_computed_number_has_no_last_digit() -> None:
    assert read_number("2.430000000000000", unit_of("uH")) == Parsed(2.43e-6, "H", None)
    assert read_number("2.43000000000000", unit_of("uH")).step == 1e-20
    assert read_number("0.00000000000000001", unit_of("H")).step == 1e-17  # one significant digit


@given(FINITE, st.sampled_from(["H", "uH", "mohm", "kHz", "%", "deg", "mrad", "in", "kg"]))
def test_a_written_number_reads_back_to_the_last_bit(value: float, symbol: str) -> None:
    unit = unit_of(symbol)
    for padded in (False, True):
        parsed = read_number(printed(value, unit, padded=padded), unit)
        assert parsed is not None
        assert parsed.value == value
        assert not padded or parsed.step is None


@given(st.decimals(-(10**9), 10**9, places=4), st.integers(-12, 6), st.sampled_from(["H", "uH", "deg", "mohm", "%"]))
def test_printed_digits_survive(number: object, exponent: int, symbol: str) -> None:
    unit = unit_of(symbol)
    parsed = read_number(f"{number}e{exponent}", unit)
    assert parsed is not None and parsed.step is not None
    assert read_number(printed(parsed.value, unit, parsed.step), unit) == parsed


def test_a_step_coarser_than_the_value_does_not_change_the_value() -> None:
    unit = unit_of("uH")
    assert read_number(printed(2.4356e-5, unit, 1e-6), unit).value == 2.4356e-5


@given(st.text(max_size=30))
def test_any_text_is_a_quantity_or_refused(text: str) -> None:
    try:
        parsed = parse(text)
    except RefusedInput as refused:
        assert str(refused).isprintable()
    else:
        assert math.isfinite(parsed.value)


@pytest.mark.parametrize(
    ("value", "unit", "options", "text"),
    [
        (2.575e-6, "H", {}, "2.575 uH"),
        (2.575e-6, "H", {"uncertainty": 1.2e-8}, "2.575 uH"),
        (2.575e-6, "H", {"uncertainty": 1.2e-7}, "2.58 uH"),
        (2.575e-6, "H", {"uncertainty": 3e-5}, "3 uH"),
        (9.99996e-6, "H", {}, "10.00 uH"),
        (999.96e-6, "H", {}, "1.000 mH"),
        (2.575e-6, "H", {"like": 1e-3}, "0.002575 mH"),
        (-3.2e-9, "H", {}, "-3.200 nH"),
        (-2e-9, "H", {"uncertainty": 1e-6}, "0.0 uH"),
        (0.0, "H", {}, "0.000 H"),
        (0.0, "ohm", {"uncertainty": 2e-3}, "0.0 mohm"),
        (0.1202, "1", {"uncertainty": 0.00034}, "0.12020"),
        (1e5, "Hz", {}, "100.0 kHz"),
        (1e7, "H", {}, "10000 kH"),
        (3.3e6, "ohm", {"digits": 2}, "3.3 Mohm"),
        (21.5, "degC", {"digits": 3}, "21.5 degC"),
        (math.inf, "ohm", {}, "inf ohm"),
        (1.0, "V", {"uncertainty": 1e-30}, "1.00000000000000 V"),
    ],
)
def test_engineering_notation(value: float, unit: str, options: dict[str, float], text: str) -> None:
    assert engineering(value, unit, **options) == text


@given(SIZES)
def test_the_chosen_prefix_leaves_one_to_three_digits(size: float) -> None:
    for base in ("V", "ohm"):
        number = size / float(prefixed(base, size).factor)
        assert 0.9999999 <= number < 1000.0000001 or not 1e-15 <= size < 1e12


@given(SIZES, st.sampled_from(["H", "ohm", "Hz", "1"]))
def test_four_digits_are_off_by_half_a_digit_at_most(size: float, unit: str) -> None:
    assert parse(engineering(size, unit)).value == pytest.approx(size, rel=0.0005001)
