"""The report for people: what stands in it, in how many digits, and on lines of 80 characters."""

from __future__ import annotations

from dataclasses import replace

import pytest
from estimates import OPEN, PAIR, WINDINGS, K, M, contradicting, full_estimate, pair_estimate, phases, suspect

from mutual.reports.dots import render_polarity
from mutual.reports.figures import figures, odds, probability, short
from mutual.reports.terminal import render
from mutual.result import Consistency, Finding, Polarity, Quantity, StateResult, WindingResult

LONG = {"p" * 70: WindingResult(("A" * 40, "B" * 40), K), "q" * 70: WindingResult(("C" * 40, "D" * 40))}
EVERY = {
    "long": replace(
        full_estimate(),
        windings=LONG,
        pairs=(replace(full_estimate().pairs[0], windings=tuple(LONG), polarity=OPEN),),
        dots=(("A" * 40, "C" * 40), ("B" * 40, "D" * 40)),
        by_frequency=(),
        by_point=(StateResult(LONG, full_estimate().pairs, point={"gap": "g" * 90}),),
    ),
    "plain": pair_estimate(),
    "full": full_estimate(),
    "contradicting": contradicting(suspect(), suspect("the inductance should read 38.1 nH: " * 5, coupling=None)),
    "phases": phases(),
    "nothing": pair_estimate(
        windings={n: WindingResult(w.leads) for n, w in WINDINGS.items()},
        pairs=(replace(PAIR, polarity=OPEN, mutual=None, mutual_magnitude=None, coupling=None),),
        dots=None,
        headline_frequency=None,
    ),
}


def lines_of(estimate, **options):
    return render(estimate, **options).splitlines()


@pytest.mark.parametrize("detail", [False, True])
@pytest.mark.parametrize("encoding", ["ascii", "utf-8"])
@pytest.mark.parametrize("name", EVERY)
def test_no_line_is_longer_than_the_paper(name, encoding, detail):
    for width in (80, 100):
        for text in (
            render(EVERY[name], detail=detail, width=width, encoding=encoding),
            render_polarity(EVERY[name], detail=detail, width=width, encoding=encoding),
        ):
            assert max(map(len, text.splitlines())) <= width
            assert text.isascii() or encoding == "utf-8"


def test_the_answer_stands_first():
    lines = lines_of(pair_estimate())
    assert lines[0] == "latch coils, invented"
    assert lines[1] == "bounds hold with 95 % probability; at 100 kHz"
    assert lines[3] == "pad and latch"
    assert lines[4].split() == ["M", "=", "2.575", "uH", "2.551", "to", "2.600", "uH"]
    assert lines[5].split() == ["k", "=", "0.12015", "0.11903", "to", "0.12129"]
    assert lines[6].strip().startswith("A and C are alike, as are B and D (odds of a million to 1")


def test_the_parts_follow_in_this_order():
    text = render(full_estimate(), detail=True)
    heads = ["pad and latch", "pad, A-B", "Dots", "Arrangement", "How far to trust it", "Findings", "Limits",
             "By frequency: pad and latch", "By point: pad and latch", "Textbook formulas", "Where the uncertainty",
             "Inputs"]  # fmt: skip
    places = [text.index(f"\n{head}") for head in heads]
    assert places == sorted(places)


def test_what_was_not_determined_is_said_in_words():
    text = render(EVERY["nothing"])
    assert text.count("not determined by these readings") == 7  # M, k, polarity; L and R of both
    assert "None" not in text


def test_a_magnitude_is_not_shown_as_a_signed_value():
    text = render(pair_estimate(pairs=(replace(PAIR, mutual=None, polarity=OPEN),), dots=None))
    assert "|M| =  2.575 uH" in text
    assert "which leads are alike is not determined by these readings" in text


def test_a_bound_on_one_side_is_rounded_away_from_the_value():
    tight = Quantity(1.0, None, 0.99834, None, "lower")
    text = render(pair_estimate(pairs=(replace(PAIR, coupling=tight),)))
    assert "k >= 0.9983" in text
    assert str(figures(Quantity(0.0, None, None, 0.000201, "upper"), "1")) == "<= 0.00021"


def test_suspects_are_listed_with_the_answer_if_mended():
    text = " ".join(render(contradicting(suspect(), suspect("row 3 and 4 were exchanged"))).split())
    assert "NOT TO BE RELIED ON AS IT STANDS: the readings contradict one another." in text
    assert "p below 1e-12" in text
    assert "1. a.csv row 4 (A-C tied B-D): two ties were exchanged if mended: p = 0.42, k = 0.12015" in text
    assert "2. a.csv row 4 (A-C tied B-D): row 3 and 4 were exchanged" in text
    assert text.index("NOT TO BE RELIED ON") < text.index("pad and latch")


def test_no_single_slip_is_said_as_well():
    assert "No single slip" in render(contradicting())
    assert "No single slip" not in render(pair_estimate())


def test_what_the_bounds_hold_is_said_where_no_accuracy_was_stated():
    bare = pair_estimate(consistency=Consistency(0.0, 2, None, "not testable", "repeatability only"))
    text = " ".join(render(bare).split())
    assert "cannot be tested, because no accuracy was stated" in text
    assert "repeats and the last printed digit alone" in text
    spare = pair_estimate(consistency=Consistency(0.0, 0, None, "not testable", "stated"))
    assert "Nothing is left over to test" in render(spare)


def test_starts_and_finishes_take_the_place_of_dots():
    text = render(phases())
    assert "Dots (" not in text
    rows = [line.split() for line in text.splitlines() if "nnnnn" in line]
    assert rows == [["a", "--nnnnn--", "b", "u"], ["c", "--nnnnn--", "d", "v"], ["f", "--nnnnn--", "e", "w"]]
    assert "currents into a and d aid one another" in text


def test_dots_sit_at_like_leads():
    turned = pair_estimate(dots=(("A", "D"), ("B", "C")), pairs=(replace(PAIR, polarity=Polarity("opposite", 1e-9)),))
    rows = [line.strip() for line in render(turned).splitlines() if "nnnnn" in line]
    assert rows == ["A *--nnnnn--  B   pad", "C  --nnnnn--* D   latch"]
    assert "A and D are alike, as are B and C" in render(turned)


def test_dots_known_in_part_get_marks_of_their_own():
    names = ("p", "q", "r", "s")
    verdicts = {("p", "q"): "opposite", ("r", "s"): "same"}
    pairs = tuple(
        replace(PAIR, windings=(a, b), polarity=Polarity(verdicts.get((a, b), "undetermined"), 0.5))
        for i, a in enumerate(names)
        for b in names[i + 1 :]
    )
    windings = {n: WindingResult((f"{n}1", f"{n}2")) for n in names}
    text = render(pair_estimate(windings=windings, pairs=pairs, dots=None))
    marks = [line.split()[:4] for line in text.splitlines() if "nnnnn" in line]
    assert marks == [
        ["p1", "*--nnnnn--", "p2", "p"],
        ["q1", "--nnnnn--*", "q2", "q"],
        ["r1", "o--nnnnn--", "r2", "r"],
        ["s1", "o--nnnnn--", "s2", "s"],
    ]


def test_escape_codes_in_names_do_not_reach_the_terminal():
    nasty = "\x1b[2Jred\u202e\x07"
    spiked = pair_estimate(
        device=nasty,
        windings={"pad": WINDINGS["pad"], nasty: WindingResult(("C\x1b[0m", "D"))},
        pairs=(replace(PAIR, windings=("pad", nasty)),),
        dots=(("A", "C\x1b[0m"), ("B", "D")),
        headline_point={nasty: nasty},
        findings=(Finding("note", nasty, nasty, nasty),),
        consistency=Consistency(9.0, 1, 1e-9, "inconsistent", "stated", (suspect(nasty, where=nasty),)),
    )
    for text in (render(spiked, detail=True), render_polarity(spiked)):
        assert all(c.isprintable() for line in text.split("\n") for c in line)
        assert "\\x1b[2Jred\\u202e\\x07" in text


def test_the_budget_has_the_largest_source_first():
    lines = lines_of(full_estimate(), detail=True)
    start = lines.index("    coupling pad latch")
    assert " ".join(lines[start + 1].split()) == "5.2e-04 87.0 % meter gain, each"
    assert " ".join(lines[start + 2].split()) == "1.0e-05 13.0 % meter gain, common"
    assert "12 nH" in lines[start + 4]


def test_formulas_stand_beside_the_estimate():
    text = " ".join(render(full_estimate(), detail=True).split())
    assert "series both ways: (La - Lo)/4 M 2.575 uH (2.551 to 2.600); k 0.12015 (0.11903 to 0.12129)" in text
    assert "(La - Lo)/4" not in render(full_estimate())


def test_limits_have_verdict_and_probability():
    text = " ".join(render(full_estimate()).split())
    assert "coupling pad latch from 0.11 to 0.14: met (probability of conforming above 0.999)" in text
    assert "inductance pad at most 25 uH: undecided (probability of conforming = 0.6)" in text


def test_values_that_change_with_frequency_are_listed_where_there_is_no_headline():
    full = full_estimate()
    nothing = replace(full.pairs[0], mutual=None, mutual_magnitude=None, coupling=None)
    split = replace(full, headline_basis="none", headline_frequency=None, pairs=(nothing,))
    text = render(split)
    assert "No single set of values fits all readings" in text
    assert "one value for each frequency" in text
    table = text[text.index("By frequency: pad and latch") :].splitlines()
    assert table[2].split()[:4] == ["1", "kHz", "2.575", "uH"]
    assert table[3].split()[:2] == ["100", "kHz"]


@pytest.mark.parametrize(
    ("quantity", "unit", "expected"),
    [
        (M, "H", "2.575 uH (2.551 to 2.600)"),
        (K, "1", "0.12015 (0.11903 to 0.12129)"),
        # 2.4e-5 times a million is 24.000000000000004: it must not be rounded outwards for that
        (Quantity(2.4e-5, 1e-7, 2.38e-5, 2.42e-5), "H", "24.00 uH (23.80 to 24.20)"),
        (Quantity(-6.3e-9, 8e-9, -22e-9, 9.4e-9), "H", "-6.3 nH (-22.0 to 9.4)"),
        # less than its uncertainty: no digits are made up
        (Quantity(1e-12, 3e-9, -6e-9, 6e-9), "H", "0.0 nH (-6.0 to 6.0)"),
        (Quantity(1234.5, 120.0, 1000.0, 1500.0), "ohm", "1.23 kohm (1.00 to 1.50)"),
        # noise-free: seven digits
        (Quantity(1.23456789e-6, 0.0, 1.23456789e-6, 1.23456789e-6), "H", "1.234568 uH (1.234567 to 1.234568)"),
        (Quantity(0.9999, 2e-5, 0.99986, 1.0), "1", "0.999900 (0.999860 to 1.000000)"),
    ],
)
def test_digits_follow_the_uncertainty_and_bounds_are_rounded_outwards(quantity, unit, expected):
    assert str(figures(quantity, unit)) == expected


def test_probabilities_do_not_say_more_than_is_known():
    assert probability(0.27) == "p = 0.27"
    assert probability(2.3e-7) == "p = 2.3e-7"
    assert probability(0.0) == "p below 1e-12"
    assert probability(0.99999) == "p above 0.999"
    assert odds(0.9991) == "odds of 1100 to 1"
    assert odds(0.75) == "odds of 3 to 1"
    assert odds(1.0) == "odds of a million to 1 or better"
    assert short(1e5, "Hz") == "100 kHz"
    assert short(0.0, "Hz") == "0 Hz"


def test_polarity_names_the_next_test():
    weak = Quantity(6.3e-9, 8e-9, -9.4e-9, 22e-9)
    undecided = pair_estimate(pairs=(replace(PAIR, mutual=weak, polarity=Polarity("undetermined", 0.77)),), dots=None)
    text = " ".join(render_polarity(undecided).split())
    assert "A and C alike at odds of 3 to 1 only" in text
    assert "M is 6.3 nH (-9.4 to 22.0): too weak" in text
    assert "cell across A-B, plus to A; voltmeter across C-D, plus to C" in text
    assert "How a kick test is made" in text
    magnitude = pair_estimate(pairs=(replace(PAIR, mutual=None, polarity=OPEN),), dots=None)
    assert "across A-D with B and C joined" in " ".join(render_polarity(magnitude).split())
    assert "kick" not in render_polarity(pair_estimate())


def test_the_winding_of_many_turns_is_fed():
    many = WindingResult(("C", "D"), Quantity(24.3e-3, 1e-6, 24.29e-3, 24.31e-3))
    pair = replace(PAIR, mutual=None, polarity=OPEN)
    found = pair_estimate(windings={**WINDINGS, "latch": many}, pairs=(pair,), dots=None)
    text = " ".join(render_polarity(found).split())
    assert "cell across C-D, plus to C; voltmeter across A-B, plus to A" in text
    assert "Read the two in series" not in text  # 32 times the turns: the small winding would not show
