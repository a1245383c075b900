"""The invented devices and readings behind `recordings/`; every number here is ours."""

from __future__ import annotations

import math

from netlists.scenario import Reading, Scenario

LR = ("inductance", "resistance")
KICK = ("kick",)


def mutuals(diagonal: tuple[float, ...], ratio: dict[tuple[int, int], float]) -> list[list[float]]:
    """Symmetric matrix with `ratio` times sqrt(d_i d_j) beside the diagonal, windings counted from 0."""
    n = len(diagonal)
    full = [[diagonal[i] if i == j else 0.0 for j in range(n)] for i in range(n)]
    for (i, j), k in ratio.items():
        full[i][j] = full[j][i] = k * math.sqrt(diagonal[i] * diagonal[j])
    return full


CHARGING = {
    "windings": (("base", "A", "B"), ("phone", "C", "D")),
    "frequency": 100e3,
    "inductance": mutuals((31.62e-6, 12.87e-6), {(0, 1): 0.214}),
    "resistance": [[0.148, 0.009], [0.009, 0.121]],
    "columns": {"inductance": ("uH", 3), "resistance": ("mohm", 1)},
    "instruments": {
        "meter": {
            "gain_common": "0.1 %", "gain_each": "0.05 %", "phase_common": "0.5 mrad", "phase_each": "0.1 mrad",
            "floor": ["5 nH", "2 mohm"], "noise": ["2 nH", "1 mohm"],
        }
    },
}  # fmt: skip

charging_coils = Scenario(
    **CHARGING,
    name="charging_coils",
    device="charging coils, 6 mm apart",
    story="two flat coils of a bedside charger, ferrite behind both, read alone, in series both ways and with a short",
    readings=(
        Reading("A-B", quantities=LR, repeats=2),
        Reading("C-D", quantities=LR, repeats=2),
        Reading("A-D", "B-C", quantities=LR, repeats=2),
        Reading("A-C", "B-D", quantities=LR, repeats=2),
        Reading("A-B", "C-D", quantities=LR),
    ),
    seed=3101,
)

miswired = Scenario(
    **CHARGING,
    name="miswired",
    device="charging coils, 6 mm apart, second evening",
    story="as the charging coils, but one row was not wired as it is written down",
    readings=(
        Reading("A-B", quantities=LR),
        Reading("C-D", quantities=LR),
        Reading("A-D", "B-C", quantities=LR),
        Reading("A-C", "B-D", quantities=LR),
        Reading("A-B", "A-C B-D", quantities=LR, taken=("A-B", "A-D B-C")),
        Reading("A-B", "C-D", quantities=LR),
    ),
    notes={"slip": "row 5 was read with A-D and B-C tied: the two ties were exchanged"},
    seed=3112,
)

open_short_low_q = Scenario(
    name="open_short_low_q",
    device="bell transformer, doorbell side shorted in turn",
    story="a tight pair, open and short at 120 Hz; the shorted winding's Q is 1.7, so the bare formula misleads",
    windings=(("line", "A", "B"), ("bell", "C", "D")),
    frequency=120.0,
    inductance=mutuals((5.2e-3, 1.3e-3), {(0, 1): 0.985}),
    resistance=[[2.1, 0.03], [0.03, 0.58]],
    columns={"inductance": ("mH", 4), "resistance": ("ohm", 4)},
    instruments={
        "meter": {
            "gain_common": "0.1 %", "gain_each": "0.05 %", "phase_common": "1 mrad", "phase_each": "0.3 mrad",
            "floor": ["0.2 uH", "1 mohm"], "noise": ["0.1 uH", "0.3 mohm"],
        }
    },
    readings=(
        Reading("A-B", quantities=LR, repeats=2),
        Reading("A-B", "C-D", quantities=LR, repeats=2),
        Reading("C-D", quantities=LR, repeats=2),
    ),
    seed=3103,
)  # fmt: skip

three_on_one_limb = Scenario(
    name="three_on_one_limb",
    device="audio transformer, three windings on one limb",
    story="the third winding goes the other way round; pairs in series both ways, shorts and transfers",
    arrangement="one limb",
    windings=(("plate", "A", "B"), ("speaker", "C", "D"), ("feedback", "E", "F")),
    frequency=1e3,
    inductance=mutuals((2.4e-3, 0.62e-3, 0.151e-3), {(0, 1): 0.962, (0, 2): -0.948, (1, 2): -0.955}),
    resistance=mutuals((1.31, 0.42, 0.118), {(0, 1): 0.035, (0, 2): -0.033, (1, 2): -0.03}),
    columns={
        "inductance": ("uH", 2), "resistance": ("mohm", 1),
        "transfer inductance": ("uH", 2), "transfer resistance": ("mohm", 1),
    },
    instruments={
        "meter": {
            "gain_common": "0.1 %", "gain_each": "0.05 %", "phase_common": "0.5 mrad", "phase_each": "0.2 mrad",
            "floor": ["20 nH", "1 mohm"], "noise": ["20 nH", "0.5 mohm"],
        }
    },
    readings=(
        Reading("A-B", quantities=LR),
        Reading("C-D", quantities=LR),
        Reading("E-F", quantities=LR),
        Reading("A-D", "B-C", quantities=LR),
        Reading("A-C", "B-D", quantities=LR),
        Reading("A-F", "B-E", quantities=LR),
        Reading("A-E", "B-F", quantities=LR),
        Reading("C-F", "D-E", quantities=LR),
        Reading("C-E", "D-F", quantities=LR),
        Reading("A-F", "B-C D-E", quantities=LR),
        Reading("A-B", "C-D", quantities=LR),
        Reading("A-B", "E-F", quantities=LR),
        Reading("A-B", sense="C-D", quantities=("transfer inductance", "transfer resistance")),
        Reading("A-B", sense="E-F", quantities=("transfer inductance", "transfer resistance")),
    ),
    seed=3104,
)  # fmt: skip

six_lead_stator = Scenario(
    name="six_lead_stator",
    device="six-lead stator, rotor held still",
    story="three phases 120 degrees apart whose leads lost their labels; the second winding is listed finish first",
    arrangement="three-phase",
    windings=(("first", "1", "2"), ("second", "3", "4"), ("third", "5", "6")),
    frequency=120.0,
    # Between starts (leads 1, 4, 5) all three are negative.
    inductance=[[8.42e-3, 3.21e-3, -3.18e-3], [3.21e-3, 8.31e-3, 3.24e-3], [-3.18e-3, 3.24e-3, 8.47e-3]],
    direct=[[1.214, 0.0, 0.0], [0.0, 1.209, 0.0], [0.0, 0.0, 1.217]],
    resistance=[[1.562, 0.119, -0.121], [0.119, 1.551, 0.118], [-0.121, 0.118, 1.571]],
    columns={"inductance": ("mH", 4), "resistance": ("ohm", 4)},
    instruments={
        "meter": {
            "gain_common": "0.2 %", "gain_each": "0.1 %", "phase_common": "1 mrad", "phase_each": "0.5 mrad",
            "floor": ["0.5 uH", "2 mohm"], "noise": ["1 uH", "1 mohm"],
        },
        "ohmmeter": {"gain_common": "0.05 %", "gain_each": "0.02 %", "floor": "0.5 mohm", "noise": "0.1 mohm"},
    },
    readings=(
        Reading("1-2", quantities=LR),
        Reading("3-4", quantities=LR),
        Reading("5-6", quantities=LR),
        Reading("1-4", "2-3", quantities=LR),
        Reading("1-3", "2-4", quantities=LR),
        Reading("1-6", "2-5", quantities=LR),
        Reading("1-5", "2-6", quantities=LR),
        Reading("3-6", "4-5", quantities=LR),
        Reading("3-5", "4-6", quantities=LR),
        Reading("1-2", quantities=("resistance",), frequency=0.0, instrument="ohmmeter"),
        Reading("3-4", quantities=("resistance",), frequency=0.0, instrument="ohmmeter"),
        Reading("5-6", quantities=("resistance",), frequency=0.0, instrument="ohmmeter"),
        Reading("1-2", sense="1-2", quantities=KICK),
        Reading("1-2", sense="3-4", quantities=KICK, repeats=2),
        Reading("1-2", sense="5-6", quantities=KICK, repeats=2),
        Reading("3-4", sense="5-6", quantities=KICK, repeats=2),
    ),
    seed=3105,
)  # fmt: skip

null_pair = Scenario(
    name="null_pair",
    device="two coils at right angles",
    story="coils of a metal finder, turned until k is 0.0001: less than the readings can tell",
    windings=(("sender", "A", "B"), ("finder", "C", "D")),
    frequency=10e3,
    inductance=mutuals((101.3e-6, 98.7e-6), {(0, 1): 1e-4}),
    resistance=[[0.312, 0.0], [0.0, 0.305]],
    columns={"inductance": ("uH", 3), "dissipation": ("", 5)},
    instruments={
        "meter": {
            "gain_common": "0.05 %", "gain_each": "0.02 %", "phase_common": "0.3 mrad", "phase_each": "0.1 mrad",
            "floor": "10 nH", "noise": "5 nH",
        }
    },
    readings=(
        Reading("A-B", quantities=("inductance", "dissipation"), repeats=2),
        Reading("C-D", quantities=("inductance", "dissipation"), repeats=2),
        Reading("A-D", "B-C", quantities=("inductance", "dissipation"), repeats=3),
        Reading("A-C", "B-D", quantities=("inductance", "dissipation"), repeats=3),
    ),
    seed=3116,
)  # fmt: skip

aerial_coils = Scenario(
    name="aerial_coils",
    device="aerial coils on a ferrite rod",
    story="inductance and Q at 1 MHz; the data sheet does not say how its accuracy is shared",
    windings=(("tuned", "A", "B"), ("link", "C", "D")),
    frequency=1e6,
    inductance=mutuals((118.4e-6, 9.62e-6), {(0, 1): -0.371}),
    resistance=[[5.21, -0.11], [-0.11, 0.69]],
    columns={"inductance": ("uH", 3), "quality": ("", 1)},
    instruments={"meter": {"gain": "0.5 %", "phase": "0.2 mrad", "noise": "10 nH"}},
    readings=(
        Reading("A-B", quantities=("inductance", "quality")),
        Reading("C-D", quantities=("inductance", "quality")),
        Reading("A-D", "B-C", quantities=("inductance", "quality")),
        Reading("A-C", "B-D", quantities=("inductance", "quality")),
        Reading("A-B", "C-D", quantities=("inductance", "quality")),
        Reading("C-D", "A-B", quantities=("inductance", "quality")),
    ),
    seed=3107,
)

tapped_choke = Scenario(
    name="tapped_choke",
    device="choke with a tap",
    story="one winding with a tap, as two windings that share lead T; impedance and phase at 10 kHz",
    windings=(("lower", "E", "T"), ("upper", "T", "P")),
    frequency=10e3,
    inductance=mutuals((0.42e-3, 3.9e-3), {(0, 1): 0.91}),
    resistance=[[0.92, 0.31], [0.31, 6.4]],
    columns={"impedance": ("ohm", 3), "phase": ("deg", 3)},
    instruments={
        "meter": {
            "gain_common": "0.1 %", "gain_each": "0.03 %", "phase_common": "0.05 deg", "phase_each": "0.02 deg",
            "noise": ["5 mohm", "0.003 deg"],
        }
    },
    readings=(
        Reading("E-T", quantities=("impedance", "phase"), repeats=2),
        Reading("T-P", quantities=("impedance", "phase"), repeats=2),
        Reading("E-P", quantities=("impedance", "phase"), repeats=2),
        Reading("E-T", "T-P", quantities=("impedance", "phase")),
        Reading("T-P", "E-T", quantities=("impedance", "phase")),
        Reading("E-T", "E-P", quantities=("impedance", "phase")),
    ),
    seed=3108,
)  # fmt: skip

SCENARIOS = {
    s.name: s
    for s in (
        charging_coils, open_short_low_q, three_on_one_limb, six_lead_stator, miswired, null_pair, aerial_coils,
        tapped_choke,
    )
}  # fmt: skip
