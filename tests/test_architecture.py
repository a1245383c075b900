"""The directions of imports, the layout, and the length of files, as DEVELOPERS.md states them."""

from __future__ import annotations

import re
import subprocess
import sys

import pytest
from architecture import ROOT, files_of_the_project, reached, read_module, read_package, within

MODULES = read_package(ROOT / "mutual")
SLOW = ("pandas", "pyvisa", "matplotlib", "scipy")
TOP_LEVEL = {"README.md", "DEVELOPERS.md", "pyproject.toml", "mutual", "drivers", "recordings", "tests"}
FILES = files_of_the_project()
LONGEST = 250

# What a report may know: the estimate, how numbers and text are written, and the names of leads.
SEEN_BY_REPORTS = tuple(f"mutual.{name}" for name in ("result", "units", "symbols", "quoting", "device", "reports"))
WITHOUT_NUMPY = ("mutual.errors", "mutual.result", "mutual.device", "mutual.units", "mutual.recording.model")


def breaches(start: str, *forbidden: str) -> list[str]:
    """Ways from a module to what it must not lead to."""
    return [f"{by} imports {item}" for item, by in reached(MODULES, start).items() if within(item, *forbidden)]


def test_the_modules_that_the_rules_speak_of_exist():
    for name in ("mutual", "mutual.cli", "mutual.engine", "mutual.methods.readings", "mutual.reports.terminal"):
        assert name in MODULES


def test_engine_knows_no_methods_and_no_front():
    forbidden = ("mutual.methods", "mutual.reports", "mutual.live", "mutual.cli", "pandas", "pyvisa", "click")
    assert breaches("mutual.engine", *forbidden) == []


def test_methods_do_not_know_the_engine():
    methods = [name for name in MODULES if within(name, "mutual.methods")]
    forbidden = ("mutual.engine", "mutual.bounds", "mutual.slips", "mutual.evaluate", "mutual.reports", "mutual.cli")
    assert [b for name in methods for b in breaches(name, *forbidden)] == []


def test_reports_see_an_estimate_only():
    found = []
    for name, module in MODULES.items():
        if within(name, "mutual.reports"):
            inside = [item for item in module.everywhere if within(item, "mutual")]
            found += [f"{name} imports {item}" for item in inside if not within(item, *SEEN_BY_REPORTS)]
    assert found == []


def test_only_the_command_line_prints_and_exits():
    found = {name: module.speaks for name, module in MODULES.items() if not within(name, "mutual.cli")}
    assert {name: lines for name, lines in found.items() if lines} == {}


@pytest.mark.parametrize(("library", "owner"), [("pyvisa", "mutual.live"), ("click", "mutual.cli")])
def test_libraries_with_one_owner(library, owner):
    users = [name for name, m in MODULES.items() if any(within(item, library) for item in m.everywhere)]
    assert [name for name in users if not within(name, owner)] == []


def test_what_is_slow_to_load_is_loaded_where_it_is_used():
    found = [
        f"{name} imports {item}"
        for name, module in MODULES.items()
        for item in module.at_start
        if within(item, *SLOW)
    ]
    # scipy may stand at the top of a numeric module that nothing loads before there is something to compute
    starts = ("mutual", "mutual.cli")
    first = {*starts, *(item for start in starts for item in reached(MODULES, start, at_start_only=True))}
    allowed = [line for line in found if within(line.split()[-1], "scipy") and line.split()[0] not in first]
    assert [line for line in found if line not in allowed] == []


@pytest.mark.parametrize("name", WITHOUT_NUMPY)
def test_plain_modules_do_without_numpy(name):
    assert not any(within(item, "numpy") for item in MODULES[name].at_start)


def test_start_up_loads_nothing_slow():
    code = f"import sys, mutual, mutual.cli; print(*(name for name in {SLOW} if name in sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    assert done.stdout.split() == []


def test_no_file_outgrows_its_subject():
    paragraphs = (ROOT / "DEVELOPERS.md").read_text("utf-8").split("\n\n")
    # the reasons stand in one paragraph; a name in a table of the layout is none
    (reasons,) = (text for text in paragraphs if f"under {LONGEST} lines" in text and "on purpose" in text)
    for name in FILES:
        if name.startswith(("mutual/", "drivers/")) and name.endswith(".py"):
            lines = len((ROOT / name).read_text("utf-8").splitlines())
            assert lines <= LONGEST or f"`{name}`" in reasons, f"{name}: {lines} lines; split it, or explain it by name"


def test_top_level_is_fixed():
    present = {name.partition("/")[0] for name in FILES}
    assert {name for name in present if not name.startswith(".")} == TOP_LEVEL


# Written with brackets so that this file does not hold the words itself.
FOREIGN = re.compile(
    r"trans[c]ript|le[c]ture|\bsub-?[a]gents?\b|\b[A]I[ -]assist|"
    r"(?<![\w.~])/(?:w[o]rk|h[o]me|r[o]ot|t[m]p|U[s]ers|m[n]t)/\w|\b[C]:\\",
    re.IGNORECASE,
)


def foreign_words(text: str) -> list[str]:
    """Words that have no place in the project, and paths of somebody's machine."""
    return [f"line {n}: {line.strip()}" for n, line in enumerate(text.splitlines(), 1) if FOREIGN.search(line)]


def test_no_foreign_words():
    found = {name: foreign_words((ROOT / name).read_text("utf-8", errors="replace")) for name in FILES}
    assert {name: lines for name, lines in found.items() if lines} == {}


# -- the checks see what they are for --


@pytest.mark.parametrize(
    ("source", "at_start", "everywhere"),
    [
        ("import pandas.io", {"pandas.io"}, {"pandas.io"}),
        ("def f():\n    import pandas", set(), {"pandas"}),
        ("class A:\n    import pandas", {"pandas"}, {"pandas"}),
        ("try:\n    import pandas\nexcept ImportError:\n    pass", {"pandas"}, {"pandas"}),
        ("import typing\nif typing.TYPE_CHECKING:\n    import pandas", {"typing"}, {"typing", "pandas"}),
        ("from . import engine", {"mutual.methods.engine"}, {"mutual.methods.engine"}),
        ("from ..engine import fit", {"mutual.engine"}, {"mutual.engine"}),
        ("from mutual import engine", {"mutual.engine"}, {"mutual.engine"}),
    ],
)
def test_imports_are_seen(source, at_start, everywhere):
    module = read_module(source, "mutual.methods.any")
    assert at_start <= module.at_start
    assert everywhere <= module.everywhere
    assert not any(within(item, "pandas") for item in module.at_start - at_start)


@pytest.mark.parametrize(
    "source",
    [
        "print(1)",
        "def f():\n    print(1)",
        "click.echo(1)",
        "sys.exit(1)",
        "raise SystemExit",
        "sys.stdout.write('')",
        "import os\nos._exit(1)",
    ],
)
def test_prints_and_exits_are_seen(source):
    assert read_module(source, "mutual.any").speaks


def test_detours_are_seen():
    modules = {
        "mutual": read_module("from mutual.cli import main", "mutual.__init__"),
        "mutual.a": read_module("from mutual import b", "mutual.a"),
        "mutual.b": read_module("def f():\n    from mutual.c import x", "mutual.b"),
        "mutual.c": read_module("import click", "mutual.c"),
    }
    assert reached(modules, "mutual.a")["click"] == "mutual.c"
    assert "click" not in reached(modules, "mutual.a", at_start_only=True)
    assert "mutual.cli" not in reached(modules, "mutual.a")


@pytest.mark.parametrize(
    "text",
    ["see the le" + "cture", "in /ho" + "me/someone", "open('/t" + "mp/x')", "a Trans" + "cript", "C" + ":\\data"],
)
def test_foreign_words_are_seen(text):
    assert foreign_words(text)


@pytest.mark.parametrize("text", ["https://example.org/home/x", "n/tmp/x", "../bench/x", "the root of it"])
def test_other_words_are_left_alone(text):
    assert foreign_words(text) == []
