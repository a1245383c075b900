"""`mutual sheet` and `mutual simulate`: files written once, never over another."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from mutual.cli import main
from mutual.recording import read

DEVICE = """format = "mutual-device-1"
device = "coils, invented"
[windings]
pad = ["A", "B"]
latch = ["C", "D"]
[inductance]
pad = "24.3 uH"
latch = "18.9 uH"
[coupling]
"pad latch" = 0.12
[meter]
gain_common = "0.1 %"
noise = "2 nH"
[[readings]]
across = "A-B"
frequency = "100 kHz"
[[readings]]
across = "C-D"
frequency = "100 kHz"
[[readings]]
across = "A-D"
tied = "B-C"
frequency = "100 kHz"
[[readings]]
across = "A-C"
tied = "B-D"
frequency = "100 kHz"
"""
PADS = ["--winding", "pad=A-B", "--winding", "latch=C-D"]


@pytest.fixture
def run(monkeypatch, tmp_path):
    monkeypatch.setenv("MUTUAL_TRACEBACK", "1")
    monkeypatch.chdir(tmp_path)
    Path("device.toml").write_text(DEVICE, "utf-8")

    def invoke(*words):
        result = CliRunner().invoke(main, words, prog_name="mutual")
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise result.exception
        return result

    return invoke


def test_a_sheet_is_written_drawn_and_read_back_once_filled_in(run):
    result = run("sheet", "coils.csv", *PADS, "--frequency", "100kHz", "--set", "device=coils")
    assert result.exit_code == 0
    assert max(map(len, result.stdout.splitlines())) <= 80
    text = Path("coils.csv").read_text("utf-8")
    rows = [line for line in text.splitlines() if not line.startswith("#")][1:]
    assert result.stdout.count("meter, + on") == len(rows) >= 6
    for number, row in enumerate(rows, 1):
        across, tied = row.split(",")[:2]
        assert f"row {number}: across {across}" + (f" tied {tied}" if tied else "") in result.stdout
    # as a beginner fills it in: one value typed behind each row's frequency
    values = iter(["24.30", "18.90", "48.35", "38.05", "", ""])
    filled = [f"{line[:-1]}{next(values)}," if line in rows else line for line in text.splitlines()]
    Path("coils.csv").write_text("\n".join(filled) + "\n", "utf-8")
    found = json.loads(run("estimate", "coils.csv", "--json").stdout)
    assert found["device"] == "coils"
    assert found["pairs"][0]["mutual_H"]["value"] == pytest.approx(2.575e-6, rel=1e-2)


@pytest.mark.parametrize("words", [["sheet", "there.csv", *PADS], ["simulate", "device.toml", "--out", "there.csv"]])
def test_an_existing_file_is_never_overwritten(run, words):
    Path("there.csv").write_text("mine", "utf-8")
    result = run(*words)
    assert result.exit_code == 1
    assert result.stderr == "mutual: there.csv: the file exists and is not overwritten; expected another name\n"
    assert result.stdout == ""
    assert Path("there.csv").read_text("utf-8") == "mine"


def test_a_folder_that_is_not_there_is_one_sentence(run):
    result = run("sheet", "nowhere/coils.csv", *PADS)
    assert result.exit_code == 1
    assert result.stderr == "mutual: nowhere/coils.csv: No such file or directory\n"


@pytest.mark.parametrize(
    ("words", "code", "expected"),
    [
        (["coils.csv"], 2, "Missing option '--winding'"),
        (["coils.csv", "--winding", "pad=A-A"], 1, "at 'windings.pad': both ends of a winding are one lead"),
        (["coils.csv", "--winding", "p#d=A-B"], 1, "a winding's name holds '#'"),
        (["coils.csv", *PADS, "--set", "meter.gain=1%"], 2, "write other keys into the file"),
        (["coils.csv", *PADS, "--set", "arrangement=two limbs"], 1, "unknown arrangement"),
        (["coils.csv", *PADS, "--inductance-unit", "MH"], 1, "megahenry"),
    ],
)
def test_a_sheet_that_makes_no_sense_is_not_written(run, words, code, expected):
    result = run("sheet", *words)
    assert result.exit_code == code
    assert expected in " ".join(result.stderr.split())
    assert not Path("coils.csv").exists()


def test_a_simulated_recording_says_so_and_is_estimated(run):
    result = run("simulate", "device.toml", "--out", "made.csv", "--seed", "7")
    assert result.exit_code == 0
    assert result.stdout == ""
    assert result.stderr == "wrote made.csv: 4 simulated rows, seed 7\n"
    text = Path("made.csv").read_text("utf-8")
    assert "simulated" in text
    found = json.loads(run("estimate", "made.csv", "--json").stdout)
    assert "simulated" in found["device"]
    coupling = found["pairs"][0]["coupling"]
    # seven standard uncertainties: a seed that fails by chance is not found in a lifetime
    assert abs(coupling["value"] - 0.12) < 7 * coupling["standard_uncertainty"]


def test_the_seed_decides_and_force_overwrites(run):
    for seed in ("7", "8"):
        assert run("simulate", "device.toml", "--out", f"{seed}.csv", "--seed", seed).exit_code == 0
    assert read("7.csv").rows != read("8.csv").rows
    assert run("simulate", "device.toml", "--out", "8.csv", "--seed", "7", "--force").exit_code == 0
    assert Path("7.csv").read_text("utf-8") == Path("8.csv").read_text("utf-8")


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ('"pad latch" = 0.12', '"pad latch" = 1.2', "mutual: device.toml, at 'coupling': the device is not passive"),
        ('noise = "2 nH"', "counts = 2", "mutual: device.toml, at 'meter.resolution': counts are stated without"),
        ("[windings]", "[windings", "mutual: device.toml, line 3: the description is not valid TOML"),
    ],
)
def test_a_description_that_cannot_be_simulated(run, old, new, expected):
    Path("device.toml").write_text(DEVICE.replace(old, new), "utf-8")
    result = run("simulate", "device.toml", "--out", "made.csv")
    assert result.exit_code == 1
    assert result.stderr.startswith(expected)
    assert result.stderr.count("\n") == 1
    assert not Path("made.csv").exists()
