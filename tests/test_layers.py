"""The arrows between the rooms of the house: an import may only point down."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import tui

ROOT = Path(tui.__file__).parent
BASE = {"model", "errors"}
ALLOWED = {
    "model": set(),
    "errors": set(),
    "data": BASE,
    "physics": BASE,
    "consensus": BASE,
    "checks": BASE | {"physics"},
    "readers": BASE | {"data"},
    "store": BASE | {"consensus"},
    "workflow": BASE | {"data", "physics", "consensus", "checks", "readers", "store"},
    "desk": BASE | {"workflow"},
    "cli": BASE | {"workflow", "desk"},
    "__main__": BASE | {"cli", "workflow"},
    "__init__": set(),
}
PURE = ("physics", "checks", "consensus")
IMPURE_MODULES = {"sqlite3", "sqlite_utils", "socket", "urllib", "http", "subprocess", "os", "pathlib", "io", "time", "datetime"}


def modules() -> list[Path]:
    return sorted(path for path in ROOT.rglob("*.py") if "sample_db" not in path.parts)


def room(path: Path) -> str:
    relative = path.relative_to(ROOT)
    return relative.parts[0] if len(relative.parts) > 1 else relative.stem


def imported(path: Path) -> set[str]:
    """Every module that a file imports, inside functions too; imports for type checkers alone are left out."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    found: set[str] = set()
    skipped: set[ast.AST] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test):
            skipped.update(child for child in ast.walk(node))
    for node in ast.walk(tree):
        if node in skipped:
            continue
        if isinstance(node, ast.Import):
            found.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.update({node.module, *(f"{node.module}.{alias.name}" for alias in node.names)})
    return found


@pytest.mark.parametrize("path", modules(), ids=lambda path: str(path.relative_to(ROOT)))
def test_imports_point_down(path):
    here = room(path)
    for name in imported(path):
        if name.startswith("tui."):
            target = name.split(".")[1]
            if (ROOT / target).is_dir() or (ROOT / f"{target}.py").is_file():
                assert target == here or target in ALLOWED[here], f"{path.name} imports {name}"


@pytest.mark.parametrize("path", [p for p in modules() if room(p) in PURE], ids=lambda path: str(path.relative_to(ROOT)))
def test_pure_rooms_touch_nothing_outside(path):
    assert not {name.split(".")[0] for name in imported(path)} & IMPURE_MODULES
    source = path.read_text(encoding="utf-8")
    calls = {node.func.id for node in ast.walk(ast.parse(source)) if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)}
    assert "open" not in calls
    assert "np.random.seed" not in source and "np.random.rand" not in source


def test_only_connect_opens_the_database():
    for path in modules():
        if path.relative_to(ROOT).as_posix() != "store/connect.py":
            assert "sqlite3.connect(" not in path.read_text(encoding="utf-8"), path
