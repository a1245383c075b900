"""`mutual pair`: what is typed, what comes out, and what is refused."""

from __future__ import annotations

import json
from math import pi, sqrt

import pytest
from click.testing import CliRunner

from mutual.cli import main

PAIR = ["pair", "--first", "24.3uH", "--second", "18.9uH", "--gain", "0.1%"]
SERIES = [*PAIR, "--one-way", "48.4uH", "--other-way", "38.1uH"]


@pytest.fixture
def run(monkeypatch):
    # a fault of the program must not pass for a refused input
    monkeypatch.setenv("MUTUAL_TRACEBACK", "1")

    def invoke(*words):
        result = CliRunner().invoke(main, words, prog_name="mutual")
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise result.exception
        return result

    return invoke


def estimate_of(result):
    assert result.exit_code == 0, result.output
    return json.loads(result.stdout)


def test_four_readings_give_m_k_and_dots(run):
    pair = estimate_of(run(*SERIES, "--json"))["pairs"][0]
    assert pair["mutual_H"]["value"] == pytest.approx(2.575e-6, abs=0.01e-6)
    assert pair["coupling"]["value"] == pytest.approx(2.575 / sqrt(24.3 * 18.9), abs=5e-4)
    assert pair["mutual_H"]["lower"] < 2.575e-6 < pair["mutual_H"]["upper"]
    assert pair["polarity"]["dot_leads"] == [["A", "C"], ["B", "D"]]


def test_the_report_fits_and_says_it_in_words(run):
    result = run(*SERIES, "--detail")
    assert result.exit_code == 0
    assert max(map(len, result.stdout.splitlines())) <= 80
    assert "A and C are alike" in result.stdout
    assert "(La - Lo)/4" in result.stdout
    assert result.stderr == ""


def test_exchanging_the_two_ways_turns_m_round(run):
    turned = estimate_of(run(*PAIR, "--one-way", "38.1uH", "--other-way", "48.4uH", "--json"))["pairs"][0]
    assert turned["mutual_H"]["value"] == pytest.approx(-2.575e-6, abs=0.01e-6)
    assert turned["polarity"]["verdict"] == "opposite"


def test_marks_that_agree_are_not_remarked_upon(run):
    found = estimate_of(run(*PAIR, "--aiding", "48.4uH", "--opposing", "38.1uH", "--json"))
    assert "marks contradicted" not in [f["code"] for f in found["findings"]]


@pytest.mark.parametrize("readings", [["--aiding", "38.1uH", "--opposing", "48.4uH"], ["--aiding", "38.1uH"]])
def test_marks_that_the_readings_contradict_are_a_caution(run, readings):
    found = estimate_of(run(*PAIR, *readings, "--json"))
    cautions = [f for f in found["findings"] if f["code"] == "marks contradicted"]
    assert [f["level"] for f in cautions] == ["caution"]
    text = " ".join(run(*PAIR, *readings).stdout.split())
    assert "caution, marks contradicted: The marks say" in text


def test_a_shorted_reading_with_q_or_resistance(run):
    words = ["pair", "--first", "24.3uH,120", "--second", "18.9uH,120", "--frequency", "100kHz"]
    words += ["--gain-common", "0.1%", "--phase-common", "0.1mrad"]
    ohms = 2 * pi * 1e5 * 23.95e-6 / 110
    by_q = estimate_of(run(*words, "--first-with-short", "23.95uH,110", "--json"))["pairs"][0]
    by_r = estimate_of(run(*words, "--first-with-short", f"23.95uH,{ohms:.6f}ohm", "--json"))["pairs"][0]
    for pair in (by_q, by_r):
        # at a Q of 100 the lossless formula is good to 1e-3
        assert pair["coupling"]["value"] == pytest.approx(sqrt(1 - 23.95 / 24.3), rel=2e-3)
        assert pair["mutual_H"] is None
    assert by_q["coupling"]["upper"] == pytest.approx(by_r["coupling"]["upper"], rel=1e-3)


def test_the_last_digit_typed_counts_as_the_display_step(run):
    words = ["pair", "--gain-common", "0.0001%", "--second", "18.900uH"]
    words += ["--one-way", "48.350uH", "--other-way", "38.050uH"]
    coarse = estimate_of(run(*words, "--first", "24uH", "--json"))["windings"]["first"]["inductance_H"]
    fine = estimate_of(run(*words, "--first", "24.300uH", "--json"))["windings"]["first"]["inductance_H"]
    assert coarse["upper"] - coarse["lower"] > fine["upper"] - fine["lower"]


def test_wider_coverage_gives_wider_bounds(run):
    narrow, wide = (
        estimate_of(run(*SERIES, "--coverage", c, "--json"))["pairs"][0]["coupling"] for c in ("0.8", "0.99")
    )
    assert wide["lower"] < narrow["lower"] < narrow["upper"] < wide["upper"]


def test_every_accuracy_option_reaches_the_meter(run):
    options = {
        "--gain-common": "0.2%", "--gain-each": "0.1%", "--phase-common": "1mrad", "--phase-each": "0.1deg",
        "--floor": "5nH", "--noise": "2nH", "--counts": "2", "--resolution": "10nH", "--shunt-floor": "0.5nS",
        "--low-q-factor": "1 + 1/Q", "--stated-as": "standard",
    }  # fmt: skip
    words = [word for option in options.items() for word in option]
    readings = ["--first", "24.3uH", "--second", "18.9uH", "--one-way", "48.4uH", "--other-way", "38.1uH"]
    found = estimate_of(run("pair", *readings, *words, "--frequency", "1kHz", "--json"))
    sources = {line["source"] for line in found["budget"]}
    for word in ("gain, common", "gain, each", "floor", "noise", "counts"):
        assert any(word in source for source in sources), (word, sources)


def test_a_gain_without_percent_is_taken_as_a_ratio_with_a_caution(run):
    found = estimate_of(run("pair", "--first", "24.3uH", "--gain", "0.1", "--json"))
    texts = [f["text"] for f in found["findings"] if f["code"] == "unit"]
    assert texts == ["--gain 0.1 has no % and is taken for 10 %"]


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        (["--first", "24.3MH"], "option --first: megahenry"),
        (["--first", "24.3"], "option --first: the unit is missing"),
        (["--first", "24,3uH"], "option --first: a decimal comma"),
        (["--first", "nan"], "option --first: not a number; found 'nan'"),
        (["--first", "24.3uH,"], "option --first: not a number"),
        (["--first", "24.3uH,-2"], "option --first: Q is above zero"),
        (["--first", "24.3uH,3V"], "option --first: a unit of another kind"),
        (["--first", "24.3ohm"], "option --first: a unit of another kind"),
        (["--first", "-24.3uH"], "option --first: a negative inductance"),
        (["--first", "24.3uH", "--frequency", "0Hz"], "option --first: inductance has no meaning for direct current"),
        (["--first", "24.3uH", "--gain", "-1%"], "option --gain: an accuracy cannot be negative"),
        (["--first", "24.3uH", "--floor", "5"], "option --floor: this needs the unit"),
        (["--first", "24.3uH", "--phase-each", "1%"], "option --phase-each: a unit of another kind"),
        (["--first", "24.3\x1b[31muH"], "found '24.3\\x1b[31muH'"),
    ],
)
def test_what_cannot_be_read_is_refused_in_one_sentence(run, words, expected):
    result = run("pair", *words)
    assert result.exit_code == 1
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1
    assert result.stderr.startswith("mutual: ")
    assert expected in result.stderr
    assert "\x1b" not in result.stderr


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        ([], "no reading given"),
        (["--one-way", "48.4uH", "--aiding", "48.4uH"], "are the same hookup"),
        (["--first", "24.3uH,110mohm"], "--frequency is needed"),
        (["--first", "24.3uH", "--frequency", "fast"], "not a number"),
        (["--first", "24.3uH", "--coverage", "2"], "not in the range"),
        (["--first", "24.3uH", "--coverage", "much"], "not a valid float"),
        (["--third", "24.3uH"], "--third"),
    ],
)
def test_wrong_usage(run, words, expected):
    result = run("pair", *words)
    assert result.exit_code == 2
    assert expected in result.stderr
    assert result.stdout == ""
