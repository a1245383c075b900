"""The command as a process: streams, exit codes, start-up, and endings that are nobody's fault."""

from __future__ import annotations

import functools
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

import mutual

PROGRAM = [sys.executable, "-m", "mutual.cli"]
# the package under test, also where it is not installed
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(Path(mutual.__file__).parent.parent)}
RECORDING = """# device = "coils, invented"
# [windings]
# pad = ["A", "B"]
# latch = ["C", "D"]
# [meter]
# gain_common = "0.1 %"
across,tied,inductance [uH]
A-B,,24.30
C-D,,18.90
A-D,B-C,48.35
"""


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "coils.csv").write_text(RECORDING, "utf-8")
    return tmp_path


def process(folder, arguments, **environment):
    env = {**ENVIRONMENT, **environment}
    return subprocess.run(arguments, cwd=folder, env=env, capture_output=True, text=True, timeout=60)


def run(folder, *words, **environment):
    return process(folder, [*PROGRAM, *words], **environment)


@pytest.mark.parametrize(
    ("words", "code"),
    [
        (["estimate", "coils.csv"], 0),
        (["--version"], 0),
        (["estimate", "missing.csv"], 1),
        (["estimate", "."], 1),
        (["estimate"], 2),
        (["no-such-command"], 2),
    ],
)
def test_exit_codes(folder, words, code):
    result = run(folder, *words)
    assert result.returncode == code
    assert "Traceback" not in result.stderr
    assert (result.stdout == "") == (code != 0)


def test_help_is_quick_and_loads_nothing_heavy(folder):
    code = (
        "import sys\n"
        "from mutual.cli import main\n"
        "try:\n    main(['--help'], prog_name='mutual')\n"
        "except SystemExit as end:\n    assert end.code == 0\n"
        "heavy = {'numpy', 'scipy', 'pandas', 'pyvisa'} & set(sys.modules)\n"
        "print(*heavy, file=sys.stderr)"
    )
    result = process(folder, [sys.executable, "-c", code])
    assert result.stderr == "\n"
    for command in ("pair", "sheet", "estimate", "polarity", "check", "simulate"):
        assert f"\n  {command} " in result.stdout
    assert max(map(len, result.stdout.splitlines())) <= 80


@pytest.mark.parametrize("command", ["pair", "sheet", "estimate", "polarity", "check", "simulate"])
def test_every_command_explains_itself_with_an_example(folder, command):
    result = run(folder, command, "--help")
    assert result.returncode == 0
    assert f"\n    mutual {command} " in result.stdout
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_no_colour_and_no_escape_code_in_a_pipe(folder):
    result = run(folder, "estimate", "coils.csv", "--detail")
    assert "\x1b" not in result.stdout + result.stderr
    assert max(map(len, result.stdout.splitlines())) <= 80


def test_an_output_that_takes_only_ascii_gets_ascii(folder):
    (folder / "coils.csv").write_text(RECORDING.replace("coils, invented", "spulen f\u00fcr \u03a9"), "utf-8")
    result = run(folder, "estimate", "coils.csv", PYTHONIOENCODING="ascii")
    assert result.returncode == 0
    assert result.stdout.isascii()
    assert "spulen f\\xfcr \\u03a9" in result.stdout
    assert "A *--nnnnn--" in result.stdout


def start(folder, *words):
    pipe = subprocess.PIPE
    # A test run that a shell put into the background ignores interrupts, and so would what it starts.
    heed = functools.partial(signal.signal, signal.SIGINT, signal.SIG_DFL)
    options = {"stdout": pipe, "stderr": pipe, "text": True, "preexec_fn": heed}
    return subprocess.Popen([*PROGRAM, *words], cwd=folder, env=ENVIRONMENT, **options)


def test_a_reader_that_goes_away_is_no_fault(folder):
    with start(folder, "estimate", "coils.csv") as running:
        running.stdout.close()
        assert running.stderr.read() == ""
        assert running.wait(60) == 0


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="needs the full device of Linux")
def test_a_full_disk_is_one_sentence(folder):
    with open("/dev/full", "w") as full:
        words, pipe = [*PROGRAM, "estimate", "coils.csv"], subprocess.PIPE
        result = subprocess.run(words, cwd=folder, env=ENVIRONMENT, stdout=full, stderr=pipe, text=True, timeout=60)
    assert result.returncode == 1
    assert result.stderr.startswith("mutual: ")
    assert result.stderr.count("\n") == 1


def writing_end(pipe, running):
    """Open a named pipe for writing as soon as the program reads from it: it is in the middle of its work then."""
    until = time.monotonic() + 60
    while running.poll() is None and time.monotonic() < until:
        try:
            return os.open(pipe, os.O_WRONLY | os.O_NONBLOCK)
        except OSError:
            time.sleep(0.02)
    raise AssertionError(running.stderr.read())


def test_an_interrupt_ends_without_a_traceback(folder):
    os.mkfifo(folder / "pipe")
    with start(folder, "estimate", "pipe") as running:
        descriptor = writing_end(folder / "pipe", running)
        try:
            running.send_signal(signal.SIGINT)
            assert running.wait(60) == 130
        finally:
            running.kill()
        assert running.stderr.read() == "mutual: stopped\n"
    os.close(descriptor)


def test_completion_is_offered(folder):
    result = run(folder, _MUTUAL_COMPLETE="bash_complete", COMP_WORDS="mutual est", COMP_CWORD="1")
    assert result.stdout == "plain,estimate\n"


def test_a_fault_of_the_program_is_said_to_be_one(folder):
    code = (
        "import mutual.cli.estimate as command\n"
        "command.read_all = lambda *_: 1 / 0\n"
        "from mutual.cli import main\n"
        "main(['estimate', 'coils.csv'], prog_name='mutual')"
    )
    result = process(folder, [sys.executable, "-c", code])
    assert result.returncode == 1
    assert "a fault of the program, not of the input (ZeroDivisionError: division by zero)" in result.stderr
    assert "Traceback" not in result.stderr
