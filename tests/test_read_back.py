"""Closed forms of a document are read back from its LaTeX; a wrong one stops the output.

The reader of hand results shares no code with the printer; here the printer is broken on purpose.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path

import pytest

from symbolic_response.appendix import appendix_text, paper, write_appendix
from symbolic_response.errors import OutputError
from symbolic_response.expressions.latex import SignedTerm, latex_terms
from symbolic_response.expressions.tree import Expression
from symbolic_response.network import Network, build_network, read_network, read_network_text
from tests.appendix_networks import ALL

WORKED = sorted((Path(__file__).parent.parent / "worked_cases").glob("*/network.toml"))
RING = build_network("ring", states="A B C", transitions=[
    ("A", "B", "k*c", "l"), ("B", "C", "m", "n"), ("C", "A", "u", "v")])
ASKED = ["current[A_B]", "d p[A] / d barrier[A_B]", "d p[C] / d ln c"]
LINE = "read back from the printed"

Terms = Callable[[Expression, Mapping[str, str]], list[SignedTerm]]


def last_sign_turned(node: Expression, names: Mapping[str, str]) -> list[SignedTerm]:
    *rest, last = latex_terms(node, names)
    return [*rest, SignedTerm(not last.negative, last.body)] if rest else [last]


def last_term_dropped(node: Expression, names: Mapping[str, str]) -> list[SignedTerm]:
    terms = latex_terms(node, names)
    return terms[:-1] if len(terms) > 2 else terms


def a_letter_exchanged(node: Expression, names: Mapping[str, str]) -> list[SignedTerm]:
    return [SignedTerm(t.negative, t.body.replace("u", "v")) for t in latex_terms(node, names)]


def a_dot_too_much(node: Expression, names: Mapping[str, str]) -> list[SignedTerm]:
    return [SignedTerm(t.negative, t.body + r" \cdot") for t in latex_terms(node, names)]


@pytest.mark.parametrize("broken", [
    last_sign_turned, last_term_dropped, a_letter_exchanged, a_dot_too_much])
def test_a_wrong_formula_stops_the_output(
    broken: Terms, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    write_appendix(RING, tmp_path / "right.tex", quantities=ASKED)
    monkeypatch.setattr(paper, "latex_terms", broken)
    with pytest.raises(OutputError, match=r"read back|reads back") as caught:
        write_appendix(RING, tmp_path / "wrong.tex", quantities=ASKED)
    assert "\n" not in str(caught.value)
    assert [path.name for path in tmp_path.iterdir() if "wrong" in path.name] == []


@pytest.mark.parametrize("path", WORKED, ids=lambda path: path.parent.name)
def test_worked_cases_say_so(path: Path) -> None:
    network = read_network(path)
    appendix = {key: value for key, value in network.appendix.items() if key != "certificates"}
    assert LINE in appendix_text(replace(network, appendix=appendix, control=()))


def test_names_that_look_like_those_of_the_notation() -> None:
    network: Network = build_network("names", states={"A": {"latex": "1"}, "B": {"latex": "2"}},
                                     transitions=[("A", "B", "N_A*D", "C*R_1")],
                                     symbols={"C": {"latex": r"\Phi"}, "D": {}, "N_A": {},
                                              "R_1": {}})
    assert LINE in appendix_text(network)


@pytest.mark.parametrize("name", ALL)
def test_documents_of_all_kinds_say_so(name: str) -> None:
    assert LINE in appendix_text(read_network_text(ALL[name]))


@pytest.mark.parametrize("rates", ["symbols", "shorter"])
@pytest.mark.parametrize("indices", ["transition", "to-from", "from-to"])
@pytest.mark.parametrize("path", WORKED[::2], ids=lambda path: path.parent.name)
def test_forms_in_rates_read_back(path: Path, indices: str, rates: str) -> None:
    network = read_network(path)
    notation = {**network.notation, "rates": rates, "indices": indices, "beta": r"\theta"}
    text = appendix_text(replace(network, notation=notation, appendix={}, control=()))
    assert LINE in text


@pytest.mark.parametrize(("indices", "tree_sum"), [
    # the trees towards o by hand: l and t step to o; t to l to o; l to t to o
    ("to-from", r"N_{o} &= W_{ol} (W_{lt} + W_{ot}) + W_{tl} W_{ot}"),
    ("from-to", r"N_{o} &= w_{lo} (w_{tl} + w_{to}) + w_{lt} w_{to}"),
])
def test_tree_sums_in_rates(indices: str, tree_sum: str) -> None:
    network = read_network(WORKED[0].parent.parent / "turnstile" / "network.toml")
    text = appendix_text(replace(network, notation={"rates": "symbols", "indices": indices}))
    assert tree_sum in text
