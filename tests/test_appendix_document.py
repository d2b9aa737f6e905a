"""The document as a whole: it compiles, nothing sticks out, and what it says is right."""

from __future__ import annotations

import os
import random
import re
import shutil
import subprocess
import sys
from collections.abc import Iterable
from fractions import Fraction
from pathlib import Path

import flint
import pytest
import sympy

sys.path.insert(0, str(Path(__file__).parent))

from appendix_networks import ALL, K4, PAIR, RING

from symbolic_response.algebra.minors import tree_sums_by_minors
from symbolic_response.appendix import Layout, appendix_text, write_appendix
from symbolic_response.appendix.named_sums import NamedSums
from symbolic_response.appendix.page import Page
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.requests import requested
from symbolic_response.appendix.results import closed_result
from symbolic_response.errors import NetworkError, OutputError, QuantityError
from symbolic_response.expressions.enclosure import ball
from symbolic_response.expressions.ring import all_symbols, plain
from symbolic_response.expressions.tree import Expression, substitute, symbols_of
from symbolic_response.network.toml_reader import read_network_text
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form, symbol_names
from symbolic_response.response.notation import notation_of

QUANTITIES = [
    "p[A]", "p[A, B]", "traffic[bind]", "entropy_production", "mean[occ]", "d p[A] / d drive[flip]",
    "d mean[occ] / d energy[B]", "d mean[occ] / d barrier[bind]", "d current[bind] / d ln c",
    "d (d p[A] / d barrier[flip]) / d energy[A]", "d ln(p[A]/p[B]) / d c", "ln(p[A]/p[B])",
    "current[bind]/p[A]", "(d p[A] / d ln c)**2 * c", "forward[bind]*p[A]", "d p[A, B] / d ln g",
    "c**(1/2)*p[A]", "d traffic[bind] / d barrier[bind]",
]

ODD_QUANTITIES = [
    "d mean[n_1] / d a", "exp(p[A])", "d (d mean[n_1] / d barrier[par_2]) / d ln W",
    "d ln mean[n_1] / d energy[CC]", "d p[A] / d a",
    "(p[A] + p[B] + p[CC])*current[par_2]*traffic[par_2]*forward[A_B]*p[A]*p[B]*p[CC]"
    "*mean[n_1]*current[A_B]*traffic[CC_A]",
]


def compiled(text: str, folder: Path) -> str:
    """Compile twice; return the log of the second run."""
    (folder / "document.tex").write_text(text, encoding="ascii")
    for _ in range(2):
        run = subprocess.run(
            ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "document.tex"],
            cwd=folder, capture_output=True, timeout=300, check=False,
        )
        assert run.returncode == 0, run.stdout.decode("latin-1")[-2000:]
    return (folder / "document.log").read_text(encoding="latin-1")


def check_log(log: str) -> None:
    """Fail on anything that sticks out or refers to nothing."""
    assert "Overfull" not in log, re.findall(r"Overfull.*", log)
    assert "undefined" not in log
    assert "multiply" not in log


@pytest.mark.parametrize("name", ALL)
def test_every_document_compiles_without_overfull_boxes(
    name: str, tmp_path: Path, requires_latex: None
) -> None:
    check_log(compiled(appendix_text(read_network_text(ALL[name])), tmp_path))


@pytest.mark.parametrize("width", [246.0, 510.0])
@pytest.mark.parametrize("name", ["ring", "energy", "k4"])
def test_other_widths(name: str, width: float, tmp_path: Path, requires_latex: None) -> None:
    text = appendix_text(read_network_text(ALL[name]), layout=Layout(width=width))
    check_log(compiled(text, tmp_path))


def test_every_kind_of_quantity_compiles(tmp_path: Path, requires_latex: None) -> None:
    for source, quantities in ((RING, QUANTITIES), (ALL["odd"], ODD_QUANTITIES)):
        text = appendix_text(read_network_text(source), quantities=quantities)
        check_log(compiled(text, tmp_path))


# -- what is printed ---------------------------------------------------------------------------


def printed_sum(text: str, left: str, symbols: Iterable[str]) -> dict[frozenset[str], int]:
    """Read sums of juxtaposed symbols within parentheses, by itself; SymPy multiplies them out."""
    start = text.index(f"{left} &=") + len(left) + 3
    body = re.split(r"\\\\\n(?!&)|\n\\end", text[start:])[0]
    for mark in (r"\notag\\", r"&\quad{}", r"\times", r"\cdot", "\\\\"):
        body = body.replace(mark, " ")
    known = sorted(symbols, key=len, reverse=True)
    tokens = re.findall("|".join([*map(re.escape, known), r"[-+()]", r"\S"]), body)
    code, before = "", "("
    for token in tokens:
        word = f"v{known.index(token)}" if token in known else token
        assert token in known or token in "+-()", token
        code += "*" * (before not in "+-(" and word not in "+-)") + word
        before = word
    places = sympy.symbols(f"v:{len(known)}")
    poly = sympy.Poly(sympy.sympify(code, dict(zip(map(str, places), places, strict=True))), places)
    assert all(max(powers) <= 1 for powers in poly.monoms())
    return {
        frozenset(known[place] for place, power in enumerate(powers) if power): int(coefficient)
        for powers, coefficient in poly.terms()
    }


@pytest.mark.parametrize("source", [RING, K4])
def test_printed_tree_sums_are_the_minors(source: str) -> None:
    network = read_network_text(source)
    analysis = Analysis(network)
    text, names = appendix_text(network), symbol_names(network)
    shown = [
        frozenset(names[name] for name in symbols_of(analysis.rate_expression(*direction)))
        for direction in analysis.rates.directions()
    ]
    for state, minor in zip(network.states, tree_sums_by_minors(analysis.rates), strict=True):
        expected = {
            frozenset().union(*(shown[place] for place, e in enumerate(exponents) if e)): int(c)
            for exponents, c in minor.terms()
        }
        assert printed_sum(text, f"N_{{{state.name}}}", names.values()) == expected


@pytest.mark.parametrize("name", ["ring", "energy", "one_way", "k4", "pair", "numbers", "odd"])
def test_results_with_the_names_put_back_are_the_closed_forms(name: str) -> None:
    network = read_network_text(ALL[name])
    compare_results(network, None)
    if (extra := {"ring": QUANTITIES, "odd": ODD_QUANTITIES}.get(name)) is not None:
        compare_results(network, extra)


def compare_results(network, quantities) -> None:  # type: ignore[no-untyped-def]
    analysis = Analysis(network)
    notation = notation_of(network)
    paper = Paper(network, analysis, notation, NamedSums(analysis, notation), Page())
    source = random.Random(5)
    with flint.ctx.workprec(200):
        values = {
            s.name: flint.arb(flint.fmpq(source.randint(1, 40), source.randint(1, 9)))
            for s in network.symbols
        }
        for quantity in requested(network, quantities).quantities:
            result = closed_result(paper, quantity)
            pieces, _ = paper.fitted(result.form, 150.0)
            assert pieces
            forms = {key: named.form.expression() for key, named in paper.sums.by_key.items()}
            whole = ball(put_back(result.form.expression(), forms), values)
            exact = ball(closed_form(quantity, analysis).expression, values)
            assert whole.overlaps(exact), quantity
            assert whole.rad() <= (abs(whole.mid()) + 1) * flint.arb(2) ** -100


def put_back(node: Expression, forms: dict[str, Expression]) -> Expression:
    """Put the sums back for their names."""
    while any(name.startswith("#") for name in all_symbols(node)):
        node = substitute(plain(node), forms)
    return node


def test_only_sums_that_are_used_are_defined_and_before_use() -> None:
    text = appendix_text(read_network_text(K4), quantities=["d p[A] / d barrier[A_B]"])
    defined = re.findall(r"^(\\Phi_\{[^&]*\}|C_\{[A-Z]+\}) &=", text, re.MULTILINE)
    assert defined == [r"C_{AB}", r"\Phi_{A,AB}"]
    assert text.index(r"\Phi_{A,AB} &=") < text.index(r"\frac{\partial \pi_{A}}{\partial B_{AB}}")


def test_exactly_the_sources_cited_are_listed() -> None:
    for source in (RING, PAIR):
        text = appendix_text(read_network_text(source))
        cited = {key for group in re.findall(r"\\cite\{(.*?)\}", text) for key in group.split(",")}
        assert cited == set(re.findall(r"\\bibitem\{(.*?)\}", text))


def test_letters_give_way_to_symbols_of_the_file() -> None:
    text = appendix_text(read_network_text(PAIR))
    assert r"M_{A} &= D" in text
    assert "Z &= M_{A} + M_{B}" in text


def test_long_sums_are_described_by_their_number_of_terms() -> None:
    text = appendix_text(read_network_text(ALL["cube"]))
    assert "384 spanning trees" in text and "3,072 terms" in text and "determinant" in text
    assert "(528 terms)" in text


def test_detailed_balance_is_stated() -> None:
    source = ALL["energy"].replace('drive = "F"\n', "").replace(
        'F = {sign = "real"}\n', ""
    )
    assert "All forces vanish identically" in appendix_text(read_network_text(source))


# -- choosing quantities -------------------------------------------------------------------------


def test_the_file_chooses_the_quantities() -> None:
    text = appendix_text(read_network_text(
        RING + '\n[appendix]\nquantities = ["d p[B] / d energy[A]"]\n'
    ))
    assert r"\frac{\partial \pi_{B}}{\partial E_{A}} &=" in text
    assert "Responses to barriers" not in text


@pytest.mark.parametrize(("section", "error", "words"), [
    ('quantities = ["p[A]", "p[Z]"]', QuantityError, ["[appendix] quantities, entry 2", "'Z'"]),
    ('quantites = ["p[A]"]', NetworkError, ["'quantites'", "'quantities'"]),
    ('quantities = "p[A]"', NetworkError, ["quantities", "array"]),
    ("quantities = [3]", NetworkError, ["entry 1", "text in quotes"]),
])
def test_bad_sections_name_the_entry(
    section: str, error: type[Exception], words: list[str]
) -> None:
    network = read_network_text(RING + "\n[appendix]\n" + section + "\n")
    with pytest.raises(error) as caught:
        appendix_text(network)
    assert all(word in str(caught.value) for word in words)
    assert "\n" not in str(caught.value)


# -- writing ---------------------------------------------------------------------------------------


def test_a_file_is_written_whole_or_not_at_all(tmp_path: Path) -> None:
    network = read_network_text(RING)
    target = tmp_path / "out.tex"
    record = tmp_path / "out.proofs.json"
    assert write_appendix(network, target) == (target, record)
    assert target.read_text() == appendix_text(network, proofs_file=record.name)
    before = target.read_text()
    with pytest.raises(QuantityError):
        write_appendix(network, target, quantities=["p[Z]"])
    assert target.read_text() == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["out.proofs.json", "out.tex"]


def test_places_that_cannot_be_written(tmp_path: Path) -> None:
    network = read_network_text(PAIR)
    with pytest.raises(OutputError, match="folder"):
        write_appendix(network, tmp_path)
    with pytest.raises(OutputError, match="no folder"):
        write_appendix(network, tmp_path / "missing" / "out.tex")
    closed = tmp_path / "closed"
    closed.mkdir()
    closed.chmod(0o500)
    if not os.access(closed, os.W_OK):
        with pytest.raises(OutputError, match="cannot write"):
            write_appendix(network, closed / "out.tex")
    closed.chmod(0o700)
    shutil.rmtree(closed)


def test_values_of_a_network_of_numbers_are_printed() -> None:
    text = appendix_text(read_network_text(ALL["numbers"]), quantities=["p[A]"])
    assert r"\pi_{A} &= \frac{N_{A}}{D} = \frac{1}{8}" in text
    assert Fraction(5, 40) == Fraction(1, 8)
