"""The house stands: imports point downward, and heavy libraries stay where they are allowed."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.support.paths import ROOT

FLOORS = (
    ("__main__",),
    ("cli",),
    ("report",),
    ("pipeline", "compare"),
    ("waivers", "idle", "pairing"),
    ("checks",),
    ("solve",),
    ("topology",),
    ("board",),
    ("netlist",),
    ("partdata",),
    ("limits_file",),
    ("limits",),
    ("findings",),
    ("toml",),
    ("quantities", "sources", "joining"),
)
"""Top to bottom; a module imports from its own room and from floors below."""

LEVEL = {room: level for level, rooms in enumerate(FLOORS) for room in rooms}

ALLOWED = {
    "numpy": {"solve", "checks"},
    "networkx": {"board"},
    "pint": {"quantities"},
    "sexpdata": {"netlist"},
    "click": {"cli"},
    "scipy": set(),
    "matplotlib": set(),
}
"""Which rooms may use which library."""

MODULES = sorted((ROOT / "protlint").rglob("*.py"))


def room_of(path: Path) -> str:
    """Return the room a module stands in: its package, or its own name at the top."""
    return path.relative_to(ROOT / "protlint").parts[0].removesuffix(".py")


def imports(path: Path) -> Iterator[tuple[str, int, bool]]:
    """Yield (module, line, whether for type checkers only) of every import."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for_types = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING")
        for inner in ast.walk(node)
    }
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield alias.name, node.lineno, id(node) in for_types
        elif isinstance(node, ast.ImportFrom) and node.module:
            names = [node.module]
            if node.module == "protlint":
                names = [f"protlint.{alias.name}" for alias in node.names]
            for name in names:
                yield name, node.lineno, id(node) in for_types


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_imports_point_downward(path: Path) -> None:
    room = room_of(path)
    if room == "__init__":
        return
    for module, line, _ in imports(path):
        head, *rest = module.split(".")
        if head == "protlint" and rest and rest[0] != "__version__":
            other = rest[0]
            assert other in LEVEL, f"{path}:{line}: {other} stands on no floor"
            below = other == room or LEVEL[other] > LEVEL[room]
            assert below, f"{path}:{line}: {room} imports {other}, which is not below it"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_libraries_stay_in_their_rooms(path: Path) -> None:
    for module, line, for_types in imports(path):
        rooms = ALLOWED.get(module.split(".")[0])
        if rooms is not None and not for_types:
            assert room_of(path) in rooms, f"{path}:{line}: {module} is not used on this floor"


def test_modules_stay_readable() -> None:
    """A module over 400 lines is a place to look."""
    long = [path.name for path in MODULES if len(path.read_text(encoding="utf-8").splitlines()) > 400]
    assert not long
