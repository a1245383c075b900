"""Several recordings of one device."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from texts import HEADER, PREFACE, ROWS, read_text

from mutual.device import Winding
from mutual.errors import RefusedInput
from mutual.recording import Recording, common_device
from mutual.recording.model import Accuracy


def pair_of(folder: Path, first: str, second: str) -> list[Recording]:
    """Two files, a.csv and b.csv."""
    return [read_text(folder, first, name="a.csv"), read_text(folder, second, name="b.csv")]


def with_keys(keys: str, table: str = "") -> str:
    """A recording with keys before the windings and tables after them."""
    return PREFACE.replace("# [windings]", f"{keys}# [windings]") + table + HEADER + ROWS


def test_windings_of_all_files_are_united(tmp_path: Path) -> None:
    other = PREFACE.replace('latch = ["C", "D"]', 'sense = ["E", "F"]')
    together = common_device(pair_of(tmp_path, PREFACE + HEADER + ROWS, f"{other}{HEADER}E-F,,1e5,3\n"))
    assert together.device.windings == (
        Winding("pad", "A", "B"),
        Winding("latch", "C", "D"),
        Winding("sense", "E", "F"),
    )
    assert together.device.leads == ("A", "B", "C", "D", "E", "F")
    assert together.findings == ()


def test_one_recording_stays_as_it_is(tmp_path: Path) -> None:
    recording = read_text(tmp_path, PREFACE + HEADER + ROWS)
    assert common_device([recording]).recordings == (recording,)


def test_none_is_a_mistake_of_the_caller() -> None:
    with pytest.raises(ValueError, match="no recording"):
        common_device([])


@pytest.mark.parametrize(
    ("old", "new", "column"),
    [
        ('pad = ["A", "B"]', 'pad = ["B", "A"]', "windings.pad"),
        ('pad = ["A", "B"]', 'pad = ["A", "E"]', "windings.pad"),
        ('pad = ["A", "B"]', 'coil = ["A", "B"]', "windings.coil"),
    ],
)
def test_windings_that_contradict(tmp_path: Path, old: str, new: str, column: str) -> None:
    both = pair_of(tmp_path, PREFACE + HEADER + ROWS, PREFACE.replace(old, new) + HEADER + "C-D,,1e5,5\n")
    with pytest.raises(RefusedInput) as caught:
        common_device(both)
    assert caught.value.column == column
    assert caught.value.file == str(tmp_path / "b.csv")
    assert "a.csv" in caught.value.reason


@pytest.mark.parametrize(
    ("first", "second", "name"),
    [
        ('# arrangement = "one limb"\n', '# arrangement = "three-phase"\n', "arrangement"),
        ('# earthed = ["A"]\n', '# earthed = ["B"]\n', "earthed"),
        ("# shared_loss = 0.5\n", "# shared_loss = 1.0\n", "shared_loss"),
    ],
)
def test_keys_that_contradict(tmp_path: Path, first: str, second: str, name: str) -> None:
    with pytest.raises(RefusedInput) as caught:
        common_device(pair_of(tmp_path, with_keys(first), with_keys(second)))
    assert caught.value.column == name
    assert "a.csv" in caught.value.reason and caught.value.file == str(tmp_path / "b.csv")


@pytest.mark.parametrize("order", [1, -1])
def test_what_one_file_leaves_open_the_other_states(tmp_path: Path, order: int) -> None:
    texts = [with_keys(""), with_keys('# arrangement = "one limb"\n# shared_loss = 0.5\n# earthed = ["A"]\n')][::order]
    device = common_device(pair_of(tmp_path, *texts)).device
    assert (device.arrangement, device.shared_loss, device.earthed) == ("one limb", 0.5, ("A",))


def test_a_lead_that_another_file_calls_internal(tmp_path: Path) -> None:
    text = with_keys('# internal = ["D"]\n').replace("C-D,,100e3,18.90\n", "")
    with pytest.raises(RefusedInput, match="internal") as caught:
        common_device(pair_of(tmp_path, PREFACE + HEADER + ROWS, text))
    assert (caught.value.file, caught.value.row) == (str(tmp_path / "a.csv"), 2)


def test_open_where_another_file_declares_a_winding(tmp_path: Path) -> None:
    preface = PREFACE.replace("# [windings]", '# leads = ["E"]\n# [windings]')
    first = f"{preface}across,frequency [Hz],resistance [ohm]\nA-E,0,open\n"
    second = f'{PREFACE}# bridge = ["B", "E"]\n{HEADER}{ROWS}'
    with pytest.raises(RefusedInput, match="open") as caught:
        common_device(pair_of(tmp_path, first, second))
    assert (caught.value.file, caught.value.row) == (str(tmp_path / "a.csv"), 1)


def test_other_names_of_the_device_are_a_caution(tmp_path: Path) -> None:
    second = (PREFACE + HEADER + ROWS).replace("two coils, invented", "others")
    together = common_device(pair_of(tmp_path, PREFACE + HEADER + ROWS, second))
    assert together.device.name == "two coils, invented"
    (finding,) = together.findings
    assert (finding.level, finding.where) == ("caution", str(tmp_path / "b.csv"))
    assert "others" in finding.text and "a.csv" in finding.text


def test_a_file_without_a_name_is_no_other_device(tmp_path: Path) -> None:
    unnamed = (PREFACE + HEADER + ROWS).replace('# device = "two coils, invented"\n', "")
    together = common_device(pair_of(tmp_path, unnamed, PREFACE + HEADER + ROWS))
    assert together.device.name == "two coils, invented"
    assert together.findings == ()


METER = '# [meter]\n# gain = "{}"\n'


def test_the_same_table_in_two_files_is_one_instrument(tmp_path: Path) -> None:
    texts = (with_keys("", METER.format("0.1 %")), with_keys("", METER.format("0.10%")))
    together = common_device(pair_of(tmp_path, *texts))
    assert [r.instruments["meter"] for r in together.recordings] == [Accuracy("meter", gain=0.001)] * 2


def test_other_contents_are_another_instrument(tmp_path: Path) -> None:
    texts = (with_keys("", METER.format("0.1 %")), with_keys("", METER.format("0.2 %")))
    both = pair_of(tmp_path, *texts)
    third = replace(both[1], instruments={"meter": Accuracy("meter", gain=0.003)})
    together = common_device([*both, third, both[1], both[0]])
    b = tmp_path / "b.csv"
    assert [r.instruments["meter"].name for r in together.recordings] == [
        "meter",
        f"meter ({b})",
        f"meter ({b}, 2)",
        f"meter ({b})",
        "meter",
    ]
    assert [r.instruments["meter"].gain for r in together.recordings] == [0.001, 0.002, 0.003, 0.002, 0.001]


@pytest.mark.parametrize("order", [1, -1])
def test_a_file_that_states_nothing_does_not_borrow_the_others_accuracy(tmp_path: Path, order: int) -> None:
    texts = (with_keys("", METER.format("0.1 %")), with_keys(""))[::order]
    together = common_device(pair_of(tmp_path, *texts))
    instruments = [r.instruments["meter"] for r in together.recordings][::order]
    assert [a.gain for a in instruments] == [0.001, None]
    assert instruments[0].name != instruments[1].name
