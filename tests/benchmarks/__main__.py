"""Print the table of speed ratios, and the size and memory figures beside it."""

from __future__ import annotations

import resource
import subprocess
import sys
import time
from collections.abc import Callable
from fractions import Fraction

import networkx as nx
import sympy
from sympy.polys.matrices import DomainMatrix

from symbolic_response.algebra.minors import tree_sums_by_minors
from symbolic_response.expressions.tree import number
from symbolic_response.network import Network, generator_matrix
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, graph_of
from symbolic_response.response.closed_form import ClosedForm, closed_form
from symbolic_response.response.values import Point
from symbolic_response.topology import spanning_trees
from tests.benchmarks import appendices, certificates, curves, hands, proofs
from tests.benchmarks.networks import complete, cube, ladder
from tests.benchmarks.timing import CUT_OFF, Row, compare

NAIVE_CHARACTERS = 281_168  # responses on K4 by a general system, as measured for the design


def trees(network: Network) -> Callable[[], object]:
    """Return the enumeration of all spanning trees, directed towards every root."""
    return lambda: spanning_trees(graph_of(network))


def networkx_trees(network: Network) -> Callable[[], object]:
    """Return the general graph library's enumeration."""
    graph = nx.Graph(graph_of(network).ends)
    return lambda: sum(1 for _ in nx.SpanningTreeIterator(graph))


def tree_sums(network: Network) -> Callable[[], object]:
    """Return all N_k as polynomials, from a fresh analysis."""
    return lambda: Analysis(network).normalisation


def minors(network: Network) -> Callable[[], object]:
    """Return all N_k by Bareiss elimination on FLINT polynomials."""
    return lambda: tree_sums_by_minors(Analysis(network).rates)


def nullspace(network: Network) -> Callable[[], object]:
    """Return the null space of the generator over SymPy's polynomial domain."""
    matrix = DomainMatrix.from_Matrix(generator_matrix(network))
    return lambda: matrix.to_field().nullspace()


def barrier_responses(network: Network, transition: str) -> list[ClosedForm]:
    """Return the responses of all probabilities to one barrier, from a fresh analysis."""
    analysis = Analysis(network)
    return [
        closed_form(read_quantity(f"d p[{s.name}] / d barrier[{transition}]", network), analysis)
        for s in network.states
    ]


def sympy_responses(network: Network) -> None:
    """Solve, differentiate and cancel the same responses in SymPy."""
    matrix = generator_matrix(network)
    size = matrix.rows
    unknown = sympy.symbols(f"p0:{size}")
    equations = [*(matrix * sympy.Matrix(unknown))[:-1], sum(unknown) - 1]
    (solution,) = sympy.solve(equations, unknown, dict=True)
    forward, backward = matrix[1, 0], matrix[0, 1]
    for name in unknown:
        p = solution[name]
        sympy.cancel(-forward * p.diff(forward) - backward * p.diff(backward))


def cube_points(network: Network, text: str) -> Callable[[], object]:
    """Return 100 exact values of a response."""
    quantity = read_quantity(text, network)
    names = [entry.name for entry in network.symbols]

    def work() -> None:
        for trial in range(100):
            values = {n: number(Fraction(place + trial + 1, place + 2))
                      for place, n in enumerate(names)}
            Point(network, values).value(quantity)

    return work


def sympy_points(network: Network, text: str) -> Callable[[], object]:
    """Return the same values by substitution into the same closed form."""
    form = closed_form(read_quantity(text, network), Analysis(network))
    expression = form.to_sympy()
    names = [sympy.Symbol(entry.name, positive=True) for entry in network.symbols]

    def work() -> None:
        for trial in range(100):
            expression.subs({n: sympy.Rational(place + trial + 1, place + 2)
                             for place, n in enumerate(names)})

    return work


def rows() -> list[Row]:
    """Measure everything."""
    k4, k5, k6, box, long = complete(4), complete(5), complete(6), cube(), ladder(6)
    response = "d p[s1] / d barrier[e1_2]"
    return [
        compare("spanning trees of K6", trees(k6), "NetworkX iterator", networkx_trees(k6), 100),
        compare("spanning trees of the cube", trees(box), "NetworkX iterator",
                networkx_trees(box), 100),
        compare("all N_k of the 2x6 ladder", tree_sums(long), "Bareiss minors on FLINT",
                minors(long), 20),
        compare("all N_k of the 2x6 ladder", tree_sums(long), "SymPy DomainMatrix.nullspace",
                nullspace(long), 100),
        compare("all N_k of K5", tree_sums(k5), "Bareiss minors on FLINT", minors(k5), 20),
        compare("all N_k of K5", tree_sums(k5), "SymPy DomainMatrix.nullspace",
                nullspace(k5), 100),
        compare("K4: responses of all p to a barrier", lambda: barrier_responses(k4, "e1_2"),
                "SymPy solve, diff, cancel", lambda: sympy_responses(k4), 200),
        compare("100 exact values on the cube", cube_points(box, response), "SymPy subs",
                sympy_points(box, response), 100),
        certificates.row(),
        *proofs.rows(),
        curves.row(),
        hands.row(),
        *appendices.rows(),
    ]


def survey_figures() -> str:
    """Return time beyond imports and peak memory of a survey of the cube."""
    code = (
        "import resource, time\n"
        "from symbolic_response.response.survey import survey, survey_text\n"
        "from symbolic_response.response.analysis import Analysis\n"
        "from tests.benchmarks.networks import cube\n"
        "network = cube()\n"
        "start = time.perf_counter()\n"
        "survey_text(survey(Analysis(network)))\n"
        "seconds = time.perf_counter() - start\n"
        "peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024\n"
        "print(f'survey of the cube: {seconds:.2f} s beyond imports, {peak:.0f} MB at the most')\n"
    )
    return subprocess.run([sys.executable, "-c", code], capture_output=True, text=True,
                          check=True).stdout.strip()


def main() -> None:
    """Print the table."""
    start = time.perf_counter()
    print("| work | against | ours, s | theirs, s | ratio | wanted |")
    print("| --- | --- | --- | --- | --- | --- |")
    for row in rows():
        more = "> " if row.cut else ""
        print(f"| {row.work} | {row.rival} | {row.seconds:.4f} | {more}{row.rival_seconds:.3f} |"
              f" {more}{row.ratio():.0f} | {row.wanted:.0f} |")
    characters = sum(len(form.latex()) for form in barrier_responses(complete(4), "e1_2"))
    print(f"\nLaTeX of the K4 responses: {characters} characters,"
          f" {100 * characters / NAIVE_CHARACTERS:.1f}% of {NAIVE_CHARACTERS} (wanted under 5%)")
    print(survey_figures())
    print(certificates.thousand_points())
    print(certificates.tightness())
    print(proofs.edges(cube(), 12))
    print(proofs.edges(complete(9), 3))
    print(curves.steepness_figures())
    print(appendices.lengths(NAIVE_CHARACTERS))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"rivals cut off at {CUT_OFF:.0f} s; whole table {time.perf_counter() - start:.0f} s,"
          f" {peak:.0f} MB")


if __name__ == "__main__":
    main()
