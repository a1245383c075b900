"""What the source says of itself: imports, prints and exits of each module, read from the syntax tree."""

from __future__ import annotations

import ast
import subprocess
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path

ROOT = Path(__file__).parent.parent
# what a build adds at the top of an sdist
GENERATED = {"PKG-INFO", "setup.cfg", "mutual_bench.egg-info", "build", "dist"}
PRINTERS = {"print", "input", "exit", "quit", "breakpoint"}
OUTPUTS = {
    "click": {"echo", "secho", "echo_via_pager", "prompt", "confirm", "pause", "clear", "progressbar"},
    "sys": {"exit"},
    "os": {"_exit", "abort"},
}


@dataclass(frozen=True)
class Module:
    """Imports as dotted names: those at start-up, and all; calls that print or end the process, with their lines."""

    at_start: frozenset[str] = frozenset()
    everywhere: frozenset[str] = frozenset()
    speaks: tuple[str, ...] = field(default=())


def read_module(source: str, name: str) -> Module:
    """Read one module from its text; `name` (dotted) resolves relative imports."""
    tree = ast.parse(source)
    everywhere = {item for node in ast.walk(tree) for item in _imported(node, name)}
    at_start = {item for node in _run_at_start(tree) for item in _imported(node, name)}
    return Module(frozenset(at_start), frozenset(everywhere), tuple(sorted(set(_speaking(tree)))))


def read_package(folder: Path) -> dict[str, Module]:
    """All modules of a package, by dotted name; a package itself stands under its own name."""
    modules = {}
    for path in sorted(folder.rglob("*.py")):
        parts = [folder.name, *path.relative_to(folder).with_suffix("").parts]
        is_package = parts[-1] == "__init__"
        name = ".".join(parts[:-1] if is_package else parts)
        modules[name] = read_module(path.read_text("utf-8"), f"{name}.__init__" if is_package else name)
    return modules


def reached(modules: Mapping[str, Module], start: str, at_start_only: bool = False) -> dict[str, str]:
    """Everything that a module leads to, each with the module that imports it.

    The root of the package is not walked through when it is reached from inside: it gathers the public names, so
    everything would lead to everything.
    """
    found: dict[str, str] = {}
    waiting = [start]
    while waiting:
        here = waiting.pop()
        if here not in modules or (here == start.partition(".")[0] and here != start):
            continue
        imports = modules[here].at_start if at_start_only else modules[here].everywhere
        for item in imports:
            if item not in found:
                found[item] = here
                waiting.append(item)
    return found


def within(name: str, *roots: str) -> bool:
    """Whether a dotted name is one of `roots` or lies inside one."""
    return any(name == root or name.startswith(f"{root}.") for root in roots)


def files_of_the_project() -> list[str]:
    """Paths of everything that is, or is about to be, under version control; of an unpacked sdist, all its files."""
    if (ROOT / ".git").exists():
        words = ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"]
        listed = subprocess.run(words, cwd=ROOT, capture_output=True, check=True).stdout.decode().split("\0")
        return [name for name in listed if name and (ROOT / name).exists()]
    found = [path.relative_to(ROOT) for path in ROOT.rglob("*") if path.is_file()]
    hidden = [p for p in found if any(part.startswith(".") or part == "__pycache__" for part in p.parts)]
    return [str(p) for p in found if p not in hidden and p.parts[0] not in GENERATED]


def _imported(node: ast.AST, name: str) -> Iterator[str]:
    if isinstance(node, ast.Import):
        yield from (alias.name for alias in node.names)
    elif isinstance(node, ast.ImportFrom):
        base = node.module or ""
        if node.level:
            base = ".".join([*name.split(".")[: -node.level], *([node.module] if node.module else [])])
        yield base
        # `from package import module` leads to the module too; a name that is none does no harm
        yield from (f"{base}.{alias.name}" for alias in node.names)


def _run_at_start(tree: ast.AST) -> Iterator[ast.AST]:
    """The nodes that run when a module is imported: no bodies of functions, nothing that is for type checkers."""
    for node in ast.iter_child_nodes(tree):
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda):
            continue
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.unparse(node.test):
            continue
        yield node
        yield from _run_at_start(node)


def _speaking(tree: ast.AST) -> Iterator[str]:
    for node in ast.walk(tree):
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id in PRINTERS:
            yield f"line {node.lineno}: {node.func.id}"
        if isinstance(node, ast.Name) and node.id == "SystemExit":
            yield f"line {node.lineno}: SystemExit"
        if isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name):
            owner, what = node.value.id, node.attr
            if what in OUTPUTS.get(owner, ()) or (owner == "sys" and what in ("stdout", "stderr")):
                yield f"line {node.lineno}: {owner}.{what}"
