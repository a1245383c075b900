"""`mutual estimate`, `polarity` and `check`: options, streams and exit codes."""

from __future__ import annotations

import json

import pytest
from click.testing import CliRunner

from mutual.cli import main

# Two coils of 24.3 and 18.9 uH with M = 2.575 uH, invented; series readings are L1 + L2 +- 2 M.
PREFACE = """# format = "mutual-recording-1"
# device = "coils, invented"
# [windings]
# pad = ["A", "B"]
# latch = ["C", "D"]
# [meter]
# gain_common = "0.1 %"
# gain_each = "0.05 %"
"""
ROWS = """across,tied,inductance [uH]
A-B,,24.30
C-D,,18.90
A-D,B-C,48.35
A-C,B-D,38.05
"""
LIMITS = '# [limits]\n# "coupling pad latch" = {{lower = {}}}\n'


@pytest.fixture
def run(monkeypatch, tmp_path):
    # a fault of the program must not pass for a refused input
    monkeypatch.setenv("MUTUAL_TRACEBACK", "1")
    monkeypatch.chdir(tmp_path)

    def invoke(command, files, *words):
        names = []
        for number, text in enumerate(files):
            name = f"{chr(ord('a') + number)}.csv"
            (tmp_path / name).write_text(text, "utf-8")
            names.append(name)
        result = CliRunner().invoke(main, [command, *names, *words], prog_name="mutual")
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise result.exception
        return result

    return invoke


def test_estimate_prints_the_report_and_nothing_else(run):
    result = run("estimate", [PREFACE + ROWS])
    assert result.exit_code == 0
    assert result.stderr == ""
    assert result.stdout.startswith("coils, invented\n")
    assert "M =  2.5750 uH" in result.stdout


def test_json_is_the_whole_of_standard_output(run):
    result = run("estimate", [PREFACE + ROWS], "--json")
    found = json.loads(result.stdout)
    assert found["format"] == "mutual-estimate-1"
    assert found["inputs"][0]["file"] == "a.csv"
    assert result.stderr == ""
    assert json.loads(run("polarity", [PREFACE + ROWS], "--json").stdout)["dots"] == [["A", "C"], ["B", "D"]]


def test_readings_that_contradict_one_another_end_with_3_and_are_printed(run):
    swapped = ROWS.replace("A-D,B-C,48.35", "A-D,B-C,38.05").replace("A-B,,24.30", "A-B,,27.30")
    # a limit that is not met does not hide it
    result = run("estimate", [PREFACE + LIMITS.format(0.13) + swapped])
    assert result.exit_code == 3
    assert "NOT TO BE RELIED ON" in result.stdout
    result = run("polarity", [PREFACE + swapped], "--json")
    assert result.exit_code == 3
    assert json.loads(result.stdout)["consistency"]["verdict"] == "inconsistent"


@pytest.mark.parametrize(("lower", "verdict", "code"), [(0.11, "met", 0), (0.12, "undecided", 4), (0.13, "not met", 4)])
def test_limits_that_are_not_met_end_with_4(run, lower, verdict, code):
    result = run("estimate", [PREFACE + LIMITS.format(lower) + ROWS])
    assert result.exit_code == code
    assert f"coupling pad latch at least {lower:g}: {verdict}" in result.stdout


def test_polarity_ends_with_3_where_a_pair_is_undetermined(run):
    alone = "\n".join(ROWS.splitlines()[:3]) + "\n"
    result = run("polarity", [PREFACE + alone])
    assert result.exit_code == 3
    assert "What to do next" in result.stdout
    assert run("polarity", [PREFACE + alone], "--json").exit_code == 3
    assert run("estimate", [PREFACE + alone]).exit_code == 0


def test_polarity_says_which_leads_are_alike(run):
    result = run("polarity", [PREFACE + ROWS])
    assert result.exit_code == 0
    assert "A and C are alike, as are B and D" in result.stdout


def test_a_file_without_preface_takes_windings_and_accuracy_from_the_command_line(run):
    words = ["--winding", "pad=A-B", "--winding", "latch=C-D", "--set", "meter.gain=0.3%", "--set", "device=coils"]
    result = run("estimate", [ROWS], *words, "--json")
    found = json.loads(result.stdout)
    assert found["device"] == "coils"
    assert found["pairs"][0]["mutual_H"]["value"] == pytest.approx(2.575e-6, rel=2e-3)
    assert "gain split unknown" in [f["code"] for f in found["findings"]]


def test_a_foreign_file_of_one_hookup_is_mapped(run):
    export = "Freq(Hz),Ls\n100000,48.35\n"
    words = ["--winding", "pad=A-B", "--winding", "latch=C-D", "--across", "A-D", "--tied", "B-C"]
    words += ["--column", "Ls=inductance [uH]", "--column", "Freq(Hz)=frequency [Hz]"]
    result = run("check", [export], *words, "--detail")
    assert result.exit_code == 0
    assert "row 1, line 2: A-D tied B-C; at 100 kHz; inductance 48.35 uH" in result.stdout


def test_several_recordings_are_evaluated_together(run):
    lines = ROWS.splitlines()
    first, second = ("\n".join([lines[0], *part]) + "\n" for part in (lines[1:3], lines[3:]))
    found = json.loads(run("estimate", [PREFACE + first, PREFACE + second], "--json").stdout)
    assert [given["file"] for given in found["inputs"]] == ["a.csv", "b.csv"]
    assert found["pairs"][0]["mutual_H"]["value"] == pytest.approx(2.575e-6, rel=1e-3)


def test_the_headline_is_taken_where_it_is_asked_for(run):
    rows = "across,tied,frequency [Hz],inductance [uH],point gap [mm]\n"
    read = (("A-B", "", 24.3), ("C-D", "", 18.9), ("A-D", "B-C", 48.35), ("A-C", "B-D", 38.05))
    for frequency, factor, gap in ((1000, 1.0, 8), (100000, 1.2, 16)):
        for across, tied, value in read:
            rows += f"{across},{tied},{frequency},{value * factor:.2f},{gap}\n"
    assert json.loads(run("estimate", [PREFACE + rows], "--json").stdout)["headline_basis"] == "none"
    for words in (["--at", "100kHz"], ["--point", "gap=16 mm"], ["--point", "gap = 1.6 cm"]):
        found = json.loads(run("estimate", [PREFACE + rows], *words, "--json").stdout)
        assert found["headline_frequency_Hz"] == 100000
        assert found["headline_point"] == {"gap": 0.016}
        assert found["windings"]["pad"]["inductance_H"]["value"] == pytest.approx(29.16e-6, rel=1e-3)
    for words, expected in (
        (["--at", "5kHz"], "nothing was read at the frequency or point asked for"),
        (["--point", "gap=9 mm"], "nothing was read at the frequency or point asked for"),
        (["--point", "gape=8 mm"], "no point 'gape' was set; there is: gap"),
        (["--point", "gap=8 mm", "--point", "gap=16 mm"], "'gap' is given twice"),
        (["--at", "5"], "the unit is missing"),
    ):
        result = run("estimate", [PREFACE + rows], *words)
        assert result.exit_code == 2
        assert expected in " ".join(result.stderr.split())


def test_check_says_what_was_understood_and_computes_nothing(run):
    rows = ROWS.replace("38.05", "")
    result = run("check", [PREFACE + LIMITS.format(0.11) + rows])
    assert result.exit_code == 0
    text = " ".join(result.stdout.split())
    for words in (
        "a.csv", "readings, 3 rows", "pad A-B; latch C-D", "A-B; C-D; A-D tied B-C", "inductance",
        "meter: gain common 0.1 %, gain each 0.05 % (as limit)", "limit coupling pad latch at least 0.11",
        "the row has no value filled in",
    ):  # fmt: skip
        assert words in text
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_check_json(run):
    found = json.loads(run("check", [PREFACE + ROWS, PREFACE + ROWS], "--json").stdout)
    assert found["format"] == "mutual-check-1"
    inputs = [(given["file"], given["kind"], given["rows"]) for given in found["inputs"]]
    assert inputs == [("a.csv", "readings", 4), ("b.csv", "readings", 4)]
    assert found["findings"] == []


def test_check_takes_the_options_of_estimate(run):
    words = ["--at", "1kHz", "--coverage", "0.9", "--risk", "0.05", "--point", "gap=1 mm", "--detail"]
    assert run("check", [PREFACE + ROWS], *words).exit_code == 0


@pytest.mark.parametrize("command", ["estimate", "polarity", "check"])
@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (PREFACE + ROWS.replace("A-D,B-C", "A-E,B-C"), "a.csv, row 3 (line 12), column 'across': unknown lead 'E'"),
        (PREFACE + ROWS.replace("inductance", "inductence"), "expected 'inductance'"),
        (PREFACE.replace('"0.1 %"', '"0.1 mH"') + ROWS, "mutual: a.csv, line 7, at 'meter.gain_common': "),
        (PREFACE.replace("# pad", "# p\x1b[2Jad") + ROWS, "\\x1b"),
        ("", "mutual: a.csv: the file is empty"),
    ],
)
def test_refused_input_is_one_sentence_on_standard_error(run, command, text, expected):
    result = run(command, [text])
    assert result.exit_code == 1
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1
    assert expected in result.stderr
    assert result.stderr.rstrip("\n").isprintable()


@pytest.mark.parametrize(
    "words",
    [
        ["--winding", "pad"], ["--winding", "pad=A"], ["--winding", "pad=A-B-C"],
        ["--winding", "pad=A-B", "--winding", "pad=A-C"],
        ["--set", "device"], ["--column", "Ls"], ["--coverage", "1.5"], ["--risk", "0"], ["--frobnicate"],
    ],
)  # fmt: skip
def test_wrong_usage(run, words):
    result = run("estimate", [PREFACE + ROWS], *words)
    assert result.exit_code == 2
    assert result.stdout == ""
    assert "Usage: mutual estimate" in result.stderr
    assert CliRunner().invoke(main, ["estimate"]).exit_code == 2
