"""Keep the README true: its commands, and the outputs that it shows.

    python tests/readme_outputs.py                  run the commands and write what they print into the README
    python tests/readme_outputs.py --check          say where the README shows something else (exit code 1)
    python tests/readme_outputs.py --command test   print the one-line command of that name

In the README, `<!-- file: NAME -->` before a block makes the block a file for the commands after it,
`<!-- output: COMMAND -->` (or `output, exit 3:`) has the block after it filled with the command and what it prints, and
`<!-- command: NAME -->` names a one-line command. Commands run at 80 columns in a folder of their own that holds
`recordings` and these files. Nothing but the standard library is needed for `--command`.
"""

from __future__ import annotations

import argparse
import difflib
import os
import re
import shlex
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
README = ROOT / "README.md"
BLOCK = re.compile(
    r"^<!-- (?P<kind>file|output|command)(?:, exit (?P<code>\d+))?: (?P<what>.+?) -->\n"
    r"(?P<open>```\w*\n)(?P<text>.*?)(?P<close>^```$)",
    re.MULTILINE | re.DOTALL,
)
MARK = re.compile(r"^<!-- (?:file|output|command)\b", re.MULTILINE)
MAIN = "from mutual.cli import main; main(prog_name='mutual')"


def named_command(text: str, name: str) -> str:
    """The one-line command of a block, for a shell."""
    found = [m["text"].strip() for m in BLOCK.finditer(text) if (m["kind"], m["what"]) == ("command", name)]
    if len(found) != 1 or "\n" in found[0] or not found[0]:
        raise SystemExit(f"README.md must hold one block of one line marked 'command: {name}'")
    return found[0]


def renewed(text: str) -> str:
    """The README with every output block as its command prints it now."""
    if len(MARK.findall(text)) != len(BLOCK.findall(text)):
        raise SystemExit("README.md: a mark (file, output or command) has no block right after it")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        shutil.copytree(ROOT / "recordings", folder / "recordings")

        def renew(match: re.Match[str]) -> str:
            if match["kind"] == "file":
                (folder / match["what"]).write_text(match["text"], "utf-8", newline="\n")
            if match["kind"] != "output":
                return match[0]
            shown = f"$ {match['what']}\n{_run(match['what'], folder, int(match['code'] or 0))}"
            head = match[0][: match.start("text") - match.start()]
            return f"{head}{shown}{match['close']}"

        return BLOCK.sub(renew, text)


def _run(command: str, folder: Path, code: int) -> str:
    program, *words = shlex.split(command)
    start = {"mutual": [sys.executable, "-c", MAIN], "python": [sys.executable]}[program]
    paths = os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")]).rstrip(os.pathsep)
    plain = {"COLUMNS": "80", "NO_COLOR": "1", "PYTHONIOENCODING": "utf-8", "PYTHONPATH": paths}
    done = subprocess.run(
        [*start, *words],
        cwd=folder,
        env={**os.environ, **plain},
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        encoding="utf-8",
        check=False,
    )
    if done.returncode != code:
        raise SystemExit(f"{command}: exit code {done.returncode} where the README says {code}\n{done.stdout}")
    return done.stdout


def main() -> None:
    parser = argparse.ArgumentParser(description="Keep the README true.")
    parser.add_argument("--check", action="store_true", help="compare, write nothing")
    parser.add_argument("--command", metavar="NAME", help="print the command of that name")
    wanted = parser.parse_args()
    text = README.read_text("utf-8")
    if wanted.command:
        print(named_command(text, wanted.command))
        return
    new = renewed(text)
    if not wanted.check:
        README.write_text(new, "utf-8", newline="\n")
    elif new != text:
        sides = (text.splitlines(keepends=True), new.splitlines(keepends=True))
        sys.stdout.writelines(difflib.unified_diff(*sides, "README.md as it stands", "README.md as commands print"))
        raise SystemExit(1)


if __name__ == "__main__":
    main()
