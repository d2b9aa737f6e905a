"""Forming the LaTeX of an appendix against SymPy: K4 with all barrier responses, and the cube."""

from __future__ import annotations

import re
import time
from dataclasses import replace

import sympy

from symbolic_response.appendix import appendix_text
from symbolic_response.network import Network, generator_matrix
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import complete, cube
from tests.benchmarks.timing import Row, compare

PLAIN = {"bounds": False, "proofs": False, "diagrams": False}


def all_barriers(network: Network) -> list[str]:
    """Return the response of every probability to every barrier."""
    return [f"d p[{s.name}] / d barrier[{t.name}]"
            for t in network.transitions for s in network.states]


def k4_text() -> str:
    """Return the appendix of K4: model, trees, all barrier responses; transitions are 12, 13 ..."""
    network = complete(4)
    labels = {t.name: t.name.removeprefix("e").replace("_", "") for t in network.transitions}
    network = replace(network, appendix=PLAIN, notation={"transitions": labels})
    return appendix_text(network, quantities=all_barriers(network))


def formulas(text: str) -> int:
    """Return the characters of the displayed tree sums, definitions and responses."""
    results = text[text.index(r"\section{Spanning trees"):]
    return sum(map(len, re.findall(r"\\begin\{align\}\n(.*?)\\end\{align\}", results, re.DOTALL)))


def sympy_factored() -> None:
    """Solve, differentiate, factor and print the same responses in SymPy."""
    matrix = generator_matrix(complete(4))
    unknown = sympy.symbols("p0:4")
    equations = [*(matrix * sympy.Matrix(unknown))[:-1], sum(unknown) - 1]
    (solution,) = sympy.solve(equations, unknown, dict=True)
    for j in range(4):
        for i in range(j):
            for name in unknown:
                p = solution[name]
                response = -sum(w * p.diff(w) for w in (matrix[i, j], matrix[j, i]))
                sympy.latex(sympy.factor(response))


def sympy_tree_sum() -> None:
    """Multiply out one tree sum of the cube as a determinant in SymPy."""
    matrix = generator_matrix(cube())
    sympy.expand((-matrix)[1:, 1:].det(method="berkowitz"))


def rows() -> list[Row]:
    """Time both appendices."""
    whole = cube()
    return [
        compare("K4: appendix with all 24 barrier responses", k4_text,
                "SymPy solve, diff, factor, latex", sympy_factored, 20),
        compare("cube: appendix, proofs and diagrams included", lambda: appendix_text(whole),
                "SymPy expansion of one tree sum", sympy_tree_sum, 1),
    ]


def lengths(naive: int) -> str:
    """Return how long the formulas of K4 are, and how long the cube takes once."""
    characters = formulas(k4_text())
    network = cube()
    start = time.perf_counter()
    appendix_text(network, analysis=Analysis(network))
    seconds = time.perf_counter() - start
    return (f"appendix of K4, all barrier responses: {characters} characters of formulas,"
            f" {100 * characters / naive:.1f}% of {naive} (wanted 2%); appendix of the cube"
            f" formed in {seconds:.1f} s (wanted under 5)")
