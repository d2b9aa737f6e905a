"""Faulty files and arguments on the command line: one line on standard error, nothing else.

The cheap ones run inside this process through :func:`symbolic_response.cli.run`; what could crash,
hang or fill the memory runs as a process of its own with limits on both.
"""

from __future__ import annotations

import resource
import subprocess
import sys
from itertools import combinations
from pathlib import Path

import pytest

from symbolic_response.cli import run

SECONDS, BYTES = 20, 2 * 1024**3

RING = """\
title = "ring"
[symbols.k]
[symbols.c]
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
[observables.occupancy]
B = 1
C = "c/2"
"""
ENERGY = """\
title = "energies"
[symbols.E]
sign = "real"
[symbols.B]
sign = "real"
[states.A]
energy = "E"
[states.C]
energy = "0"
[[transitions]]
name = "one"
between = ["A", "C"]
barrier = "B"
[[transitions]]
name = "two"
between = ["A", "C"]
barrier = "2*B"
drive = "E"
"""
ONE_WAY = RING.replace('rates = ["u", "k"]', 'rates = ["u"]')
VALUES = ["--at", "k=2", "--at", "c=3", "--at", "u=1", "--at", "x=ln(3/2)"]


def edited(old: str, new: str, text: str = RING) -> str:
    assert old in text
    return text.replace(old, new, 1)


def rate(expression: str) -> str:
    return edited('"k*c"', f'"{expression}"')


def complete_graph(size: int) -> str:
    names = [f"S{k}" for k in range(size)]
    lines = ['title = "complete"', "[symbols.k]", *(f"[states.{name}]" for name in names)]
    for first, second in combinations(names, 2):
        lines += ["[[transitions]]", f'between = ["{first}", "{second}"]', 'rates = ["k", 1]']
    return "\n".join(lines)


# what a file may hold that cannot be used: survey and derive refuse it alike
FILES: dict[str, str | bytes] = {
    "empty": "",
    "not UTF-8": RING.encode().replace(b"ring", b"r\xefng"),
    "UTF-16": RING.encode("utf-16"),
    "a NUL": RING + "\0",
    "not TOML": "title = ring",
    "JSON": '{"title": "ring"}',
    "half a file": RING[: len(RING) // 2],
    "title missing": edited('title = "ring"\n', ""),
    "title a number": edited('"ring"', "3"),
    "unknown key at the top": edited("title", 'titel = "x"\ntitle'),
    "unknown section": RING + '[states_.D]\nenergy = "0"\n',
    "misspelt section": edited("[[transitions]]", "[[transition]]"),
    "unknown key of a symbol": edited("[symbols.k]", "[symbols.k]\nsing = 'real'"),
    "unknown sign": edited('"real"', '"imaginary"'),
    "unknown key of a transition": edited("rates", "rate"),
    "states an array": edited("[states.A]", "[[states.A]]"),
    "one state": "title = 'x'\n[states.A]\n",
    "no transitions": "title = 'x'\n[states.A]\n[states.B]\n",
    "between one state": edited('["A", "B"]', '["A"]'),
    "between three states": edited('["A", "B"]', '["A", "B", "C"]'),
    "between a state and itself": edited('["A", "B"]', '["A", "A"]'),
    "between an unknown state": edited('["A", "B"]', '["A", "b"]'),
    "between numbers": edited('["A", "B"]', "[1, 2]"),
    "rates a text": edited('["k*c", "u"]', '"k*c"'),
    "no rates": edited('["k*c", "u"]', "[]"),
    "three rates": edited('["k*c", "u"]', '["k*c", "u", "k"]'),
    "rates a table": edited('["k*c", "u"]', "{a = 1}"),
    "rate true": edited('"k*c"', "true"),
    "rate a date": edited('"k*c"', "2020-01-01"),
    "rate zero": edited('"1/2"', "0"),
    "rate zero in disguise": rate("k - k"),
    "rate negative": edited('"1/2"', "-1"),
    "rate negative in disguise": rate("-k*c - u**2"),
    "rate infinite": edited('"1/2"', "inf"),
    "rate not a number": edited('"1/2"', "nan"),
    "rate not a number, as text": edited('"1/2"', '"nan"'),
    "rate divides by zero": rate("k*c/(u - u)"),
    "rate a logarithm of zero": rate("k*c*ln(0)"),
    "rate a logarithm below zero": rate("k*c + ln(-2)"),
    "rate a root below zero": rate("k*c + sqrt(-2)"),
    "rate undeclared symbol": rate("k*c*z"),
    "rate empty": rate(""),
    "rate of many lines": rate("k*\\n"),
    "rate unclosed": rate("k*(c"),
    "rate with a caret": rate("k^2*c"),
    "rate without a star": rate("2k*c"),
    "rate with a reserved name": rate("k*c*p"),
    "rate with an atom": rate("k*c*p[A]"),
    "rate with a symbolic exponent": rate("k**c"),
    "rate with a huge exponent": rate("k*c**65"),
    "power tower": rate("k*c*9**9**9"),
    "power of powers": rate("k*c*((9**64)**64)**64"),
    "5,000 digits": rate("k*c*" + "7" * 5000),
    "5,000 digits as a number": edited('"1/2"', "7" * 5000),
    "5,000 decimals": rate("k*c*0." + "7" * 5000),
    "exponent of ten": rate("k*c*1e99999"),
    "code": rate("__import__('os').system('touch left_behind')"),
    "code in double quotes": rate("k*c*eval(open)"),
    "lambda": rate("(lambda: k)()"),
    "attribute": rate("k.__class__"),
    "f-string": rate("f'{k}'"),
    "walrus": rate("(k:=2)"),
    "comprehension": rate("[k for k in c][0]"),
    "full-width digits": rate("k*c*\uff12"),
    "Greek letter": rate("k*c*\u03bb"),
    "unused symbol": edited("[symbols.k]", "[symbols.unused]\n[symbols.k]"),
    "reserved symbol": RING.replace("k*", "energy*").replace("symbols.k", "symbols.energy"),
    "symbol with a dash": edited("[symbols.k]", '[symbols."k-on"]'),
    "symbol declared twice": edited("[symbols.k]", "[symbols.k]\n[symbols.k]"),
    "state declared twice": edited("[states.A]", "[states.A]\n[states.A]"),
    "transition named twice": edited('"flip"', '"bind"'),
    "transition name with a space": edited('"flip"', '"f lip"'),
    "default names that collide": RING.replace('name = "bind"\n', "").replace(
        'name = "flip"\nbetween = ["B", "C"]', 'between = ["A", "B"]'),
    "absorbing": edited('["k*exp(x)", "1/2"]', '["k*exp(x)"]',
                        RING.replace('rates = ["u", "k"]', 'rates = ["u*0.5"]').replace(
                            'between = ["C", "A"]', 'between = ["A", "C"]')),
    "unreachable": RING.replace('rates = ["k*exp(x)", "1/2"]\n', 'rates = ["k*exp(x)"]\n').replace(
        '["C", "A"]\nrates = ["u", "k"]', '["B", "C"]\nrates = ["u*k"]'),
    "disconnected": RING + "[states.D]\n[states.F]\n[[transitions]]\nbetween = ['D', 'F']\n"
                    "rates = [1, 1]\n",
    "lone state": RING + "[states.D]\n",
    "range reversed": edited("[symbols.c]", '[symbols.c]\nrange = ["3", "1"]'),
    "range infinite": edited("[symbols.c]", "[symbols.c]\nrange = [1, inf]"),
    "range of one number": edited("[symbols.c]", "[symbols.c]\nrange = [1]"),
    "range below zero": edited("[symbols.c]", "[symbols.c]\nrange = [-1, 1]"),
    "range with a symbol": edited("[symbols.c]", '[symbols.c]\nrange = ["1", "k"]'),
    "range of code": edited("[symbols.c]", '[symbols.c]\nrange = ["1", "open(1)"]'),
    "observable of an unknown state": edited("B = 1", "D = 1"),
    "observable of code": edited("B = 1", "B = \"().__class__\""),
    "observable divides by zero": edited("B = 1", 'B = "1/(k - k)"'),
    "energy of code": edited('"E"', "\"exec('1')\"", ENERGY),
    "energy missing": edited('energy = "0"\n', "", ENERGY),
    "rates beside a barrier": edited('barrier = "B"', 'barrier = "B"\nrates = [1, 1]', ENERGY),
    "drive beside rates": edited('rates = ["u", "k"]', 'rates = ["u", "k"]\ndrive = "x"'),
    "drive of code": edited('drive = "E"', 'drive = "E.real"', ENERGY),
    "latex unbalanced": edited("[symbols.c]", "[symbols.c]\nlatex = '\\frac{'"),
    "same latex twice": edited("[symbols.c]", "[symbols.c]\nlatex = 'k'"),
}

# arguments after ``derive FILE`` that cannot be used with a network that can
DERIVE: dict[str, tuple[str, list[str]]] = {
    "no quantity": (RING, []),
    "empty quantity": (RING, [""]),
    "unknown state": (RING, ["p[D]"]),
    "no state": (RING, ["p[]"]),
    "state twice": (RING, ["p[A, A]"]),
    "unknown transition": (RING, ["current[bnid]"]),
    "two transitions": (RING, ["current[bind, flip]"]),
    "unknown observable": (RING, ["mean[occ]"]),
    "unknown symbol": (RING, ["p[A]*z"]),
    "bare state": (RING, ["A"]),
    "the second of two": (RING, ["p[A]", "p[D]"]),
    "inequality word": (RING, ["tanh(p[A])"]),
    "another inequality word": (RING, ["max_cov[occupancy, bind]"]),
    "trailing operator": (RING, ["p[A] +"]),
    "response to an unknown state": (RING, ["d p[A] / d energy[Z]"]),
    "response to an unknown transition": (RING, ["d p[A] / d barrier[A]"]),
    "response to an unknown symbol": (RING, ["d p[A] / d z"]),
    "response to ln of a real symbol": (RING, ["d p[A] / d ln x"]),
    "response to a probability": (RING, ["d p[A] / d p[B]"]),
    "response to a number": (RING, ["d p[A] / d 2"]),
    "response to nothing": (RING, ["d p[A]"]),
    "response inside a product": (RING, ["c*d p[A] / d c"]),
    "response twice without parentheses": (RING, ["d d p[A] / d c / d c"]),
    "bare ln before a quotient": (RING, ["d ln p[A]/p[B] / d c"]),
    "seven responses deep": (RING, ["(d " * 7 + "p[A]" + " / d c)" * 7]),
    "entropy production with a one-way step": (ONE_WAY, ["entropy_production"]),
    "response of that": (ONE_WAY, ["d entropy_production / d c"]),
    "code": (RING, ["__import__('os').system('touch left_behind')"]),
    "lambda": (RING, ["(lambda: 1)()"]),
    "attribute": (RING, ["p.__class__"]),
    "f-string": (RING, ["f'{p[A]}'"]),
    "power tower": (RING, ["9**9**9"]),
    "5,000 digits": (RING, ["7" * 5000]),
    "1/0": (RING, ["1/0"]),
    "1/(p[A] - p[A])": (RING, ["1/(p[A]-p[A])"]),
    "1/(p[A] + p[B] + p[C] - 1)": (RING, ["1/(p[A] + p[B] + p[C] - 1)"]),
    "1/(backward of one-way)": (ONE_WAY, ["1/backward[reset]"]),
    "ln(backward of one-way)": (ONE_WAY, ["ln(backward[reset])"]),
    "response of 1/(backward of one-way)": (ONE_WAY, ["d x/backward[reset] / d k"]),
    "response of 1/(k - k)": (RING, ["d 1/(k - k) / d c"]),
    "response of ln(-p[A])": (RING, ["d ln(-p[A]) / d c"]),
    "nested response of ln(-c)": (RING, ["d (d ln(-c) / d c) / d c"]),
    "0 to a negative power": (RING, ["(p[A]-p[A])**(-1)"]),
    "ln(p[A] - p[A])": (RING, ["ln(p[A]-p[A])"]),
    "ln(0)": (RING, ["ln(0)"]),
    "ln(-p[A])": (RING, ["ln(-p[A])"]),
    "sqrt(-p[A])": (RING, ["sqrt(-p[A])"]),
    "response of sqrt(-p[A])": (RING, ["d sqrt(-p[A]) / d c"]),
    "zero only at the point": (RING, ["1/(c - 3)", *VALUES]),
    "zero only at a partial point": (RING, ["1/(c - 3)", "--at", "c=3"]),
    "zero of a probability at the point": (RING, ["1/(p[A] + p[B] + p[C] - c/3)", *VALUES]),
    "ln of zero at the point": (RING, ["ln(c - 3)", *VALUES]),
    "ln below zero at the point": (RING, ["ln(c - 4)", *VALUES]),
    "root below zero at the point": (RING, ["sqrt(c - 4)", *VALUES]),
    "root below zero at a partial point": (RING, ["sqrt(c - 4)", "--at", "c=3"]),
    "--at without a value": (RING, ["p[A]", "--at", "c"]),
    "--at with nothing after =": (RING, ["p[A]", "--at", "c="]),
    "--at empty": (RING, ["p[A]", "--at", ""]),
    "--at without a name": (RING, ["p[A]", "--at", "=2"]),
    "--at without an argument": (RING, ["p[A]", "--at"]),
    "--at unknown symbol": (RING, ["p[A]", "--at", "z=1"]),
    "--at a state": (RING, ["p[A]", "--at", "A=1"]),
    "--at twice": (RING, ["p[A]", "--at", "c=1", "--at", "c=1"]),
    "--at two in one": (RING, ["p[A]", "--at", "c=1, k=2"]),
    "--at zero for positive": (RING, ["p[A]", "--at", "c=0"]),
    "--at negative for positive": (RING, ["p[A]", "--at", "c=-1/2"]),
    "--at negative logarithm for positive": (RING, ["p[A]", "--at", "c=ln(1/2)"]),
    "--at zero in disguise": (RING, ["p[A]", "--at", "c=sqrt(2)*sqrt(3) - sqrt(6)"]),
    "--at symbol": (RING, ["p[A]", "--at", "c=k"]),
    "--at itself": (RING, ["p[A]", "--at", "c=c"]),
    "--at infinity": (RING, ["p[A]", "--at", "c=inf"]),
    "--at nan": (RING, ["p[A]", "--at", "x=nan"]),
    "--at 1/0": (RING, ["p[A]", "--at", "x=1/0"]),
    "--at ln(0)": (RING, ["p[A]", "--at", "x=ln(0)"]),
    "--at ln(-1)": (RING, ["p[A]", "--at", "x=ln(-1)"]),
    "--at sqrt(-1)": (RING, ["p[A]", "--at", "x=sqrt(-1)"]),
    "--at power tower": (RING, ["p[A]", "--at", "c=9**9**9"]),
    "--at code": (RING, ["p[A]", "--at", "c=__import__('os').system('touch left_behind')"]),
    "--at attribute": (RING, ["p[A]", "--at", "c=(1).real"]),
    "--at probability": (RING, ["p[A]", "--at", "c=p[A]"]),
    "--at 5,000 digits": (RING, ["p[A]", "--at", "c=" + "7" * 5000]),
    "--set unknown symbol": (RING, ["p[A]", "--set", "z=1"]),
    "--set to an unknown symbol": (RING, ["p[A]", "--set", "c=z"]),
    "--set without =": (RING, ["p[A]", "--set", "c"]),
    "--set twice": (RING, ["p[A]", "--set", "c=k", "--set", "c=u"]),
    "--set zero for positive": (RING, ["p[A]", "--set", "c=0"]),
    "--set negative for positive": (RING, ["p[A]", "--set", "c=-k"]),
    "--set code": (RING, ["p[A]", "--set", "c=open('left_behind','w')"]),
    "--set code with lambda": (RING, ["p[A]", "--set", "c=(lambda: 1)()"]),
    "--set and a response to it": (RING, ["d p[A] / d c", "--set", "c=k"]),
    "--set and a response to its logarithm": (RING, ["d p[A] / d ln c", "--set", "c=k"]),
    "--set and a nested response to it": (RING, ["d (d p[A] / d c) / d k", "--set", "c=k"]),
    "--set, then --at of the symbol replaced": (RING, ["p[A]", "--set", "c=k", "--at", "c=2"]),
    "rate below zero at the point": (rate("k - c"), ["p[A]", *VALUES]),
    "rate below zero at a partial point": (rate("k - c"), ["p[A]", "--at", "k=1", "--at", "c=2"]),
    "rate zero at the point": (rate("k - c"), ["p[A]", "--at", "k=2", "--at", "c=2"]),
    "rate below zero after --set": (rate("k - c"), ["p[A]", "--set", "k=c/2"]),
    "unknown option": (RING, ["p[A]", "--jason"]),
    "quantity that begins with a minus sign": (RING, ["-ln(c)"]),
    "--trees none": (RING, ["p[A]", "--trees", "0"]),
    "--trees a word": (RING, ["p[A]", "--trees", "many"]),
    "--terms negative": (RING, ["p[A]", "--terms", "-1"]),
}

# what ``appendix`` refuses before it writes anything
APPENDIX: dict[str, list[str]] = {
    "no output": [],
    "output without a name": ["-o"],
    "output empty": ["-o", ""],
    "output a folder": ["-o", "."],
    "output in a missing folder": ["-o", "missing/out.tex"],
    "output in a file": ["-o", "net.toml/out.tex"],
    "output twice as long as names may be": ["-o", "x" * 600 + ".tex"],
    "a quantity": ["p[A]", "-o", "out.tex"],
}

# exit status 3: an answer exists, or may, but is beyond a limit or not settled
BEYOND: dict[str, tuple[str, list[str]]] = {
    "--trees": (RING, ["p[A]", "--trees", "2"]),
    "--terms": (RING, ["p[A]", "--terms", "2"]),
    "not told from zero": (RING, ["sqrt(5 + 2*sqrt(6)) - sqrt(2) - sqrt(3)"]),
    "divides by what is not told from zero": (
        RING, ["p[A]/(sqrt(5 + 2*sqrt(6)) - sqrt(2) - sqrt(3))"]),
}


def check_line(text: str) -> None:
    assert text.startswith("error: ")
    assert text.endswith("\n")
    assert text.count("\n") == 1
    assert "Traceback" not in text
    assert "object at 0x" not in text
    assert len(text) < 800


def inside(
    capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, folder: Path,
    text: str | bytes, verb: str, *arguments: str,
) -> int:
    """Run in this process; return the exit status after checking what was written."""
    monkeypatch.chdir(folder)
    (folder / "net.toml").write_bytes(text.encode() if isinstance(text, str) else text)
    status = run([verb, "net.toml", *arguments])
    out, err = capfd.readouterr()
    assert out == ""
    check_line(err)
    assert [path.name for path in folder.iterdir()] == ["net.toml"]
    return status


@pytest.mark.parametrize("verb", ["survey", "derive"])
@pytest.mark.parametrize("name", FILES)
def test_faulty_file(
    name: str, verb: str, tmp_path: Path, capfd: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    more = ["p[A]"] if verb == "derive" else []
    assert inside(capfd, monkeypatch, tmp_path, FILES[name], verb, *more) == 2


@pytest.mark.parametrize("json", [False, True])
@pytest.mark.parametrize("name", DERIVE)
def test_faulty_arguments(
    name: str, json: bool, tmp_path: Path, capfd: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    text, arguments = DERIVE[name]
    more = ["--json"] if json else []
    assert inside(capfd, monkeypatch, tmp_path, text, "derive", *more, *arguments) == 2


@pytest.mark.parametrize("name", APPENDIX)
def test_faulty_appendix(
    name: str, tmp_path: Path, capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    assert inside(capfd, monkeypatch, tmp_path, RING, "appendix", "--quiet", *APPENDIX[name]) == 2


def test_appendix_of_an_unreadable_network_leaves_the_old_document(
    tmp_path: Path, capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "net.toml").write_text(rate("k*z"))
    (tmp_path / "old.tex").write_text("old")
    assert run(["appendix", "net.toml", "-o", "old.tex"]) == 2
    assert run(["appendix", "none.toml", "-o", "old.tex"]) == 2
    assert (tmp_path / "old.tex").read_text() == "old"
    assert sorted(path.name for path in tmp_path.iterdir()) == ["net.toml", "old.tex"]
    assert capfd.readouterr().out == ""


@pytest.mark.parametrize("name", BEYOND)
def test_beyond(
    name: str, tmp_path: Path, capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    text, arguments = BEYOND[name]
    assert inside(capfd, monkeypatch, tmp_path, text, "derive", *arguments) == 3


@pytest.mark.parametrize("arguments", [
    ["survey"], ["derive"], ["survey", "none.toml"], ["survey", "."], ["survey", "/dev/null"],
    ["derive", "none.toml", "p[A]"], ["derive", ".", "p[A]"], ["derive", "/dev/null", "p[A]"],
    ["survey", ""], ["survey", "no\nfile"], ["surwey", "net.toml"],
    ["--jason"], ["survey", "net.toml", "p[A]"], ["survey", "none.toml", "--trees", "3"],
    ["survey", "x" * 5000], ["survey", "none.toml/net.toml"], ["survey", "\udc80.toml"],
], ids=repr)
def test_faulty_command(
    arguments: list[str], tmp_path: Path, capfd: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.chdir(tmp_path)
    assert run(arguments) == 2
    out, err = capfd.readouterr()
    assert out == ""
    check_line(err)
    assert not list(tmp_path.iterdir())


# -- processes of their own -----------------------------------------------------------------------


def limits() -> None:
    resource.setrlimit(resource.RLIMIT_AS, (BYTES, BYTES))
    resource.setrlimit(resource.RLIMIT_CPU, (SECONDS, SECONDS))


def outside(folder: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    """Run as a process, within 20 seconds and 2 GB."""
    return subprocess.run(
        [sys.executable, "-m", "symbolic_response", *arguments], cwd=folder, preexec_fn=limits,
        capture_output=True, text=True, timeout=3 * SECONDS, check=False,
    )


DEEP, LONG = "(" * 100_000, "1 + " * 250_000 + "1"
DANGEROUS: dict[str, tuple[str, list[str], int]] = {
    "parentheses in a rate": (rate(DEEP + "k*c" + ")" * 100_000), ["survey"], 2),
    "parentheses never closed in a rate": (rate(DEEP), ["survey"], 2),
    "minus signs in a rate": (rate("-" * 100_000 + "k*c"), ["survey"], 2),
    "powers in a rate": (rate("k*c" + "**2" * 100_000), ["survey"], 2),
    "functions in a rate": (rate("exp(" * 100_000 + "1" + ")" * 100_000), ["survey"], 2),
    "a megabyte in a rate": (rate("k*c + " + LONG), ["survey"], 2),
    "nested arrays": ("x = " + "[" * 100_000, ["survey"], 2),
    "nested tables": ("x = " + "{a = " * 100_000, ["survey"], 2),
    "dotted keys": ("a" + ".a" * 100_000 + " = 1", ["survey"], 2),
    "half a megabyte of fractions": (
        rate("k*c*(1 + " + " + ".join(f"{n}/{n + 1}" for n in range(1, 30_000)) + ")"),
        ["survey"], 3),
    "parentheses in a quantity": (RING, ["derive", "(" * 60_000 + "p[A]" + ")" * 60_000], 2),
    "minus signs in a quantity": (RING, ["derive", "1" + "-" * 100_000 + "p[A]"], 2),
    "responses in a quantity": (RING, ["derive", "(d " * 30_000 + "p[A]"], 2),
    "slashes in a quantity": (RING, ["derive", "d p[A]" + " / d c" * 15_000], 2),
    "parentheses in --at": (RING, ["derive", "p[A]", "--at", "c=" + DEEP], 2),
    "minus signs in --set": (RING, ["derive", "p[A]", "--set", "c=" + "-" * 100_000 + "k"], 2),
    "complete graph of 25 states, derived": (complete_graph(25), ["derive", "p[S0]"], 3),
    "its response": (complete_graph(25), ["derive", "d p[S0] / d ln k"], 3),
    "its entropy production": (complete_graph(25), ["derive", "entropy_production"], 3),
}


@pytest.mark.parametrize("name", DANGEROUS)
def test_dangerous(name: str, tmp_path: Path) -> None:
    text, (verb, *arguments), status = DANGEROUS[name]
    (tmp_path / "net.toml").write_text(text, encoding="utf-8")
    done = outside(tmp_path, verb, "net.toml", "--quiet", *arguments)
    assert done.stdout == ""
    check_line(done.stderr)
    assert done.returncode == status
    assert [path.name for path in tmp_path.iterdir()] == ["net.toml"]


@pytest.mark.parametrize("verb", [["survey"], ["derive", "p[A]"]], ids=["survey", "derive"])
def test_long_exponents_in_a_file(verb: list[str], tmp_path: Path) -> None:
    (tmp_path / "net.toml").write_text(rate("k*c*(exp(1e18) + 1)"), encoding="utf-8")
    name, *arguments = verb
    done = outside(tmp_path, name, "net.toml", "--quiet", *arguments)
    assert done.returncode in (0, 2, 3)


def test_survey_of_a_complete_graph_says_what_it_left_out(tmp_path: Path) -> None:
    (tmp_path / "net.toml").write_text(complete_graph(25), encoding="utf-8")
    done = outside(tmp_path, "survey", "net.toml", "--quiet")
    assert done.returncode == 3
    check_line(done.stderr)
    assert f"{25**23} without direction" in done.stdout
    assert "cycles: beyond the limit" in done.stdout


def test_values_of_a_complete_graph(tmp_path: Path) -> None:
    (tmp_path / "net.toml").write_text(complete_graph(25), encoding="utf-8")
    done = outside(tmp_path, "derive", "net.toml", "p[S0]", "d p[S0] / d ln k", "--at", "k=1")
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.splitlines()[0] == "p[S0] = 1/25"
