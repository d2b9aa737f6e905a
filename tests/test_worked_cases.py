"""Each worked case, from its network file to a PDF."""

import re
import subprocess
from pathlib import Path

import pytest

from symbolic_response.cli import run

CASES = sorted((Path(__file__).parent.parent / "worked_cases").iterdir())


def test_every_case_has_a_network_and_names_its_question() -> None:
    assert len(CASES) >= 2
    for case in CASES:
        assert (case / "network.toml").is_file()
        assert "**The question.**" in (case / "README.md").read_text(encoding="utf-8")


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_the_commands_of_the_case_run(
    case: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Every command that the README of a case prints does what it says."""
    import shlex

    text = (case / "README.md").read_text(encoding="utf-8")
    commands = re.findall(r"^    symbolic-response (.+)$", text, re.MULTILINE)
    assert len(commands) >= 3
    monkeypatch.chdir(tmp_path)
    (tmp_path / "worked_cases").symlink_to(case.parent)
    for command in commands:
        refuted = command.startswith("compare ")  # the cases hold slips
        assert run(shlex.split(command)) == (1 if refuted else 0)
    assert "error" not in capsys.readouterr().err


@pytest.mark.usefixtures("requires_latex")
@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_the_case_becomes_a_pdf(case: Path, tmp_path: Path) -> None:
    target = tmp_path / "case.tex"
    assert run(["appendix", str(case / "network.toml"), "-o", str(target), "--quiet"]) == 0
    for _ in range(2):
        subprocess.run(["pdflatex", "-interaction=nonstopmode", "-halt-on-error", target.name],
                       cwd=tmp_path, check=True, capture_output=True, timeout=120)
    log = (tmp_path / "case.log").read_text(encoding="latin-1")
    assert (tmp_path / "case.pdf").stat().st_size > 10_000
    assert "Overfull" not in log
    assert "undefined" not in log
