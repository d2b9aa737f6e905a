"""The verbs about control parameters on the command line: statuses, messages, files, JSON."""

from __future__ import annotations

import csv
import io
import json
import os
import signal
import subprocess
import sys
import time
from fractions import Fraction
from pathlib import Path

import pytest

from symbolic_response.cli import run

PROGRAM = [sys.executable, "-m", "symbolic_response"]
HEAVY = ("sympy", "networkx", "matplotlib", "scipy", "rich", "numpy", "flint")

RING = """\
title = "ring"
[symbols.c]
[symbols.k]
[symbols.u]
[symbols.x]
sign = "real"
[states.A]
[states.B]
[states.C]
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["k*c", "u"]
[[transitions]]
name = "flip"
between = ["B", "C"]
rates = ["k*exp(x)", "1/2"]
[[transitions]]
name = "reset"
between = ["C", "A"]
rates = ["u", "k"]
[observables.n]
B = 1
C = 2
[observables.w]
B = "c"
[observables.v]
B = "k"
[observables.same]
A = 3
B = 3
C = 3
"""
VALUES = ["--at", "k=2", "--at", "u=1", "--at", "x=ln(3/2)"]
ENDS = ["--from", "1/10", "--to", "10", "--points", "3"]
CLOUD = ["d p[A] / d barrier[bind]", "--points", "4", "--workers", "1"]
ONE_WAY = RING.replace('["u", "k"]', '["u"]')


@pytest.fixture
def ring(tmp_path: Path) -> Path:
    path = tmp_path / "ring.toml"
    path.write_text(RING, encoding="utf-8")
    return path


def refused(arguments: list[str], status: int, said: str, capfd: pytest.CaptureFixture[str]
            ) -> None:
    """Check the status, the one line on standard error, and that nothing else is said."""
    assert run([*arguments, "--quiet"]) == status
    out, err = capfd.readouterr()
    assert out == "" and err.startswith("error: ") and err.count("\n") == 1
    assert said in err, err


# -- what cannot be used ---------------------------------------------------------------------------

ASKED: dict[str, tuple[list[str], str]] = {
    "an unknown symbol": (["mean[n]", "cc"], "no symbol 'cc' in the network; did you mean 'c'?"),
    "ln of a real symbol": (["mean[n]", "ln x"], "write x"),
    "no symbol": (["mean[n]", ""], "no symbol ''"),
    "a state": (["mean[n]", "energy[A]"], "no symbol 'energy[A]'"),
    "the parameter has a value": (["mean[n]", "c", "--at", "c=1"], "c is the parameter"),
    "a value of the wrong sign": (["mean[n]", "c", "--at", "k=-1"], "k is a positive symbol"),
    "an unknown value": (["mean[n]", "c", "--at", "kk=1"], "did you mean 'k'?"),
    "a value twice": (["mean[n]", "c", "--at", "k=1", "--at", "k=1"], "k is given twice"),
    "a value with a symbol": (["mean[n]", "c", "--at", "k=u"], "contains the symbol u"),
    "depends on the parameter": (["mean[w]", "c"], "itself depends on c"),
    "depends on it by a factor": (["c*p[A]", "c"], "itself depends on c"),
    "a ratio": (["p[A]/p[B]", "c"], "the mean of an observable"),
    "a logarithm": (["ln(p[A])", "c"], "the mean of an observable"),
    "a current": (["current[bind]", "c"], "the mean of an observable"),
    "a response": (["d p[A] / d c", "c"], "the mean of an observable"),
    "nothing responds": (["mean[same]", *VALUES, "c"], "same in every state"),
    "all states": (["p[A, B, C]", *VALUES, "c"], "same in every state"),
    "no quantity": (["p[A", "c"], "not closed by ]"),
    "an unknown observable": (["mean[m]", "c"], "'m'"),
}


@pytest.mark.parametrize("name", ASKED)
@pytest.mark.parametrize("verb", ["steepness", "curve"])
def test_what_cannot_be_asked(
    verb: str, name: str, ring: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    more = ENDS if verb == "curve" else []
    arguments, said = ASKED[name]
    refused([verb, str(ring), *arguments, *more], 2, said, capfd)


STEEPNESS: dict[str, tuple[list[str], str]] = {
    "no number": (["--measured", "x"], "--measured x: write"),
    "no real number": (["--measured", "nan"], "--measured nan: write"),
    "an empty number": (["--measured", ""], "--measured ''"),
    "a division by zero": (["--measured", "1/0"], "--measured '1/0': division by zero"),
    "an irrational number": (["--measured", "sqrt(2)"], "write a number such as"),
    "a negative number": (["--measured", "-2"], "-2 is negative"),
    "a gigantic number": (["--measured", "1e99999999"], "more than 1000 digits"),
    "a range without values": (["--from", "1"], "a range of c needs a value"),
    "an empty range": ([*VALUES, "--from", "5", "--to", "1"], "low below high"),
    "a range of one point": ([*VALUES, "--from", "5", "--to", "5"], "low below high"),
    "a range from zero": ([*VALUES, "--from", "0"], "c is a positive symbol"),
}
CURVE: dict[str, tuple[list[str], str]] = {
    "no values": (["--from", "1", "--to", "2"], "k has no value"),
    "one value missing": ([*VALUES[:4], *ENDS], "give it one with --at x=VALUE"),
    "an irrational rate": ([*VALUES[:4], "--at", "x=1", *ENDS], "write a value such as x=2*ln"),
    "no end": ([*VALUES, "--from", "1"], "Missing option '--to'"),
    "ends in the wrong order": ([*VALUES, "--from", "2", "--to", "1"], "low below high"),
    "equal ends": ([*VALUES, "--from", "2", "--to", "2"], "low below high"),
    "zero": ([*VALUES, "--from", "0", "--to", "1"], "c is a positive symbol"),
    "a symbol in an end": ([*VALUES, "--from", "k", "--to", "9"], "--from k: write an exact"),
    "a formula cut short": ([*VALUES, "--from", "1", "--to", "2+"], "--to '2+'"),
    "an end of many digits": ([*VALUES, "--from", "1", "--to", "10**70"], "--to '10**70'"),
    "one point": ([*VALUES, *ENDS, "--points", "1"], "--points"),
    "half a point": ([*VALUES, *ENDS, "--points", "2.5"], "--points"),
    "a bad suffix": ([*VALUES, *ENDS, "-o", "a.txt"], "'a.txt': write .csv, .tex, .pdf"),
    "no suffix": ([*VALUES, *ENDS, "-o", "pdf"], "'pdf': write"),
    "no folder": ([*VALUES, *ENDS, "-o", "none/a.pdf"], "make it first"),
    "a folder that takes no files": ([*VALUES, *ENDS, "-o", "/proc/a.pdf"],
                                     "cannot write '/proc/a.pdf'"),
    "the same for a table": ([*VALUES, *ENDS, "-o", "/proc/a.csv"], "cannot write '/proc/a.csv'"),
}


@pytest.mark.parametrize("name", STEEPNESS)
def test_faulty_steepness(name: str, ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    arguments, said = STEEPNESS[name]
    refused(["steepness", str(ring), "mean[n]", "c", *arguments], 2, said, capfd)


@pytest.mark.parametrize("name", CURVE)
def test_faulty_curve(name: str, ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    arguments, said = CURVE[name]
    refused(["curve", str(ring), "mean[n]", "c", *arguments], 2, said, capfd)


@pytest.mark.parametrize(("arguments", "said"), [
    (["p[A]"], "does not apply"),
    (["d p[A] / d c"], "does not apply"),
    (["d p[A] / d barrier[bin]"], "did you mean 'bind'?"),
    (["d p[A, B, C] / d barrier[bind]"], "constant observable"),
    ([*CLOUD, "--points", "0"], "--points"),
    ([*CLOUD, "--workers", "0"], "--workers"),
    ([*CLOUD, "-o", "a.tex"], "'a.tex': write .csv, .pdf"),
    ([*CLOUD, "-o", "none/a.pdf"], "make it first"),
])
def test_faulty_cloud(
    arguments: list[str], said: str, ring: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    refused(["cloud", str(ring), *arguments], 2, said, capfd)


def test_a_cloud_needs_finite_forces(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "one way.toml"
    path.write_text(ONE_WAY, encoding="utf-8")
    refused(["cloud", str(path), *CLOUD], 2, "infinite everywhere", capfd)


ENTRIES: dict[str, tuple[str, str]] = {
    "no parameter": ('directed = [{rates = ["forward[bind]"], amount = "1"}]', "no parameter"),
    "another sum": ('parameter = "ln c"\ndirected = [{rates = ["forward[bind]"], amount = "2"}]',
                    "they give 2, it is 1"),
    "an unknown symbol": ('parameter = "ln z"', "there is no symbol 'z'"),
    "an unknown key": ('parameter = "ln c"\ndirekt = 1', "did you mean 'directed'?"),
    "an unknown key beside pieces": (
        'parameter = "ln c"\nenergies = {A = "1"}\ndirekt = 1', "did you mean 'directed'?"),
    "an unknown state": ('parameter = "ln c"\nenergies = {D = "1"}', "there is no state 'D'"),
    "a formula cut short": ('parameter = "ln c"\nenergies = {A = "1+"}', "energies of 'A'"),
    "a number": ("parameter = 3", "in quotes"),
}


@pytest.mark.parametrize("name", ENTRIES)
def test_faulty_entries_are_named(
    name: str, tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    entry, said = ENTRIES[name]
    path = tmp_path / "control.toml"
    good = '[[control]]\nparameter = "ln c"\nobservables = ["mean[n]"]\n'
    path.write_text(f"{RING}{good}[[control]]\n{entry}\n", encoding="utf-8")
    refused(["steepness", str(path), "mean[n]", "c"], 2, said, capfd)
    refused(["steepness", str(path), "mean[n]", "c"], 2, "[[control]], entry 2: ", capfd)


# -- what is said ----------------------------------------------------------------------------------


def said_json(arguments: list[str], capfd: pytest.CaptureFixture[str]) -> dict[str, object]:
    """Return the one JSON object on standard output; nothing may stand on standard error."""
    assert run([*arguments, "--json", "--quiet"]) == 0
    out, err = capfd.readouterr()
    assert err == ""
    data = json.loads(out)
    assert isinstance(data, dict)
    return data


def exact(pair: object) -> Fraction:
    """Return a number of the JSON, after a look at its decimal."""
    assert isinstance(pair, dict) and set(pair) == {"exact", "decimal"}
    value = Fraction(pair["exact"])
    assert abs(Fraction(pair["decimal"]) - value) <= abs(value) / 10**11
    return value


def test_steepness_as_json(ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    data = said_json(["steepness", str(ring), "mean[n]", "ln c", "--measured", "1/2", *VALUES],
                     capfd)
    assert (data["parameter"], data["logarithmic"], data["range"]) == ("c", True, ["0", "2"])
    assert data["with_any_forces"] == "1" and data["missing"] == []
    assert data["function"] == "(15*c + 17)/(9*(2*c + 3))"
    assert data["steepest"]["value"] == "11/216"  # type: ignore[index]
    open_ = said_json(["steepness", str(ring), "mean[v]", "c"], capfd)
    assert (open_["range"], open_["missing"]) == (None, ["k", "u", "x"])


def test_steepness_in_words(ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """What q is stands there with values or without."""
    for more, q in (([], "q = mean[n]/2"), (VALUES, "q = mean[n]/2")):
        assert run(["steepness", str(ring), "mean[n]", "c", "--quiet", *more]) == 0
        assert capfd.readouterr().out.startswith(f"{q}: abs(d q / d ln c) <= H*q*(1 - q)")
    for observable, q in (("p[A]+2*p[B]", "(p[A]+2*p[B])/2"), ("p[A]", "p[A]"),
                          ("p[A] - p[B]", "(p[A] - p[B] + 1)/2"),
                          ("p[A]+p[B]", "p[A]+p[B]"),
                          ("mean[v]", "(mean[v] - low)/(high - low), low and high its extremes")):
        assert run(["steepness", str(ring), observable, "c", "--quiet"]) == 0
        assert capfd.readouterr().out.startswith(f"q = {q}")


def test_entries_of_the_file_are_shown(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    """Each for what it is given for: the parameter or its logarithm."""
    path = tmp_path / "control.toml"
    path.write_text(RING + "".join(
        f'[[control]]\nparameter = "{by}"\ndirected = [{{rates = ["forward[bind]"],'
        f' amount = "{amount}"}}]\n' for by, amount in (("ln c", "1"), ("c", "1/c"))),
        encoding="utf-8")
    own = said_json(["steepness", str(path), "mean[n]", "c"], capfd)["own"]
    assert isinstance(own, list) and [piece["parameter"] for piece in own] == ["ln c", "c"]
    assert run(["steepness", str(path), "mean[n]", "c", "--quiet"]) == 0
    out = capfd.readouterr().out
    assert "that of the file, checked: d/d ln c: 1 of forward[bind]" in out
    assert "that of the file, checked: d/d c: 1/c of forward[bind]" in out


def test_curve_as_json(ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """The same numbers as the table, and those of the formula."""
    arguments = ["curve", str(ring), "mean[n]", "c", *VALUES, *ENDS]
    data = said_json(arguments, capfd)
    assert (data["network"], data["observable"], data["parameter"]) == ("ring", "mean[n]", "c")
    assert (data["q"], data["range"], data["files"]) == ("mean[n]/2", ["0", "2"], [])
    assert run([*arguments, "--quiet"]) == 0
    rows = list(csv.reader(io.StringIO(capfd.readouterr().out)))[1:]
    points = data["points"]
    assert isinstance(points, list) and len(points) == len(rows) == 3
    for point, row in zip(points, rows, strict=True):
        assert exact(point["steepness_without_forces"]) == 1
        names = ("x", "q", "sensitivity", "bound", "steepness", "covariance_bound")
        x, q, slope, bound, h, fine = (exact(point[name]) for name in names)
        assert [x, q, slope, bound, h, fine] == [Fraction(entry) for entry in row[::2]]
        assert q == (15 * x + 17) / (9 * (2 * x + 3)) and slope == 11 * x / (9 * (2 * x + 3) ** 2)
        assert abs(slope) <= fine <= bound == h * q * (1 - q)


def test_a_real_parameter_as_json(ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    data = said_json(["curve", str(ring), "p[A]", "x", "--at", "k=2", "--at", "u=1", "--at", "c=3",
                      "--from", "-1", "--to", "1", "--points", "3"], capfd)
    assert data["logarithmic"] is False
    assert data["sensitivity"] == "d p[A] / d x" and data["range"] == ["0", "1"]
    points = data["points"]
    assert isinstance(points, list) and all("ln(" in p["x"]["exact"] or p["x"]["exact"] == "0"
                                            for p in points)


def test_cloud_as_json(ring: Path, capfd: pytest.CaptureFixture[str]) -> None:
    data = said_json(["cloud", str(ring), *CLOUD], capfd)
    assert data["sampled"] == 4 and "no symbols scale" in str(data["not_constructed"])
    points = data["points"]
    assert isinstance(points, list) and len(points) == 4
    for point in points:
        g, value = Fraction(point["exp_force"]), exact(point["value"])
        assert 0 <= value < 1 <= g
        assert ((1 + value) / (1 - value)) ** 2 <= g  # value <= tanh(ln(g)/4)
    assert run(["cloud", str(ring), *CLOUD]) == 0
    assert "no points near the envelope are constructed" in capfd.readouterr().err


# -- files -----------------------------------------------------------------------------------------


def test_files_are_written(ring: Path, tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    names = [str(tmp_path / f"a{suffix}") for suffix in (".csv", ".tex", ".svg", ".PDF", ".png")]
    data = said_json(["curve", str(ring), "mean[n]", "c", *VALUES, *ENDS,
                      *(part for name in names for part in ("-o", name))], capfd)
    assert data["files"] == names
    starts = (b"c,c (decimal)", b"", b"<?xml", b"%PDF", b"\x89PNG")
    for name, start in zip(names, starts, strict=True):
        content = Path(name).read_bytes()
        assert content.startswith(start) and content
    assert sorted(os.listdir(tmp_path)) == sorted([*map(os.path.basename, names), "ring.toml"])


@pytest.mark.parametrize("verb", ["curve", "cloud"])
def test_files_together_or_none(
    verb: str, ring: Path, tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    old = tmp_path / "old.csv"
    old.write_text("old", encoding="utf-8")
    more = ["mean[n]", "c", *VALUES, *ENDS] if verb == "curve" else CLOUD
    refused([verb, str(ring), *more, "-o", str(old), "-o", str(tmp_path / "a.svg"), "-o",
             "/proc/a.pdf"], 2, "cannot write '/proc/a.pdf'", capfd)
    assert old.read_text(encoding="utf-8") == "old"
    assert sorted(os.listdir(tmp_path)) == ["old.csv", "ring.toml"]


def test_the_network_file_is_not_written_over(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "ring.csv"
    path.write_text(RING, encoding="utf-8")
    refused(["curve", str(path), "mean[n]", "c", *VALUES, *ENDS, "-o", str(path)], 2,
            "is the network file itself", capfd)
    assert path.read_text(encoding="utf-8") == RING


# -- processes -------------------------------------------------------------------------------------


def test_an_interrupted_pool_leaves_nothing_behind(ring: Path, tmp_path: Path) -> None:
    """Ctrl-C reaches every process of the group: one line, no file, no process left.

    Sent once the processes of the pool are there, as Linux lists them.
    """
    process = subprocess.Popen(
        [*PROGRAM, "cloud", str(ring), "d p[A] / d barrier[bind]", "--points", "500000",
         "--workers", "2", "-o", str(tmp_path / "a.csv"), "--quiet"],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True)
    children = Path(f"/proc/{process.pid}/task/{process.pid}/children")
    for _ in range(600):
        if len(children.read_text(encoding="utf-8").split()) >= 2:
            break
        time.sleep(0.1)
    time.sleep(1)
    os.killpg(process.pid, signal.SIGINT)
    out, err = process.communicate(timeout=30)
    assert (process.returncode, out, err) == (130, "", "error: interrupted\n")
    assert os.listdir(tmp_path) == ["ring.toml"]
    with pytest.raises(ProcessLookupError):
        os.killpg(process.pid, 0)


@pytest.mark.parametrize("verb", ["steepness", "curve", "cloud"])
@pytest.mark.parametrize("arguments", [["--help"], [], ["none.toml", "--nonsense"]])
def test_help_loads_nothing_heavy(verb: str, arguments: list[str]) -> None:
    code = (
        "import sys\nfrom symbolic_response.cli import run\n"
        f"status = run({[verb, *arguments]!r})\n"
        f"print([name for name in {HEAVY!r} if name in sys.modules], status)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60,
                          check=True)
    assert done.stdout.splitlines()[-1] == f"[] {0 if '--help' in arguments else 2}"
    assert ("Example:" in done.stdout) == ("--help" in arguments)
