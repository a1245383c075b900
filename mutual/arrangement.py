"""What signs say of how windings sit on a core: sign products, phases, and the declaration they may contradict.

The sign of M12 M23 M13 does not change when leads are exchanged. It is +1 for windings that enclose one flux path, and
-1 where each of the three has a path of its own whose flux returns through the others (three phases, three limbs).
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from mutual.device import Device
from mutual.result import Finding, Triple

# (n, n): +1, -1, or 0 where not known.
Known = NDArray[np.int8]
Indices = tuple[int, int, int]

# A declaration less probable than this by the data is worth a word, though they do not refuse it.
_DOUBTFUL = 0.01


def asked_product(device: Device) -> int | None:
    """Sign product that the declared arrangement asks of every triple; None where it asks for nothing."""
    n = len(device.windings)
    if device.arrangement == "one limb" and n > 2:
        return 1
    return -1 if device.arrangement == "three-phase" and n == 3 else None


def product(known: Known, triple: Indices) -> int:
    """Sign of M12 M23 M13; 0 while one is not known."""
    return int(np.prod([known[pair] for pair in combinations(triple, 2)]))


def contradicted(device: Device, known: Known) -> list[Indices]:
    """Triples whose product is not the one that the declaration asks for."""
    asked = asked_product(device)
    if asked is None:
        return []
    return [t for t in combinations(range(len(known)), 3) if product(known, t) == -asked]


def triples(device: Device, known: Known) -> tuple[Triple, ...]:
    """Sign products for the result."""
    return tuple(Triple(_names(device, t), product(known, t) or None) for t in combinations(range(len(known)), 3))


def phases(known: Known) -> list[list[int]] | None:
    """Windings grouped by the flux path that they enclose; None while signs are open, or where no grouping fits.

    Parameters
    ----------
    known : (n, n) int

    Returns
    -------
    list of list of int
        One group for one limb; never two: no sign product tells two paths from one.
    """
    if not known.all():
        return None
    every = list(combinations(range(len(known)), 3))
    apart = {pair for t in every if product(known, t) < 0 for pair in combinations(t, 2)}
    groups: list[list[int]] = []
    for i in range(len(known)):
        home = next((g for g in groups if (g[0], i) not in apart), None)
        if home is None:
            groups.append([i])
        else:
            home.append(i)
    number = {i: k for k, group in enumerate(groups) for i in group}
    explained = all((len({number[i] for i in t}) == 3) == (product(known, t) < 0) for t in every)
    return groups if explained else None


def findings(device: Device, known: Known, holds: Mapping[Indices, float]) -> Iterator[Finding]:
    """Whether the data bear the declaration out.

    Parameters
    ----------
    device : Device
    known : (n, n) int
        Signs without the declaration.
    holds : mapping of triple to float
        Probability, without the declaration, of the sign product that it asks for.
    """
    wrong = contradicted(device, known)
    if wrong:
        text = (
            f"declared {device.arrangement!r}, but the signs of M between {', '.join(_names(device, wrong[0]))} "
            f"multiply to {product(known, wrong[0]):+d}, which that arrangement cannot give{_others(device, wrong)}; "
            "exchanging leads does not change it. The declaration is wrong, or one of these pairs was read wrong; the "
            "verdicts are those without the declaration"
        )
        yield Finding("refusal", "arrangement", text)
        return
    worst = min(holds, key=lambda t: holds[t], default=None)
    if worst is not None and holds[worst] < _DOUBTFUL:
        text = (
            f"what was read of {', '.join(_names(device, worst))} speaks against the declared {device.arrangement!r} "
            f"(its probability would be {holds[worst]:.2g}), but not beyond doubt: the declaration is used. Read or "
            "kick these pairs again"
        )
        yield Finding("caution", "arrangement", text)


def _others(device: Device, wrong: Sequence[Indices]) -> str:
    """How many triples more are wrong, and the pair that is in all of them."""
    if len(wrong) == 1:
        return ""
    more = f" (nor those of {len(wrong) - 1} more triple{'s' if len(wrong) > 2 else ''}"
    count = Counter(pair for t in wrong for pair in combinations(t, 2))
    shared = [pair for pair, times in count.items() if times == len(wrong)]
    if len(shared) == 1:
        i, j = shared[0]
        more += f"; {device.windings[i].name} and {device.windings[j].name} are in all of them: look at that pair first"
    return more + ")"


def describe(device: Device, known: Known, follow: Sequence[tuple[int, int]]) -> str:
    """Sentences about the arrangement.

    Parameters
    ----------
    device : Device
    known : (n, n) int
        Signs with the declaration.
    follow : sequence of (i, j)
        Pairs whose sign is known through the declaration only.
    """
    n = len(known)
    if n < 2:
        return "one winding: there is nothing to compare"
    if n == 2:
        return "two windings: one dot each serves" if known.all() else "the sign is not known yet"
    text = _main(device, known)
    if follow:
        names = ", ".join(f"{device.windings[i].name} and {device.windings[j].name}" for i, j in follow)
        text += f"; what is said of {names} follows from the declared {device.arrangement!r}, not from readings alone"
    if device.arrangement == "three-phase" and n > 3:
        text += "; the declared 'three-phase' says nothing of more than three windings"
    return text


def _main(device: Device, known: Known) -> str:
    groups = phases(known)
    if groups is None:
        if any(product(known, t) < 0 for t in combinations(range(len(known)), 3)):
            return "some triples multiply to -1: the windings do not all enclose one flux path, no single dots exist"
        joined = np.linalg.matrix_power((known != 0).astype(float), len(known))
        if device.arrangement == "free" and joined.all():
            return (
                "the signs are not all known yet; if all windings enclose one flux path (not three limbs of one core), "
                "arrangement = 'one limb' says so, and lets them settle one another"
            )
        return "the signs are not all known yet"
    if len(groups) == 1:
        if asked_product(device) == -1:
            return "the signs multiply to +1, as those of windings on one limb do"
        return "all signs agree with one dot on each winding"
    text = (
        "the signs multiply to -1, as those of three phase windings (or of three limbs of one core) do: no single "
        "dots exist, starts and finishes are given instead"
    )
    if len(groups) < len(known):
        limbs = " / ".join(" ".join(device.windings[i].name for i in group) for group in groups)
        text += f"; windings on one limb by their signs: {limbs}"
    return text


def _names(device: Device, triple: Indices) -> tuple[str, str, str]:
    i, j, k = (device.windings[index].name for index in triple)
    return i, j, k
