"""Described devices: what they mean, and the errors that their simulated readings have.

True readings come from closed forms: two windings in series have L1 + L2 +- 2 M, one with the other shorted through
R2 + j omega L2 has Z1 + (omega M)^2/(R2 + j omega L2) (coupled-circuit theory, any textbook).
"""

from __future__ import annotations

import itertools
from math import pi, sqrt

import numpy as np
import pytest

from mutual.description import read_device
from mutual.errors import RefusedInput
from mutual.recording import read
from mutual.simulate import simulate, written

L1, L2, K12, R1 = 24.3e-6, 18.9e-6, -0.12, 0.11
M12 = K12 * sqrt(L1 * L2)
HEAD = """
format = "mutual-device-1"
device = "latch coils, invented"
[windings]
pad = ["A", "B"]
latch = ["C", "D"]
[inductance]
pad = "24.3 uH"
latch = "18.9 uH"
"""
WHOLE = f"""{HEAD}
[resistance]
pad = "110 mohm"
latch = {{"0 Hz" = "95 mohm", "100 kHz" = "105 mohm"}}
[coupling]
"latch pad" = -0.12
"""
BOTH = 'quantities = ["inductance", "resistance"]\n'
SERIES = '[[readings]]\nacross = "A-D"\ntied = "B-C"\nfrequency = "100 kHz"\n'


@pytest.fixture
def device(tmp_path):
    names = itertools.count()

    def make(text):
        file = tmp_path / f"device{next(names)}.toml"
        file.write_text(text, "utf-8")
        return read_device(file)

    return make


def shown(recording, name):
    return np.array([row.values[name].value for row in recording.rows])


def refused(device, text):
    with pytest.raises(RefusedInput) as caught:
        simulate(device(text), 1)
    assert caught.value.column is not None or caught.value.line is not None
    return str(caught.value)


def test_without_errors_the_readings_are_those_of_the_device(device):
    plan = "".join(
        f'[[readings]]\nacross = "{across}"\ntied = "{tied}"\nfrequency = "50 kHz"\n{BOTH}'
        for across, tied in (("A-B", ""), ("C-D", ""), ("A-D", "B-C"), ("A-C", "B-D"), ("A-B", "C-D"))
    )
    omega, r2 = 2 * pi * 50e3, 0.1  # half way between 95 and 105 mohm
    shorted = R1 + 1j * omega * L1 + (omega * M12) ** 2 / (r2 + 1j * omega * L2)
    expected = {
        "inductance": [L1, L2, L1 + L2 + 2 * M12, L1 + L2 - 2 * M12, shorted.imag / omega],
        "resistance": [R1, r2, R1 + r2, R1 + r2, shorted.real],
    }
    recording = simulate(device(WHOLE + plan), 1)
    for name, values in expected.items():
        assert shown(recording, name) == pytest.approx(values, rel=1e-7)


def test_tables_by_frequency_are_straight_lines_and_constant_beyond(device):
    plan = '[[readings]]\nacross = "C-D"\nquantities = ["resistance"]\n'
    plan += 'frequency = ["0 Hz", "25 kHz", "100 kHz", "1 MHz"]\n'
    assert shown(simulate(device(WHOLE + plan), 1), "resistance") == pytest.approx([0.095, 0.0975, 0.105, 0.105])


def test_shared_loss_is_in_the_series_resistance_and_nil_at_direct_current(device):
    plan = '[mutual_resistance]\n"pad latch" = "5 mohm"\n[[readings]]\nacross = "A-D"\ntied = "B-C"\n'
    plan += 'frequency = ["0 Hz", "100 kHz"]\nquantities = ["resistance"]\n'
    assert shown(simulate(device(WHOLE + plan), 1), "resistance") == pytest.approx([0.205, 0.225])


def test_columns_that_follow_from_one_impedance_agree(device):
    names = ["inductance", "resistance", "quality", "dissipation", "impedance", "phase"]
    names += ["parallel inductance", "parallel resistance"]
    plan = f'[meter]\ngain = "1 %"\n{SERIES}quantities = {names}\n'.replace("'", '"')
    row = simulate(device(WHOLE + plan), 4).rows[0]
    ls, rs, q, d, size, angle, lp, rp = (row.values[name].value for name in names)
    z = rs + 2j * pi * 1e5 * ls
    assert abs(ls / (L1 + L2 + 2 * M12) - 1) > 1e-5  # the gain is there, and is one for all columns
    assert (q, d) == pytest.approx((z.imag / z.real, z.real / z.imag), rel=1e-6)
    assert (size, angle) == pytest.approx((abs(z), np.angle(z)), rel=1e-6)
    assert (lp, rp) == pytest.approx((-1 / ((1 / z).imag * 2 * pi * 1e5), 1 / (1 / z).real), rel=1e-6)


def test_a_common_gain_is_one_draw_and_a_gain_of_each_is_one_for_every_hookup(device):
    plan = "".join(
        f'[[readings]]\nacross = "{across}"\nfrequency = "100 kHz"\nquantities = ["inductance"]\nrepeats = 2\n'
        for across in ("A-B", "C-D")
    )
    for key, same in (("gain_common", True), ("gain_each", False)):
        made = device(f'{HEAD}[meter]\n{key} = "1 %"\nphase = "0 deg"\n{plan}')
        for seed in range(5):
            error = shown(simulate(made, seed), "inductance") / [L1, L1, L2, L2] - 1
            assert error[0] == pytest.approx(error[1], abs=1e-6)  # repeats share it
            assert (abs(error[0] - error[2]) < 1e-6) == same
            assert 1e-6 < abs(error[0]) < 0.01


@pytest.mark.parametrize(
    ("stated_as", "deviation", "limited"),
    [("limit", 0.01 / sqrt(3), True), ("standard", 0.01, False), ("expanded", 0.005, False)],
)
def test_a_stated_number_is_a_limit_or_a_deviation(device, stated_as, deviation, limited):
    made = device(f'{HEAD}[meter]\ngain_common = "1 %"\nphase = "0 deg"\nstated_as = "{stated_as}"\n{SERIES}')
    errors = np.array([shown(simulate(made, seed), "inductance")[0] for seed in range(400)]) / (L1 + L2) - 1
    # 400 draws: the standard deviation of a normal is known to 3.5 % (1/sqrt(2 n)), four times that is allowed
    assert np.std(errors) == pytest.approx(deviation, rel=0.14)
    assert bool(np.abs(errors).max() <= 0.01) == limited


def test_noise_is_drawn_anew_for_each_repeat(device):
    made = device(f'{HEAD}[meter]\nnoise = ["20 nH", "3 mohm"]\n{SERIES}{BOTH}repeats = 500\n')
    recording = simulate(made, 2)
    for name, deviation in (("inductance", 20e-9), ("resistance", 3e-3)):
        assert np.std(shown(recording, name)) == pytest.approx(deviation, rel=0.13)  # four times 1/sqrt(2 n)


def test_floor_and_counts_are_shared(device):
    made = device(f'{HEAD}[meter]\nfloor = "50 nH"\ncounts = 3\nresolution = "1 nH"\n{SERIES}repeats = 4\n')
    errors = shown(simulate(made, 3), "inductance") - (L1 + L2)
    assert np.ptp(errors) == 0
    assert 0 < abs(errors[0]) <= 53.5e-9


def test_what_is_shown_is_rounded_to_the_display_step(device):
    made = device(f'{HEAD}[meter]\ngain = "1 %"\nresolution = "50 nH"\n{SERIES}')
    value = simulate(made, 5).rows[0].values["inductance"]
    assert value.value / 50e-9 == pytest.approx(round(value.value / 50e-9), abs=1e-6)
    assert value.step == 1e-8  # the last printed digit


def test_a_gain_of_unknown_split_stays_within_what_is_stated(device):
    plan = "".join(f'[[readings]]\nacross = "{a}"\nfrequency = "100 kHz"\n' for a in ("A-B", "C-D"))
    made = device(f'{HEAD}[meter]\ngain = "1 %"\nphase = "0 deg"\n{plan}')
    errors = np.array([shown(simulate(made, seed), "inductance") / [L1, L2] - 1 for seed in range(200)])
    assert np.abs(errors).max() <= 0.01
    # neither all common nor all each: the two are correlated, and differ
    assert 0.2 < np.corrcoef(errors.T)[0, 1] < 0.9


def test_kicks_follow_the_sign_of_m_and_reverse_at_break(device):
    plan = '[kick]\nmisread = 0.25\nreversed = 0\n[[readings]]\nacross = "A-B"\nsense = "C-D"\nrepeats = 400\n'
    recording = simulate(device(f'{WHOLE}{plan}quantities = ["kick on make", "kick on break"]\n'), 6)
    make = [row.kicks["kick on make"] for row in recording.rows]
    assert all({row.kicks["kick on make"], row.kicks["kick on break"]} == {"+", "-"} for row in recording.rows)
    # M < 0: "-" at make, but for one in four; four standard deviations of a binomial
    assert make.count("+") / 400 == pytest.approx(0.25, abs=4 * sqrt(0.25 * 0.75 / 400))
    own = plan.replace('"C-D"', '"A-B"').replace("0.25", "0")
    sure = simulate(device(f'{WHOLE}{own}quantities = ["kick on make"]\n'), 6)
    assert {row.kicks["kick on make"] for row in sure.rows} == {"+"}


def test_a_tap_and_a_star_are_devices_like_others(device):
    text = HEAD.replace('["C", "D"]', '["B", "D"]') + '[coupling]\n"pad latch" = 0.5\n'
    text += '[[readings]]\nacross = "A-D"\nfrequency = "1 kHz"\n'
    assert shown(simulate(device(text), 1), "inductance") == pytest.approx([L1 + L2 + sqrt(L1 * L2)], rel=1e-7)


def test_the_same_seed_gives_the_same_file_and_it_reads_back(device, tmp_path):
    made = device(f'{WHOLE}[meter]\ngain = "1 %"\nresolution = "10 nH"\nnoise = "20 nH"\n{SERIES}repeats = 5\n')
    text = written(simulate(made, 7), 7)
    assert text == written(simulate(made, 7), 7)
    assert text != written(simulate(made, 8), 8)
    assert "simulated" in text
    file = tmp_path / "simulated.csv"
    file.write_text(text, "utf-8")
    again = read(file)
    assert "simulated" in again.device.name
    assert [r.values for r in again.rows] == [r.values for r in simulate(made, 7).rows]
    assert again.instruments == simulate(made, 7).instruments


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (("mutual-device-1", "mutual-device-2"), "newer than the program"),
        (("mutual-device-1", "mutual-recording-1"), "not a described device"),
        (("[inductance]", "[inductances]"), "unknown key; found 'inductances'; expected 'inductance'"),
        (('pad = "24.3 uH"', 'pad = "24.3 ohm"'), "a unit of another kind"),
        (('pad = "24.3 uH"', 'pad = "24.3 MH"'), "megahenry"),
        (('pad = "24.3 uH"', "pad = 24.3"), "not a number with its unit"),
        (('pad = "24.3 uH"', 'pad = "-24.3 uH"'), "out of range"),
        (('pad = "24.3 uH"', ""), "a winding has no inductance"),
        (('"latch pad" = -0.12', '"latch pad" = 1.01'), "not passive"),
        (('"latch pad" = -0.12', '"latch pud" = 0.1'), "not a pair of windings"),
        (('"latch pad" = -0.12', '"latch pad" = 0.1\n"pad latch" = 0.1'), "twice"),
        (("[coupling]", '[mutual_resistance]\n"pad latch" = "0.2 ohm"\n[coupling]'), "not passive"),
        (("[coupling]", '[capacitance]\npad = "60 pF"\n[coupling]'), "capacitances are not simulated yet"),
        (("[coupling]", '[meters]\ngain = "1 %"\n[coupling]'), "unknown key; found 'meters'; expected 'meter'"),
        (("[coupling]", '[meter]\ngian = "1 %"\n[coupling]'), "unknown key; found 'gian'; expected gain"),
        (("[coupling]", "[meter]\ncounts = 3\n[coupling]"), "counts are stated without the display step"),
        (('tied = "B-C"', 'tied = "B-E"'), "readings 1, tied"),
        (('tied = "B-C"', 'tied = "A-D"'), "the ties short the meter"),
        (('tied = "B-C"', 'tied = ""'), "left open"),
        (('tied = "B-C"', 'tide = "B-C"'), "unknown key; found 'tide'; expected 'tied'"),
        (('frequency = "100 kHz"', 'frequency = "0 Hz"'), "cannot be read at direct current"),
        (('frequency = "100 kHz"', 'quantities = ["quality"]'), "the frequency is missing"),
        (('frequency = "100 kHz"', 'quantities = ["transfer inductance"]\nfrequency = "1 kHz"'), "no leads to sense"),
        (('frequency = "100 kHz"', 'quantities = ["drive"]'), "this cannot be simulated"),
        (('frequency = "100 kHz"', "repeats = 0"), "not a count"),
        (('frequency = "100 kHz"', 'instrument = "bridge"\nfrequency = "1 kHz"'), "without an accuracy table"),
        (("[[readings]]", "[readings]"), "nothing is said of what to read"),
        (("[windings]", "[windings"), "not valid TOML"),
    ],
)
def test_bad_descriptions_are_refused_with_their_place(device, change, words):
    text = WHOLE + SERIES
    assert change[0] in text
    message = refused(device, text.replace(*change, 1))
    assert words in message


def test_a_set_of_windings_that_is_not_passive_is_named(device):
    text = HEAD.replace("[inductance]", 'third = ["E", "F"]\n[inductance]\nthird = "10 uH"')
    text += '[coupling]\n"pad latch" = 0.9\n"latch third" = 0.9\n"pad third" = -0.9\n'
    message = refused(device, text + SERIES)
    assert "pad latch third" in message
    assert "not passive" in message
