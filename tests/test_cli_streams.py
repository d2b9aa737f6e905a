"""What goes to standard output and error when all is well, and when the reader or user leaves."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
import time
from itertools import combinations
from pathlib import Path

import pytest

from symbolic_response.cli import run

PROGRAM = [sys.executable, "-m", "symbolic_response"]
HEAVY = ("sympy", "networkx", "matplotlib", "scipy", "rich", "numpy", "flint")

RING = """\
title = "ring"
about = "three states\\nin a ring"
[symbols.k]
[symbols.c]
[symbols.F]
sign = "real"
[states.A]
[states.B]
[states.C]
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k*c", 1]
[[transitions]]
name = "flip"
between = ["B", "C"]
rates = ["exp(F/2)", "exp(-F/2)"]
[[transitions]]
name = "reset"
between = ["C", "A"]
rates = ["k"]
"""


def complete_graph(size: int) -> str:
    """Return a network in which every rate has a symbol of its own: slow in closed form."""
    names = [f"S{k}" for k in range(size)]
    lines, rates = ['title = "complete"', *(f"[states.{name}]" for name in names)], []
    for first, second in combinations(names, 2):
        pair = [f"w_{first}_{second}", f"w_{second}_{first}"]
        lines += ["[[transitions]]", f"between = {[first, second]}", f"rates = {pair}"]
        rates += pair
    return "\n".join([*lines, *(f"[symbols.{name}]" for name in rates)])


@pytest.fixture
def ring(tmp_path: Path) -> Path:
    path = tmp_path / "ring.toml"
    path.write_text(RING, encoding="utf-8")
    return path


@pytest.fixture
def large(tmp_path: Path) -> Path:
    path = tmp_path / "large.toml"
    path.write_text(complete_graph(6), encoding="utf-8")
    return path


@pytest.mark.parametrize("arguments", [
    ["survey"], ["derive", "p[A]"], ["derive", "p[A]", "d p[B] / d ln c", "--at", "c=2"],
    ["derive", "p[A]", "ln(p[A])", "--at", "c=2", "--at", "k=1/3", "--at", "F=ln(4)"],
    ["derive", "--set", "k=c", "p[C]"],
])
def test_json_is_one_object_and_nothing_else(
    arguments: list[str], ring: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    verb, *more = arguments
    assert run([verb, str(ring), "--json", *more]) == 0
    out, err = capfd.readouterr()
    assert err == ""
    data = json.loads(out)
    assert data["network"] == "ring"
    if verb == "derive":
        asked = [text for text in more if text.startswith(("p", "d", "ln"))]
        assert [result["quantity"] for result in data["results"]] == asked
        for result in data["results"]:
            assert set(result) - {"enclosure"} == {"quantity", "expression", "latex", "value"}


def test_progress_stays_off_standard_output(tmp_path: Path) -> None:
    path = tmp_path / "larger.toml"
    path.write_text(complete_graph(7), encoding="utf-8")
    commands = [[*PROGRAM, "survey", str(path), "--json", *extra] for extra in ([], ["--quiet"])]
    told, quiet = (subprocess.run(command, capture_output=True, text=True, timeout=120,
                                  check=True) for command in commands)
    assert told.stdout == quiet.stdout
    assert json.loads(told.stdout)["trees"]["undirected"] == 7**5
    assert quiet.stderr == ""
    assert all(line.startswith("working: ") for line in told.stderr.splitlines())


@pytest.mark.parametrize("arguments", [["survey"], ["survey", "--json"], ["derive", "p[S0]"]])
def test_a_reader_that_leaves_early(arguments: list[str], large: Path) -> None:
    verb, *more = arguments
    process = subprocess.Popen([*PROGRAM, verb, str(large), "--quiet", *more],
                               stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    assert process.stdout is not None
    assert process.stderr is not None
    assert len(process.stdout.read(1)) == 1
    process.stdout.close()
    assert process.stderr.read() == b""
    assert process.wait(60) == 0
    process.stderr.close()


def test_standard_output_closed_from_the_start(ring: Path) -> None:
    done = subprocess.run(["sh", "-c", '"$@" >&-', "sh", *PROGRAM, "survey", str(ring)],
                          stderr=subprocess.PIPE, text=True, timeout=60, check=False)
    assert "Traceback" not in done.stderr


def test_standard_output_full(ring: Path) -> None:
    with open("/dev/full", "w", encoding="utf-8") as full:
        done = subprocess.run([*PROGRAM, "survey", str(ring)], stdout=full,
                              stderr=subprocess.PIPE, text=True, timeout=60, check=False)
    assert done.returncode == 2
    assert done.stderr.startswith("error: ")
    assert done.stderr.count("\n") == 1


@pytest.mark.parametrize("delay", [0.6, 2.5])
def test_interrupt(delay: float, tmp_path: Path) -> None:
    path = tmp_path / "large.toml"
    path.write_text(complete_graph(9), encoding="utf-8")
    process = subprocess.Popen([*PROGRAM, "survey", str(path), "--quiet"],
                               stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    time.sleep(delay)
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=20)
    assert (process.returncode, out, err) == (130, "", "error: interrupted\n")


@pytest.mark.parametrize("arguments", [
    ["--help"], ["survey", "--help"], ["derive", "--help"], ["appendix", "--help"], ["--version"],
    [], ["nonsense"], ["derive"], ["survey", "none.toml", "--nonsense"],
    ["derive", "none.toml", "p[A]", "--terms", "many"],
])
def test_help_and_bad_arguments_are_quick(arguments: list[str]) -> None:
    code = (
        "import sys\nfrom symbolic_response.cli import run\n"
        f"status = run({arguments!r})\n"
        f"print([name for name in {HEAVY!r} if name in sys.modules], status)"
    )
    best, shown = 10.0, ""
    for _ in range(3):
        start = time.perf_counter()
        shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True,
                               timeout=60, check=True).stdout
        best = min(best, time.perf_counter() - start)
        if best < 0.5:
            break
    good = bool({"--help", "--version"} & set(arguments))
    assert shown.splitlines()[-1] == f"[] {0 if good else 2}"
    assert best < 1


@pytest.mark.parametrize("verb", ["survey", "derive", "appendix"])
def test_help_shows_an_example(verb: str, capfd: pytest.CaptureFixture[str]) -> None:
    assert run([verb, "--help"]) == 0
    out, err = capfd.readouterr()
    assert "Example" in out
    assert err == ""


def test_a_quantity_may_begin_with_a_minus_sign_after_two_dashes(
    ring: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    assert run(["derive", str(ring), "--at", "c=2", "--", "-c"]) == 0
    assert capfd.readouterr().out == "-c = -2\n"
