"""One direction of travel: a stage imports only from the stages above it."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import symbolic_response

ROOT = Path(symbolic_response.__file__).parent
STAGES = ["checker", "errors", "files", "expressions", "network", "topology", "algebra", "response",
          "bounds", "certificates", "control", "hand", "figures", "export", "appendix",
          "progress", "cli", "__main__"]
SHELL = {"__init__"}  # the lazy list of public names reaches everything
MAX_LINES = 400


def modules() -> list[Path]:
    return sorted(path for path in ROOT.rglob("*.py"))


def stage_of(path: Path) -> str:
    return path.relative_to(ROOT).parts[0].removesuffix(".py")


def imported_stages(path: Path) -> set[str]:
    found = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names = []
        if isinstance(node, ast.ImportFrom) and node.module:
            names = [node.module]
        elif isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        for name in names:
            parts = name.split(".")
            if parts[0] == "symbolic_response" and len(parts) > 1:
                found.add(parts[1])
    return found


@pytest.mark.parametrize("path", modules(), ids=lambda path: str(path.relative_to(ROOT)))
def test_imports_point_one_way(path: Path) -> None:
    stage = stage_of(path)
    if stage in SHELL:
        return
    allowed = set(STAGES[: STAGES.index(stage) + 1])
    if stage != "cli":
        allowed -= {"checker"} - {stage}  # independent both ways
    if stage == "topology":
        allowed -= {"network", "expressions"}  # depends on the graph alone
    assert imported_stages(path) <= allowed


@pytest.mark.parametrize("path", modules(), ids=lambda path: str(path.relative_to(ROOT)))
def test_modules_stay_short(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= MAX_LINES


@pytest.mark.parametrize("arguments", [["--help"], ["derive", "--help"], ["derive", "--nonsense"]])
def test_help_loads_nothing_heavy(arguments: list[str]) -> None:
    code = (
        "import sys\n"
        "from symbolic_response.cli import run\n"
        f"run({arguments!r})\n"
        "heavy = {'sympy', 'networkx', 'numpy', 'flint', 'scipy', 'matplotlib', 'rich'}\n"
        "sys.exit(repr(sorted(heavy & set(sys.modules))) if heavy & set(sys.modules) else 0)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
