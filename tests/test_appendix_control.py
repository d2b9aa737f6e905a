"""Control parameters in the document: what is said is right, it fits, and errors name the entry."""

from __future__ import annotations

import re
from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import pytest
from control_networks import DRIVEN, LONG, ONE_WAY, RING, TIDE_LAMP
from test_appendix_document import check_log, compiled

from symbolic_response.appendix import Layout, appendix_text
from symbolic_response.appendix.control_decimals import rounded, value_latex
from symbolic_response.control.function import function_of
from symbolic_response.errors import NetworkError
from symbolic_response.network import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.network.toml_reader import read_network_text
from symbolic_response.response.analysis import Analysis

ALL = {"ring": RING, "tide_lamp": TIDE_LAMP, "driven": DRIVEN, "one_way": ONE_WAY, "long": LONG}
CASES = [*((name, 345.0) for name in ALL),
         *((name, 246.0) for name in ALL if name != "long")]  # its coefficients are wider than that


def network(source: str, **changes: str) -> Network:
    for old, new in changes.items():
        source = source.replace(old, new)
    return read_network_text(source)


def section(text: str) -> str:
    """Return the section on control parameters, spaces and line ends made one."""
    body = text.split(r"\section{Control parameters}")[1].split(r"\section{Proofs}")[0]
    return re.sub(r"\s+", " ", body)


@pytest.fixture(scope="module")
def texts() -> dict[str, str]:
    return {name: appendix_text(read_network_text(source)) for name, source in ALL.items()}


@pytest.mark.parametrize(("name", "width"), CASES)
def test_it_compiles_and_nothing_sticks_out(
    name: str, width: float, tmp_path: Path, requires_latex: None
) -> None:
    text = appendix_text(read_network_text(ALL[name]), layout=Layout(width=width))
    check_log(compiled(text, tmp_path))


def test_no_section_without_entries(texts: dict[str, str]) -> None:
    text = appendix_text(network(RING.split("[[control]]")[0]))
    assert "Control parameters" not in text and "pgfplots" not in text
    assert r"\usepackage{pgfplots}" in texts["ring"]
    assert r"\pgfplotsset{compat=" in texts["ring"]
    assert "pgfplots" not in texts["one_way"]


def test_the_ring_has_the_limit_of_its_bundles(texts: dict[str, str]) -> None:
    body = section(texts["ring"])
    assert "H &= 2 + t" in body
    assert r"t = \tanh (|\mathcal{F}_{1}|/4)" in body
    assert r"Without forces $H = 2$; however strong the driving, $H \le 3$." in body
    assert r"all rates of the bundle $\{" in body
    assert r"H_{\mathrm{own}} &= 3" in body
    assert "all energies, all unions of blocks, all bundles, all drives" in body
    assert "The family is part of the statement" in body
    assert r"$w^{+}_{\mathrm{a}}$, $w^{+}_{\mathrm{b}}$, $w^{-}_{\mathrm{d}}$" in body


def test_bundles_are_argued_for_or_referred_to(texts: dict[str, str]) -> None:
    assert "A matching of the terms" in section(texts["ring"])
    asked = '"d p[s1] / d barrier[a, b]", "d mean[open] / d ln c"'
    text = appendix_text(network(RING, **{'"d mean[open] / d ln c"': asked}))
    assert r"\label{eq:bundle}" in text
    assert "A matching of the terms" not in section(text)
    assert r"for bundles see Eq.~\eqref{eq:bundle}" in section(text)


def test_the_exact_function_is_that_of_the_network(texts: dict[str, str]) -> None:
    analysis = Analysis(read_network_text(RING))
    f = function_of(analysis, read_quantity("mean[open]", analysis.network), "c", {})
    assert f.latex() in section(texts["ring"])
    low, high = (f.leading_term(end) for end in ("low", "high"))
    assert low == (Fraction(1, 2), 1) and high == (1, 0)
    assert r"= \frac{1}{2} \, c + \ldots$ for $c \to 0$" in section(texts["ring"])
    assert r"= 1 - \frac{1}{14} \, \frac{1}{c} + \ldots$ for $c \to \infty$" in section(
        texts["ring"])


def test_the_steepest_place_is_a_maximum_of_the_curve(texts: dict[str, str]) -> None:
    body = section(texts["ring"])
    found = re.search(r"\\ln c\|\$ is about \$([\d.]+)\$, at \$c \\approx ([\d.]+)\$; the largest"
                      r" size of the local exponent is about \$([\d.]+)\$, at \$c \\approx"
                      r" ([\d.]+)\$, where \$H \\approx ([\d.]+)\$", body)
    assert found is not None
    value, x, exponent, place, limit = map(Fraction, found.groups())
    analysis = Analysis(read_network_text(RING))
    f = function_of(analysis, read_quantity("mean[open]", analysis.network), "c", {})
    for g, top, at in ((f.sensitivity(), value, x), (f.exponent(), exponent, place)):
        assert abs(g.value(at) - top) < Fraction(1, 10**5)
        for grid in range(1, 400):
            assert abs(g.value(Fraction(grid, 40))) <= top + Fraction(1, 10**6)
    assert exponent < limit < 3


def test_a_real_parameter_and_an_observable_of_another_range(texts: dict[str, str]) -> None:
    body = section(texts["driven"])
    assert r"\frac{H}{3} \, (\langle \mathrm{load} \rangle + 1)" in body
    assert "runs from $-1$ to $2$" in body
    assert r"\partial \ln w / \partial F" in body
    assert r"for $F \to -\infty$" in body and r"for $F \to \infty$" in body
    assert r"where $H = 3/2$" in body and "at $F = -10$" in body
    assert "chosen for this network the change consists of the drive of" in body
    assert r"brought to the range from 0 to 1 to $F$ for $E = 2 \ln" in body


def test_pieces_for_the_parameter_are_turned_into_those_for_its_logarithm(
    texts: dict[str, str],
) -> None:
    body = section(texts["tide_lamp"]).split(r"\subsection")[2]
    own = (r"The decomposition chosen for this network consists of the energy of state $i$"
           r" (amount~$1$); the rates $w^{-}_{\mathrm{fade}}$ and $w^{-}_{\mathrm{recover}}$"
           r" (amount~$-1$)")
    assert own in body
    assert r"\langle \mathrm{brightness} \rangle &\to \frac{b}{4 (b + h)}" in body
    faulty = network(TIDE_LAMP, **{'amount = "1/c"': 'amount = "1"'})
    with pytest.raises(NetworkError, match=r"^\[\[control\]\], entry 2: the pieces do not sum"):
        appendix_text(faulty)


def test_one_way_steps_and_values_that_are_symbols(texts: dict[str, str]) -> None:
    body = section(texts["one_way"])
    assert r"q_{\min}" in body and "is infinite, for a cycle with a one-way step" in body
    assert r"\frac{K}{s^{\ast} + K}" in body
    assert r"approached for $k_{b} \to \infty$" in body
    assert "No rate depends on it." in body


def test_letters_give_way_to_symbols_of_the_file() -> None:
    body = section(appendix_text(network(RING, **{
        "[symbols.c]": "[symbols.H]", '"c"': '"H"', '"3*c"': '"3*H"', '"2*c"': '"2*H"',
        '"5*c"': '"5*H"', "ln c": "ln H"})))
    assert r"\mathcal{H} &= 2 + t" in body and r"\partial \ln w / \partial \ln H" in body


def test_long_functions_are_described_by_their_degrees(texts: dict[str, str]) -> None:
    body = section(texts["long"])
    assert "is a quotient of polynomials of degrees 12 and 15 in $c$" in body


@pytest.mark.parametrize(("old", "new", "message"), [
    ('parameter = "ln c"', 'parameter = "ln d"', "parameter: in 'ln d': there is no"),
    ('parameter = "ln c"', 'parameter = "drive[a]"', "write a symbol, or ln of one"),
    ('parameter = "ln c"', "", "has no parameter"),
    ('to = "100"', "", "give both from and to"),
    ('to = "100"', 'to = "c"', "to contains the symbol c"),
    ('to = "100"', 'to = "1/1000"', "low below high|is empty"),
    ('to = "100"', 'to = "100"\npoints = 1', "from 2 to 1000"),
    ('to = "100"', 'to = "100"\npoints = true', "points is true"),
    ('to = "100"', 'to = "100"\nobservables = []', "observables is not a list"),
    ('to = "100"', 'to = "100"\nobservables = ["p[s9]"]', "s9"),
    ('to = "100"', 'to = "100"\nobservables = ["current[a]"]', "the mean of an observable"),
    ('to = "100"', 'to = "100"\nat = {d = 1}', "at has no symbol 'd'"),
    ('to = "100"', 'to = "100"\nat = {c = 1}', "at has no symbol 'c'"),
    ('to = "100"', 'to = "100"\nuntil = 3', "no key 'until'"),
    ("s3 = 1\n[[", "s3 = 1\ns1 = 1\ns4 = 1\n[[", "the same in every state"),
    ("s3 = 1\n[[", 's3 = "c"\n[[', "depends on c"),
])
def test_faulty_entries(old: str, new: str, message: str) -> None:
    assert old in RING
    with pytest.raises(NetworkError, match=message) as caught:
        appendix_text(network(RING, **{old: new}))
    assert str(caught.value).startswith("[[control]], entry 1")
    assert "\n" not in str(caught.value)
    assert caught.value.place[:2] == ("control", 0)  # type: ignore[attr-defined]


@pytest.mark.parametrize(("old", "new", "message"), [
    ('a_r = "1/3"\n', "", "at has no value for a_r"),
    ('a_r = "1/3"', 'a_r = "-1/3"', "a positive symbol"),
    ('a_r = "1/3"', 'a_r = "b"', "at of a_r contains the symbol b"),
])
def test_faulty_values(old: str, new: str, message: str) -> None:
    with pytest.raises(NetworkError, match=message):
        appendix_text(network(TIDE_LAMP, **{old: new}))
    start, end = TIDE_LAMP.index("[control.at]"), TIDE_LAMP.index('[[control]]\nparameter = "c"')
    with pytest.raises(NetworkError, match="needs a value for every other symbol"):
        appendix_text(read_network_text(TIDE_LAMP[:start] + TIDE_LAMP[end:]))


def test_numbers_are_rounded_honestly() -> None:
    assert rounded(Decimal("0.1234564"), Decimal("0.1234566")) == Decimal("0.12346")
    assert rounded(Decimal("-2.0000001"), Decimal("-1.9999999")) == Decimal("-2.00000")
    assert value_latex(("2.5", "2.5")) == "= 2.5"
    assert value_latex(("0.000012345", "0.000012346")) == r"\approx 1.23 \times 10^{-5}"
    assert value_latex(("2", "2"), Fraction(2)) == "= 2"
