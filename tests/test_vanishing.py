"""What is zero must print as zero: detailed balance hidden behind roots and multiples of sums.

Oracle: with the rates below every cycle force is ln 1 by construction, so all currents vanish.
"""

import pytest

from symbolic_response.errors import EvaluationError
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive
from symbolic_response.response.survey import survey

ROOTS = build_network("roots", states="A B C", transitions=[
    Rates("A", "B", "k*sqrt(2)", "k", name="x"), Rates("B", "C", "m*sqrt(2)", "k", name="y"),
    Rates("A", "C", "2*m", "k", name="z")])
SUMS = build_network("multiples of one sum", states="A B", transitions=[
    Rates("A", "B", "k*sqrt(2) + u", "k", name="x"),
    Rates("A", "B", "2*k + u*sqrt(2)", "k*sqrt(2)", name="y")])
POWERS = build_network("powers", states="A B C", transitions=[
    Rates("A", "B", "k*sqrt(c)", "k", name="x"), Rates("B", "C", "k*c**(1/3)", "m", name="y"),
    Rates("C", "A", "m", "k*c**(5/6)", name="z")])


@pytest.mark.parametrize("network", [ROOTS, SUMS, POWERS], ids=lambda n: n.title)
def test_hidden_detailed_balance(network: Network) -> None:
    assert survey(network).detailed_balance
    assert derive(network, "current[x]").expression == "0"
    assert derive(network, "d p[A] / d barrier[y]").expression == "0"
    assert derive(network, "entropy_production").expression == "0"
    for text in ("1/current[x]", "d ln current[x] / d ln k", "ln(current[y])"):
        with pytest.raises(EvaluationError, match="identically 0"):
            derive(network, text)
    for found in survey(Analysis(network)).cycles or ():
        assert found.force is not None and str(found.force) == "Number(value=Fraction(0, 1))"


@pytest.mark.parametrize("put", ["8", "2*k", "k/3", "3/k", "1/2", "1000"])
def test_substitution_leaves_zero_zero(put: str) -> None:
    assert derive(POWERS, "current[y]", put={"c": put}).expression == "0"


@pytest.mark.parametrize(("text", "shown"), [
    ("sqrt(2)*sqrt(2)*c - 2*c", "0"), ("sqrt(2)*c/sqrt(8)", "c/2"), ("sqrt(2)**3*c", "2*c*sqrt(2)"),
    ("ln(c*k) - ln(c) - ln(k)", "0"), ("ln(c**2) - 2*ln(c)", "0"),
    ("(sqrt(k + c)*sqrt(k + c) - k - c)*p[A]", "0"),
])
def test_tidy_forms(text: str, shown: str) -> None:
    assert derive(POWERS, text).expression == shown
