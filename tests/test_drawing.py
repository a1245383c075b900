"""Drawings of hookups: which leads are joined, and what passes over what."""

from __future__ import annotations

import pytest

from mutual.device import Device, Hookup, Winding
from mutual.reports.drawing import LINES, PLAIN, draw_hookup, pen_for

TWO = Device("", (Winding("pad", "A", "B"), Winding("latch", "C", "D")))


def test_series_one_way():
    assert draw_hookup(TWO, Hookup(("A", "D"), (("B", "C"),))) == [
        "    A       B       C       D",
        "    +-nnnnn-+       +-nnnnn-+       pad, latch",
        "    |       +=======+       |       wire",
        "    +-meter-----------------+       meter, + on A",
    ]


def test_a_wire_that_passes_over_a_lead_in_use_leaves_it_visible():
    assert draw_hookup(TWO, Hookup(("A", "C"), (("B", "D"),)))[2] == "    |       +=======|=======+       wire"


def test_a_shared_lead_is_one_column():
    star = Device("", (Winding("u", "A", "N"), Winding("v", "B", "N"), Winding("w", "C", "N")))
    assert draw_hookup(star, Hookup(("A", "B"))) == [
        "    A       N       B       C",
        "    +-nnnnn-+-nnnnn-+       |       u, v",
        "    |       +-nnnnn-|-------+       w",
        "    +-meter---------+               meter, + on A",
    ]


def test_sensed_leads_have_a_voltmeter():
    lines = draw_hookup(TWO, Hookup(("B", "A"), (), ("C", "D")))
    assert lines[2].endswith("source, + on B")
    assert lines[3].endswith("voltmeter, + on C")


def test_six_windings_still_fit_and_more_are_put_in_words():
    six = Device("", tuple(Winding(f"w{i}", f"U{i}", f"X{i}") for i in range(6)))
    hookup = Hookup(("U0", "X5"), tuple((f"X{i}", f"U{i + 1}") for i in range(5)))
    drawn = draw_hookup(six, hookup)
    assert max(map(len, drawn)) <= 80
    assert drawn[2].count("====") == 5
    long = Device("", tuple(Winding(f"w{i}", f"start{i}", f"finish{i}") for i in range(6)))
    words = draw_hookup(long, Hookup(("start0", "finish1"), (("finish0", "start1"),)))
    assert words == ["    meter across start0-finish1", "    wire from finish0 to start1"]


def test_names_cannot_act_on_the_terminal():
    spiked = Device("", (Winding("p\x1b[2J", "A\x07", "B"),))
    assert all(line.isprintable() for line in draw_hookup(spiked, Hookup(("A\x07", "B"))))


@pytest.mark.parametrize(
    ("encoding", "pen"), [("utf-8", LINES), ("ascii", PLAIN), ("cp1252", PLAIN), (None, PLAIN), ("?", PLAIN)]
)
def test_the_pen_is_one_that_the_output_can_take(encoding, pen):
    assert pen_for(encoding) is pen
