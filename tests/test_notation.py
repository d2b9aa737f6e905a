"""The section ``[notation]``: letters, labels, indices of rates, the inverse temperature.

What the keys mean is the README's; W_ij for the rate from j to i is the convention of most papers
on spanning trees (Schnakenberg, Rev. Mod. Phys. 48, 571 (1976), writes it so; from memory).
"""

import pytest

from symbolic_response.appendix import appendix_text
from symbolic_response.errors import NetworkError
from symbolic_response.hand.latex.names import names_of
from symbolic_response.hand.latex.reading import read_formula
from symbolic_response.network import read_network_text
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.deriving import derive
from symbolic_response.response.notation import notation_of
from symbolic_response.response.quantity_latex import quantity_in

PAIR = """
title = "pair"
[symbols.k]
[symbols.E_a]
sign = "real"
[symbols.E_b]
sign = "real"
[symbols.B]
sign = "real"
[states.a]
energy = "E_a"
[states.b]
energy = "E_b"
[[transitions]]
name = "hop"
between = ["a", "b"]
rates = ["2*k", "k"]
[[transitions]]
name = "leap"
between = ["b", "a"]
barrier = "B"
[observables.level]
b = 1
"""


def network(section: str) -> Network:
    return read_network_text(f"{PAIR}[notation]\n{section}\n")


def left(section: str, quantity: str) -> str:
    described = network(section)
    return quantity_in(notation_of(described), read_quantity(quantity, described))


@pytest.mark.parametrize(("section", "quantity", "latex"), [
    ("", "p[a]", r"\pi_{a}"),
    ("letters = {probability = 'P'}", "p[a]", "P_{a}"),
    ("letters = {current = '\\mathcal{I}'}", "current[hop]", r"\mathcal{I}_{\mathrm{hop}}"),
    ("letters = {entropy = '\\dot{S}'}", "entropy_production", r"\dot{S}"),
    ("states = {a = '1', b = '2'}", "p[a, b]", r"\pi_{\{1,2\}}"),
    ("transitions = {hop = 'h'}", "current[hop]", "J_{h}"),
    ("observables = {level = 'x'}", "mean[level]", r"\langle x \rangle"),
    ("", "forward[hop]", r"w^{+}_{\mathrm{hop}}"),
    ("indices = 'to-from'", "forward[hop]", r"W_{ba}^{(\mathrm{hop})}"),
    ("indices = 'to-from'", "backward[leap]", r"W_{ba}^{(\mathrm{leap})}"),
    ("indices = 'from-to'", "forward[hop]", r"w_{ab}^{(\mathrm{hop})}"),
    ("indices = 'to-from'\nletters = {generator = 'R'}", "forward[hop]",
     r"R_{ba}^{(\mathrm{hop})}"),
    ("beta = true", "d p[a] / d barrier[leap]", r"\frac{\partial \pi_{a}}{\partial (\beta B)}"),
    # rates of hop do not know E_a, so that raising the energy of a is more than changing E_a
    ("beta = '\\theta'", "d p[a] / d energy[a]",
     r"\frac{\partial \pi_{a}}{\partial (\theta \varepsilon_{a})}"),
])
def test_left_sides(section: str, quantity: str, latex: str) -> None:
    assert left(section, quantity) == latex


def test_indices_of_a_pair_that_one_transition_joins() -> None:
    ring = read_network_text("""
title = "ring"
[symbols.k]
[states.a]
[states.b]
[states.c3]
[[transitions]]
between = ["a", "b"]
rates = ["k", "2"]
[[transitions]]
between = ["b", "c3"]
rates = ["k", "2"]
[[transitions]]
between = ["c3", "a"]
rates = ["k", "2"]
[notation]
indices = "to-from"
""")
    notation = notation_of(ring)
    assert [notation.rate(0, False), notation.rate(0, True), notation.rate(2, False)] == [
        "W_{ba}", "W_{ab}", "W_{a,c_3}"]


def test_energies_are_written_with_the_inverse_temperature() -> None:
    plain = derive(network(""), "backward[leap]").latex
    assert plain == "e^{E_{a} - B}"
    assert derive(network("beta = true"), "backward[leap]").latex == r"e^{\beta E_{a} - \beta B}"


@pytest.mark.parametrize(("section", "message"), [
    ("leters = {}", "notation has no key 'leters'; did you mean 'letters'?"),
    ("letters = {currnt = 'I'}", "did you mean 'current'?"),
    ("letters = {current = 'k'}", "is that of a symbol or of another role already"),
    ("letters = {current = 'I', traffic = 'I'}", "of another role already"),
    ("letters = {current = 'I_1'}", "write a letter without one"),
    ("letters = {current = '\\input{x}'}", "not allowed"),
    ("states = {c = '1'}", "notation: states has no name 'c'"),
    ("states = {a = '1', b = '1'}", "two states have the same label"),
    ("states = {a = 'b'}", "two states have the same label"),
    ("transitions = {hop = '\\mathrm{leap}'}", "two transitions have the same label"),
    ("indices = 'ji'", '"transition" or "to-from" or "from-to"'),
    ("rates = 3", '"expressions" or "symbols" or "shorter"'),
    ("beta = 'k'", "is that of a symbol"),
])
def test_refused(section: str, message: str) -> None:
    with pytest.raises(NetworkError) as caught:
        notation_of(network(section))
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_document_says_what_energies_are_multiplied_by() -> None:
    text = appendix_text(network("beta = true"))
    # in energy form: exp(E - B + F/2), conventions of the README, each in units of energy
    assert r"\beta = 1/(k_{\mathrm B} T)" in text
    assert r"e^{\beta \varepsilon_m - \beta B_e + \beta F_e/2}" in text


@pytest.mark.parametrize(("indices", "formula", "meaning"), [
    ("to-from", "W_{ba}", "forward[hop] + backward[leap]"),
    ("to-from", r"W_{ab}^{(\mathrm{hop})}", "backward[hop]"),
    ("from-to", "w_{ba}", "backward[hop] + forward[leap]"),
    ("from-to", "W_{ba}", "forward[hop] + backward[leap]"),
    ("from-to", r"w_{ab}^{(\mathrm{hop})}", "forward[hop]"),
])
def test_rates_between_states_are_read(indices: str, formula: str, meaning: str) -> None:
    described = network(f"indices = '{indices}'")
    assert read_formula(formula, names_of(described)) == read_quantity(meaning, described)
