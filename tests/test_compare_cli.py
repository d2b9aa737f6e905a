"""The verb compare: verdicts, exit statuses, errors with a caret, JSON, the LaTeX table, Python.

Formulas of the driven ring of three states are those of the diagram method: Hill, J. Theor. Biol.
10, 442 (1966) (from memory); values at a point by hand.
"""

from __future__ import annotations

import json
import subprocess
from pathlib import Path

import pytest
import sympy

import symbolic_response as sr
from symbolic_response.cli import run
from symbolic_response.errors import ExpressionError, FormulaError, QuantityError

RING = """\
title = "ring"
[symbols.a]
[symbols.b]
[symbols.k_on]
[symbols.x]
sign = "real"
[states.A]
[states.B]
[states.C]
[[transitions]]
name = "up"
between = ["A", "B"]
rates = ["a*k_on", "b"]
[[transitions]]
name = "on"
between = ["B", "C"]
rates = ["2", "1"]
[[transitions]]
name = "down"
between = ["C", "A"]
rates = ["exp(x)", "1"]
"""
# trees to A: BA CB, CA BC, BA CA; to B: AB CB, AC CB, AB CA; to C: AC BC, AB BC, AC BA
TO_A, TO_B, TO_C = "b*1 + exp(x)*2 + b*exp(x)", "a*k_on*1 + 1*1 + a*k_on*exp(x)", "2 + a*k_on*2 + b"
TOTAL = f"({TO_A} + {TO_B} + {TO_C})"
RIGHT = f"({TO_A})/{TOTAL}"
LATEX_B = (r"\frac{a k_{on} (1 + e^x) + 1}{b + 2 e^x + b e^x + a k_{on} (3 + e^x) + 1 + 2 + b}")


def network(tmp_path: Path, entries: str = "") -> str:
    path = tmp_path / "ring.toml"
    path.write_text(RING + entries, encoding="utf-8")
    return str(path)


def entry(quantity: str, formula: str, key: str = "plain", more: str = "") -> str:
    return f"[[hand]]\nquantity = \"{quantity}\"\n{key} = '{formula}'\n{more}\n"


def compared(
    capsys: pytest.CaptureFixture[str], *arguments: str
) -> tuple[int, dict[str, object]]:
    status = run(["compare", *arguments, "--json", "--quiet"])
    return status, json.loads(capsys.readouterr().out)


def test_right_results_are_equal(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = network(tmp_path, entry("p[A]", RIGHT) + entry("p[B]", LATEX_B, "latex"))
    status, data = compared(capsys, path)
    assert status == 0
    assert [r["verdict"] for r in data["results"]] == ["equal", "equal"]
    assert data["results"][0]["where"].endswith("ring.toml:24")


def test_a_missing_tree_has_a_witness_and_a_name(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    wrong = f"({TO_A} - exp(x)*2)/{TOTAL}"
    status, data = compared(capsys, network(tmp_path), "--hand", f"p[A] = {wrong}")
    (result,) = data["results"]
    assert status == 1
    assert result["verdict"] == "different"
    names = {"a", "b", "k_on", "x"}
    assert set(result["witness"]) == names
    values = {name: sympy.sympify(value.replace("ln", "log"))
              for name, value in result["witness"].items()}
    by_name = {sympy.Symbol(n): v for n, v in values.items()}
    for key, formula in (("hand_value", wrong), ("derived_value", RIGHT)):
        exact = sympy.sympify(formula).subs(by_name)
        assert sympy.simplify(exact - sympy.sympify(result[key].replace("ln", "log"))) == 0
    assert result["hand_value"] != result["derived_value"]
    assert any("on" in text and "down" in text for text in result["diagnosis"])


def test_a_stated_relation_makes_it_conditional(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    formula = RIGHT.replace("k_on", "b/a")
    path = network(tmp_path)
    status, data = compared(capsys, path, "--hand", f"p[A] = {formula}", "--given", "a*k_on = b")
    assert status == 1
    assert data["results"][0]["verdict"] == "conditional"
    assert "a*k_on = b" in data["results"][0]["condition"]


def test_text_says_the_same(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = network(tmp_path, entry("current[up]", "0", more='label = "at rest"'))
    assert run(["compare", path, "--quiet"]) == 1
    out = capsys.readouterr().out
    assert "current[up]" in out and "at rest" in out
    assert "by hand 0, derived" in out
    assert out.strip().endswith("1 formula: 1 different")


@pytest.mark.parametrize(("entries", "message"), [
    ("[[hand]]\nquantity = 'p[A]'\n", "hand entry 1 has no formula; write the formula once"),
    ("[[hand]]\nplain = '1'\n", "hand entry 1 has no quantity"),
    (entry("p[A]", "1", more="latex = '1'"), "has latex and plain; write the formula once"),
    (entry("p[Q]", "1"), "there is no state 'Q'"),
    (entry("p[A]", "kon"), "unknown symbol 'kon'; did you mean 'k_on'?"),
    (entry("p[A]", "1", more="given = 'a'"), "given is not an array of texts"),
    (entry("p[A]", "1", more="labl = 'a'"), "did you mean 'label'?"),
    (entry("p[A]", r"k_{onn}", "latex"), "line 1, column 1"),
    ("", "the network file has no [[hand]] entries"),
])
def test_unusable_entries(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], entries: str, message: str
) -> None:
    assert run(["compare", network(tmp_path, entries), "--quiet"]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    first, *rest = captured.err.splitlines()
    assert first.startswith("error: ") and message in first
    assert len(rest) in (0, 2)


def test_an_unreadable_formula_is_shown_with_a_caret(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = network(tmp_path, entry("p[A]", r"\frac{a}{a + kk}", "latex"))
    assert run(["compare", path]) == 2
    lines = capsys.readouterr().err.splitlines()
    assert "ring.toml:24: hand entry 1: latex: line 1, column 14" in lines[0]
    assert lines[1] == r"\frac{a}{a + kk}"
    assert lines[2] == " " * 13 + "^"


PAPER = r"""\documentclass{article}
\begin{document}
With $W = 3$ nothing happens. Let
\begin{equation} Z = b + 2 e^x + b e^x + a k_{on} (3 + e^x) + 3 + b \end{equation}
\begin{align}
\pi_B &= \frac{a k_{on}(1 + e^x) + 1}{Z} \label{eq:B}\\
\pi_A &= \frac{b + 2 e^x}{Z} ,
\end{align}
\[ a \le b \]
\end{document}
"""


def test_a_paper(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    paper = tmp_path / "paper.tex"
    paper.write_text(PAPER, encoding="utf-8")
    status, data = compared(capsys, network(tmp_path), "--tex", str(paper))
    assert status == 1
    assert [(r["verdict"], r["label"]) for r in data["results"]] == [
        ("equal", "eq:B"), ("different", None)]
    assert [r["where"].rpartition(":")[2] for r in data["results"]] == ["6", "7"]
    assert [passed["line"] for passed in data["passed_over"]] == [9]


def test_what_could_not_be_read_is_no_success(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    paper = tmp_path / "paper.tex"
    paper.write_text(PAPER.replace("b + 2 e^x}{Z}", "b + 2 e^{x} + g}{Z}"), encoding="utf-8")
    assert run(["compare", network(tmp_path), "--tex", str(paper), "--quiet"]) == 2
    captured = capsys.readouterr()
    assert "1 equal" in captured.out
    assert "could not be used" in captured.err and "line 7" in captured.err


@pytest.mark.parametrize(("text", "message"), [
    ("nothing here", "no displayed equation"),
    (r"\[ x = 1 \]", "no displayed equation"),
])
def test_a_paper_without_results(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], text: str, message: str
) -> None:
    paper = tmp_path / "paper.tex"
    paper.write_text(text, encoding="utf-8")
    assert run(["compare", network(tmp_path), "--tex", str(paper)]) == 2
    assert message in capsys.readouterr().err


def test_files_that_cannot_be_used(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = network(tmp_path)
    binary = tmp_path / "binary.tex"
    binary.write_bytes(b"\\[ \xff\xfe \\]")
    for arguments in (["--tex", str(tmp_path / "none.tex")], ["--tex", str(binary)],
                      ["--hand", "p[A] = 1", "--table", path], ["--hand", "p[A]"]):
        assert run(["compare", path, *arguments]) == 2
        error = capsys.readouterr().err
        assert error.startswith("error: ") and error.count("\n") == 1


@pytest.mark.usefixtures("requires_latex")
def test_the_table_compiles(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = network(tmp_path, entry("p[A]", RIGHT, more='label = "eq. (1), 100%"')
                   + entry("p[B]", "1/2") + entry("p[C]", "b/a") + entry("p[B]", LATEX_B, "latex"))
    table = tmp_path / "checked.tex"
    assert run(["compare", path, "--table", str(table), "--quiet"]) == 1
    capsys.readouterr()
    document = tmp_path / "document.tex"
    packages = r"\usepackage{amsmath,amssymb,array,booktabs,longtable}"
    assert packages in table.read_text(encoding="utf-8")
    document.write_text("\\documentclass{article}\n" + packages
                        + "\n\\begin{document}\n\\input{checked}\n\\end{document}\n",
                        encoding="utf-8")
    for _ in range(2):
        made = subprocess.run(["pdflatex", "-interaction=nonstopmode", document.name],
                              cwd=tmp_path, capture_output=True, text=True)
    assert made.returncode == 0
    log = (tmp_path / "document.log").read_text(encoding="latin-1")
    assert "Overfull" not in log and "Missing" not in log
    text = subprocess.run(["pdftotext", "-layout", "document.pdf", "-"], cwd=tmp_path,
                          capture_output=True, text=True, check=True).stdout
    assert text.count("equal, exactly") == 2 and text.count("different") == 2


def test_from_python() -> None:
    ring = sr.read_network_text(RING)
    a, b, k_on, x = sympy.symbols("a b k_on x")
    total = sympy.sympify(TOTAL)
    assert sr.compare(ring, "p[A]", sympy.sympify(TO_A) / total).verdict.kind == "equal"
    found = sr.compare(ring, "p[A]", b / (a + b + k_on + sympy.tanh(x)))
    assert found.verdict.kind == "different"
    assert "different" in str(found)
    assert sr.compare_entries(ring) == ()
    with pytest.raises(ExpressionError, match="no symbol 'kon'; did you mean 'k_on'"):
        sr.compare(ring, "p[A]", sympy.Symbol("kon"))
    with pytest.raises(FormulaError):
        sr.compare(ring, "p[A]", r"\frac{a}{q}")
    with pytest.raises(QuantityError):
        sr.compare(ring, "p[A]", "1", given=["nonsense"])


def test_the_left_side_may_be_latex(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    status, data = compared(capsys, network(tmp_path), "--hand", rf"\pi_{{B}} = {LATEX_B}")
    assert (status, data["results"][0]["quantity"]) == (0, "p[B]")


def test_a_formula_without_a_value_leaves_the_others(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = network(tmp_path, entry("p[A]", RIGHT) + entry("p[B]", "1/(a - a + b - b)"))
    assert run(["compare", path, "--quiet"]) == 2
    captured = capsys.readouterr()
    assert "1 equal" in captured.out and "passed over" in captured.out
    assert "ring.toml:28" in captured.err and "identically zero" in captured.err


def test_the_table_does_not_replace_the_paper(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    paper = tmp_path / "paper.tex"
    paper.write_text(PAPER, encoding="utf-8")
    assert run(["compare", network(tmp_path), "--tex", str(paper), "--table", str(paper)]) == 2
    assert paper.read_text(encoding="utf-8") == PAPER
    assert capsys.readouterr().err.count("\n") == 1


def test_what_python_may_give_by_mistake() -> None:
    ring = sr.read_network_text(RING)
    assert sr.compare(ring, "p[A]", 1).verdict.kind == "different"
    assert sr.compare(ring, "p[A]", "1/2", given="a*k_on = b").verdict.kind == "different"
    for arguments, given in (
        ((ring, 3, "1"), ()), (("ring.toml", "p[A]", "1"), ()),
        ((ring, "p[A]", "1"), [sympy.Eq(1, 1)]), ((ring, "p[A]", "1"), 3),
    ):
        with pytest.raises(QuantityError):
            sr.compare(*arguments, given=given)
