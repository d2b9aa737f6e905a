"""The verbs draw and export, and derive --latex, on the command line."""

from __future__ import annotations

import json
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from pathlib import Path

import pytest

from symbolic_response.cli import run

CASES = Path(__file__).parent.parent / "worked_cases"
GATE = str(CASES / "turnstile" / "network.toml")


@pytest.mark.parametrize("arguments", [
    [], ["--what", "cycles"], ["--what", "trees", "--root", "open"],
    ["--what", "splittings", "--transition", "turn"],
    ["--what", "forests", "--transition", "turn", "--root", "open"],
    ["--letters", "generator"],
])
def test_every_drawing(arguments: list[str], tmp_path: Path) -> None:
    files = [tmp_path / "a.svg", tmp_path / "a.tex"]
    outputs = [part for file in files for part in ("-o", str(file))]
    assert run(["draw", GATE, *arguments, *outputs, "--quiet"]) == 0
    assert ElementTree.parse(files[0]).getroot().tag.endswith("svg")
    assert r"\begin{tikzpicture}" in files[1].read_text(encoding="utf-8")


@pytest.mark.usefixtures("requires_latex")
def test_a_pdf(tmp_path: Path) -> None:
    assert run(["draw", GATE, "-o", str(tmp_path / "a.pdf"), "--quiet"]) == 0
    assert (tmp_path / "a.pdf").read_bytes().startswith(b"%PDF")


def test_counts_as_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Three states in a ring have 3 spanning trees towards each (Cayley's formula: 3^1)."""
    assert run(["draw", GATE, "--what", "trees", "--root", "open",
                "-o", str(tmp_path / "a.svg"), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["total"] == 3


@pytest.mark.parametrize(("arguments", "message"), [
    (["draw", GATE, "-o", "a.png"], "a.png"),
    (["draw", GATE, "-o", GATE], "the network file itself"),
    (["draw", GATE, "--what", "splittings", "-o", "a.svg"], "name one"),
    (["draw", GATE, "--what", "trees", "--root", "opne", "-o", "a.svg"], "did you mean 'open'"),
    (["export", GATE, "-o", "a.txt"], "a.txt"),
    (["export", GATE, "p[opne]", "-o", "a.py"], "did you mean 'open'"),
])
def test_refused(
    arguments: list[str], message: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    assert run([*arguments, "--quiet"]) == 2
    error = capsys.readouterr().err
    assert message in error and error.count("\n") == 1
    assert list(tmp_path.iterdir()) == []


def test_an_exported_module_checks_itself(tmp_path: Path) -> None:
    target = tmp_path / "gate.py"
    assert run(["export", GATE, "current[take]", "-o", str(target), "--quiet"]) == 0
    done = subprocess.run([sys.executable, "-I", "-m", "doctest", str(target)],
                          capture_output=True, text=True)
    assert done.returncode == 0, done.stdout


def test_equations_for_a_paper(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["derive", GATE, "p[loaded]", "d p[open] / d energy[open]", "--latex"]) == 0
    first, second = capsys.readouterr().out.splitlines()
    assert first.startswith(r"\pi_{l} = \frac{c k_{in} (t_{b} + s_{f}) + t_{b} s_{b}}{")
    assert second.startswith(r"\frac{\partial \pi_{o}}{\partial E_{o}} = ")


@pytest.mark.parametrize("verb", ["compare", "draw", "export", "appendix", "derive"])
def test_help_sets_examples_line_by_line(verb: str, capsys: pytest.CaptureFixture[str]) -> None:
    run([verb, "--help"])
    shown = capsys.readouterr().out
    assert "\b" not in shown and r"\b" not in shown
    assert "\n    symbolic-response " in shown
