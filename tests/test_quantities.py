"""Reading quantities and responses: every atom, nesting, refusals, positions, any text at all."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from symbolic_response.errors import QuantityError
from symbolic_response.expressions.tree import (
    Expression,
    Function,
    Number,
    Power,
    Product,
    Sum,
    Symbol,
    divide,
    function,
    number,
)
from symbolic_response.network.build import Rates, build_network
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BySymbol,
    Current,
    DirectedRate,
    DriveOf,
    EnergyOf,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.network.quantity_reader import read_perturbation, read_quantity

NETWORK = build_network(
    "three", states="A B C",
    transitions=[Rates("A", "B", "k*c", "x**2 + k", name="bind"), Rates("B", "C", "c", "k"),
                 Rates("C", "A", "k", "c", name="A")],
    symbols={"k": "positive", "c": "positive", "x": "real"},
    observables={"occupancy": {"B": 1}, "B": {"C": "c"}},
)
ONE_WAY = build_network(
    "one-way", states="A B", transitions=[Rates("A", "B", "k", None, name="go"),
                                          Rates("B", "A", 1, 2, name="back")],
)
WORDS = build_network(
    "words", states="lambda None I", transitions=[
        Rates("lambda", "None", "I*pi", "S + N", name="import"),
        Rates("None", "I", "E*Q", "O", name="class"),
        Rates("I", "lambda", "zoo", "True", name="E")],
    observables={"pi": {"None": "pi"}},
)


def read(text: str, network: Network = NETWORK) -> Expression:
    return read_quantity(text, network)


@pytest.mark.parametrize(("text", "expected"), [
    ("p[A]", Probability((0,))),
    (" p [ A ] ", Probability((0,))),
    ("p[A, B]", Probability((0, 1))),
    ("p[C,A]", Probability((0, 2))),
    ("mean[occupancy]", Mean(0)),
    ("mean[B]", Mean(1)),
    ("current[bind]", Current(0)),
    ("current[B_C]", Current(1)),
    ("current[A]", Current(2)),
    ("traffic[bind]", Traffic(0)),
    ("forward[bind]", DirectedRate(0, False)),
    ("backward[bind]", DirectedRate(0, True)),
    ("entropy_production", EntropyProduction()),
    ("c", Symbol("c")),
    ("0.1", Number(Fraction(1, 10))),
    ("(((p[A])))", Probability((0,))),
    ("+p[A]", Probability((0,))),
    ("--p[A]", Probability((0,))),
])
def test_atoms(text: str, expected: Expression) -> None:
    assert read(text) == expected


def test_expressions_of_atoms() -> None:
    a, b = Probability((0,)), Probability((1,))
    assert read("ln(p[A]/p[B])") == function("ln", divide(a, b))
    assert read("current[bind]/p[A]") == divide(Current(0), a)
    assert read("2*p[A] - c") == Sum((Product((number(2), a)), Product((number(-1), Symbol("c")))))
    assert read("p[A]**2") == Power(a, number(2).value)
    assert read("sqrt(p[A])") == Power(a, number(1).value / 2)
    assert read("exp(-p[A])") == Function("exp", Product((number(-1), a)))
    assert read("-p[A]**2") == Product((number(-1), Power(a, number(2).value)))


@pytest.mark.parametrize(("text", "expected"), [
    ("energy[A]", EnergyOf(0)),
    ("barrier[bind]", BarrierOf(0)),
    ("drive[A]", DriveOf(2)),
    ("c", BySymbol("c")),
    ("ln c", BySymbol("c", True)),
    ("ln(c)", BySymbol("c", True)),
    ("x", BySymbol("x")),
])
def test_perturbations(text: str, expected: Perturbation) -> None:
    assert read_perturbation(text, NETWORK) == expected
    assert read(f"d p[A] / d {text}") == Response(Probability((0,)), expected)
    assert read(f"(d p[A]/d {text})") == Response(Probability((0,)), expected)


@pytest.mark.parametrize(("text", "same"), [
    ("d ln p[A] / d ln c", "d ln(p[A]) / d ln(c)"),
    ("d p[A]/p[B] / d c", "d (p[A]/p[B]) / d c"),
    ("d p[A] + p[B] / d c", "d (p[A] + p[B]) / d c"),
    ("d p[A] / c / d c", "d (p[A]/c) / d c"),
    ("d p[A]**2/d c", "d (p[A]**2) / d c"),
    ("d -p[A] / d c", "d (-p[A]) / d c"),
    ("d ln(p[A]/p[B]) / d c", "d (ln(p[A]/p[B])) / d c"),
    ("d ln(p[A])/p[B] / d c", "d ((ln(p[A]))/p[B]) / d c"),
    ("d ln p[A, B] / d ln c", "d ln(p[A, B]) / d ln c"),
    ("d c / d c", "d (c) / d c"),
    ("d ln c / d ln c", "d ln(c) / d ln c"),
    ("d ln (d p[A] / d c) / d c", "d ln((d p[A] / d c)) / d c"),
    ("d\tp[A]\n/ d c", "d p[A] / d c"),
])
def test_the_last_top_level_slash_d_splits(text: str, same: str) -> None:
    assert read(text) == read(same)


def test_nesting() -> None:
    first = Response(Probability((0,)), BarrierOf(1))
    second = Response(first, EnergyOf(1))
    assert read("d (d p[A] / d barrier[B_C]) / d energy[B]") == second
    assert read("(d (d p[A] / d barrier[B_C]) / d energy[B])") == second
    product = Product((Symbol("c"), first))
    assert read("c*(d p[A] / d barrier[B_C])") == product
    assert read("d c*(d p[A] / d barrier[B_C]) / d energy[B]") == Response(product, EnergyOf(1))
    assert read("(d p[A] / d c)/(d p[B] / d c)") == divide(
        Response(Probability((0,)), BySymbol("c")), Response(Probability((1,)), BySymbol("c")))
    deep = "p[A]"
    for _ in range(6):
        deep = f"(d {deep} / d c)"
    assert isinstance(read(deep), Response)
    with pytest.raises(QuantityError, match="nested more than 6 deep"):
        read(f"d {deep} / d c")


def test_words_of_python_are_ordinary_names() -> None:
    assert read("p[lambda]*pi/None", build_network(
        "w", states="lambda B", transitions=[Rates("lambda", "B", "pi", "None")],
    )) == Product((Probability((0,)), Symbol("pi"), Power(Symbol("None"), number(-1).value)))
    assert read("d mean[pi] / d ln E", WORDS) == Response(Mean(0), BySymbol("E", True))
    assert read("current[import] + current[class]*I", WORDS) == Sum(
        (Current(0), Product((Current(1), Symbol("I")))))


@pytest.mark.parametrize(("text", "message"), [
    ("", "ends where a value is expected"),
    ("p", "p needs a name in brackets"),
    ("p[", "a name is expected"),
    ("p[]", "a name is expected"),
    ("p[A", "not closed by ]"),
    ("p[A B]", "not closed by ]"),
    ("p[A,]", "a name is expected"),
    ("p[2]", "a name is expected"),
    ("p(A)", "p needs a name in brackets"),
    ("p[A, A]", "named twice"),
    ("p[D]", "no state 'D'"),
    ("p[bind]", "no state 'bind'"),
    ("mean[occupancy, B]", "takes one name"),
    ("mean[ocupancy]", "occupancy"),
    ("current[bnid]", "bind"),
    ("traffic", "needs a name in brackets"),
    ("entropy_production[A]", "cannot follow"),
    ("entropy_prodction", "entropy_production"),
    ("A*p[A]", r"write p\[A\]"),
    ("occupancy", r"write mean\[occupancy\]"),
    ("bind", r"write current\[bind\]"),
    ("z*p[A]", "unknown symbol 'z'"),
    ("tanh(p[A])", "belongs in an inequality"),
    ("abs(current[bind])", "belongs in an inequality"),
    ("max_cov[occupancy, bind]", "belongs in an inequality"),
    ("force_max[bind]", "belongs in an inequality"),
    ("log(p[A])", "write ln"),
    ("sin(p[A])", "not a function"),
    ("p[A]^2", r"\*\*"),
    ("p[A]**c", "an exponent must be an exact number"),
    ("p[A]**p[B]", "an exponent must be an exact number"),
    ("p[A]**65", "larger than 64"),
    ("2p[A]", "runs into"),
    ("p[A] p[B]", "operator"),
    ("(p[A]", "never closed"),
    ("p[A])", "without an opening"),
    ("d", "a response needs"),
    ("d p[A]", "a response needs"),
    ("d p[A] / c", "a response needs"),
    ("d / d c", "a value is expected"),
    ("d p[A] / d", "a perturbation is"),
    ("d p[A] / d 2", "a perturbation is"),
    ("d p[A] / d ln", "a perturbation is"),
    ("d p[A] / d p[B]", "p"),
    ("d p[A] / d A", "A"),
    ("d p[A] / d ln x", "needs a positive symbol"),
    ("d p[A] / d c**2", "cannot follow a perturbation"),
    ("d p[A] / d c * 2", "cannot follow a perturbation"),
    ("d p[A] / d energy[A, B]", "takes one name"),
    ("d p[A] / d energy[bind]", "'bind' is a transition; energy takes a state"),
        ("d p[A] / d barrier[B]", "'B' is a state; barrier takes a transition"),
        ("d p[A] / d energy[nowhere]", "no state"),
        ("d p[A] / d log c", "write d / d ln c, not log"),
        ("d p[A] / dc", "write d c, with a space"),
        ("d p[A] / delta", "a response needs"),
    ("d p[A] / d barrier[A_B]", "no transition"),
    ("d p[A] / d energy", "needs a name in brackets"),
    ("d p[A] / d current[bind]", "current"),
    ("c*d p[A] / d c", "stands in parentheses"),
    ("d d p[A] / d c / d c", "put the inner response in parentheses"),
    ("d ln p[A]/p[B] / d c", "write ln"),
    ("d ln p[A]*c / d c", "write ln"),
    ("p[A] = 1", "="),
    ("p[A]; import os", ";"),
    ("f'{p[A]}'", "character"),
    ("p.__class__", "character"),
    ("__import__('os')", "character"),
    ("\u03bb", "character"),
    ("p[\u0410]", "character"),
    ("1/0", "division by zero"),
    ("1e5000", "1000 digits"),
    ("9" * 1001, "1000 digits"),
    ("-" * 100_000 + "1", "nested more than"),
    ("(" * 100_000, "nested more than|never closed"),
    ("(d " * 100_000, "nested|never closed|response"),
    ("p[A" * 1000, "not closed"),
    ("1 + " * 200_000 + "1", "characters long"),
], ids=lambda text: text[:24])
def test_refusals(text: str, message: str) -> None:
    with pytest.raises(QuantityError, match=message) as caught:
        read(text)
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 400


@pytest.mark.parametrize("text", [
    "entropy_production", "d entropy_production / d c", "ln(1 + entropy_production)"])
def test_entropy_production_needs_backward_rates(text: str) -> None:
    with pytest.raises(QuantityError, match="'go' is one-way"):
        read(text.replace("d c", "d k"), ONE_WAY)


def test_rates_of_one_way_transitions_can_be_asked_for() -> None:
    assert read("backward[go]", ONE_WAY) == DirectedRate(0, True)
    assert read("current[go]", ONE_WAY) == Current(0)


@pytest.mark.parametrize(("text", "place"), [
    ("p[A] + z", 8), ("p[A] + c*(z + 1)", 11), ("p[A] + $", 8), ("c*d p[A] / d c", 3),
    ("p[A]**c", 5), ("1 + mean[occupancy] mean[B]", 21), ("(p[A] + (c", 9), ("p[A]*)", 6),
    ("d p[A] / d ln x", 15), ("p[A] + tanh(c)", 8),
])
def test_positions(text: str, place: int) -> None:
    with pytest.raises(QuantityError, match=f"character {place}:"):
        read(text)


# -- any text at all ------------------------------------------------------------------------------

PIECES = ("p", "[", "]", "A", "B", "bind", "current", "mean", "occupancy", "d", " / d ", "ln ",
          "ln", "(", ")", "+", "-", "*", "/", "**", "2", "0", "0.5", "1/3", ",", "c", "x", " ",
          "energy[A]", "barrier[bind]", "p[A]", "entropy_production", "exp(", "sqrt(", "(d ",
          "tanh", "z", "\n", "'", "\u00e9", "\0", "64", "e9")


@settings(max_examples=600, deadline=None)
@given(st.lists(st.sampled_from(PIECES), max_size=25).map("".join))
def test_junk_of_pieces(text: str) -> None:
    try:
        quantity = read(text)
    except QuantityError as error:
        assert "\n" not in str(error)
    else:
        assert isinstance(quantity, Expression)


@settings(max_examples=300, deadline=None)
@given(st.text(max_size=40))
def test_junk_of_any_characters(text: str) -> None:
    for reader in (read, lambda junk: read_perturbation(junk, NETWORK)):
        try:
            reader(text)
        except QuantityError as error:
            assert len(str(error).splitlines()) == 1


QUANTITIES = st.recursive(
    st.sampled_from(["p[A]", "p[B, C]", "c", "x", "2", "1/3", "mean[occupancy]", "traffic[bind]",
                     "entropy_production", "forward[A]"]),
    lambda inner: st.one_of(
        st.tuples(inner, st.sampled_from(["+", "-", "*"]), inner).map(
            lambda parts: f"({parts[0]} {parts[1]} {parts[2]})"),
        inner.map(lambda text: f"exp({text})"),
        inner.map(lambda text: f"-{text}"),
        st.tuples(inner, st.sampled_from(["c", "ln c", "energy[B]", "drive[bind]"])).map(
            lambda parts: f"(d {parts[0]} / d {parts[1]})"),
    ),
    max_leaves=6,
)


@settings(max_examples=200, deadline=None)
@given(QUANTITIES)
def test_what_is_well_formed_is_read_whatever_the_spaces(text: str) -> None:
    if text.count("(d ") > 6:
        return
    spread = "  ".join(text.replace("(", " ( ").replace("]", " ] ").split(" "))
    assert read(text) == read(spread)
    assert read(f"({text})" if not text.startswith("(d ") else text) == read(text)
