"""What the README prints is what the commands print."""

import re
import shlex
from pathlib import Path

import pytest

from symbolic_response.cli import run

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def shown() -> list[tuple[str, str]]:
    """Return (command, output) for every command shown with its output."""
    found = []
    for block in re.findall(r"(?:^    .*\n)+(?:\n(?:    .*\n)+)*", README, re.MULTILINE):
        for part in re.split(r"^    \$ ", block, flags=re.MULTILINE)[1:]:
            command, _, output = part.partition("\n")
            lines = "\n".join(line[4:] for line in output.splitlines()).strip()
            if command.startswith("symbolic-response ") and lines:
                found.append((command.removeprefix("symbolic-response "), lines))
    return found


def test_there_is_output_to_compare() -> None:
    assert len(shown()) >= 7


@pytest.mark.parametrize(("command", "output"), shown(), ids=lambda text: text[:40])
def test_the_output_is_real(
    command: str, output: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "worked_cases").symlink_to(ROOT / "worked_cases")
    if command.startswith("recheck"):
        certify = next(c for c, _ in shown() if c.startswith("certify"))
        assert run([*shlex.split(certify), "--quiet"]) == 0
        capsys.readouterr()
    refuted = command.startswith("compare ")  # the README shows a slip
    assert run(shlex.split(command)) == (1 if refuted else 0)
    assert capsys.readouterr().out.strip() == output


def test_the_python_of_the_readme_runs(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "worked_cases").symlink_to(ROOT / "worked_cases")
    (code,) = re.findall(r"```python\n(.*?)```", README, re.DOTALL)
    exec(compile(code, "README", "exec"), {})
    assert (tmp_path / "ring.tex").is_file()


def test_the_network_file_of_the_readme_is_read(tmp_path: Path) -> None:
    from symbolic_response.network import read_network_text

    (text,) = re.findall(r"```toml\n(.*?)```", README, re.DOTALL)
    assert read_network_text(text).title == "Two-state rectifier"


def test_there_are_exactly_two_set_up_commands() -> None:
    section = README.split("## Set-up")[1].split("\n## ")[0]
    assert len(re.findall(r"^    \S", section, re.MULTILINE)) == 2
