"""How the inequalities are written in the document: each with its own notions, and it compiles."""

from __future__ import annotations

from pathlib import Path

import pytest
from test_appendix_document import compiled

from symbolic_response.appendix.document import appendix_text
from symbolic_response.network import Rates, build_network

NET = build_network("ring with a chord", states="A B C D", transitions=[
    Rates("A", "B", "a*x", "b*x", name="e"), Rates("B", "C", "c*x", "2*x", name="f"),
    Rates("C", "D", "k", "3", name="g"), Rates("D", "A", "u", "v", name="h"),
    Rates("A", "C", "y**2", "y", name="i")])
CASES = {
    "d ln(p[A]/p[B]) / d ln x": [
        r"&\le \tanh \frac{\mathcal{F}_{\max}(\{\mathrm{e},\mathrm{f}\})}{4}",
        r"$\mathcal{F}_{\max}(\{\mathrm{e},\mathrm{f}\})$ is the largest of",
        "by the cycles that leave the set of transitions",
        "in a directed spanning tree"],
    "d p[A] / d barrier[e, f]": [
        r"and the barriers of $\mathrm{e}$, $\mathrm{f}$ together",
        r"\frac{\partial \pi_{A}}{\partial B_{\{\mathrm{e},\mathrm{f}\}}}"],
    "d current[e] / d barrier[e]": [
        r"&= |J_{\mathrm{e}}| \, \frac{\sum_k \alpha_k}{D}", r"&\le |J_{\mathrm{e}}|",
        r"by the current or the traffic itself~\cite{aslyamov}", "In the exact response"],
    "d current[e] / d drive[e]": [
        r"&= \frac{\tau_{\mathrm{e}}}{2} \, \frac{\sum_k \alpha_k}{D}"],
    "d ln(p[A]/p[B]) / d ln y": [
        r"&\le \psi_{2,1}(|\ln r_{\mathrm{i}}|)",
        r"&\le \psi_{2,1}(\mathcal{F}_{\max}(\mathrm{i}))", r"$\psi_{u,v}(x) = "],
    "d (d ln(p[A]/p[B]) / d barrier[e]) / d barrier[e]": [r"&\le \frac{1}{4}"],
    "change(ln(p[A]/p[B]), barrier[e], 2*ln(3))": [
        r"\Bigr]_{B_{\mathrm{e}}}^{B_{\mathrm{e}} + 2 \ln(3)}\Bigr| &\le 2 \ln "
        r"\frac{\cosh((|\ln r_{\mathrm{e}}| + 2 \ln(3))/4)}"
        r"{\cosh((|\ln r_{\mathrm{e}}| - 2 \ln(3))/4)}",
        "Square brackets with two values of a barrier"],
}
NOTIONS = {  # by words of their own: where they are used
    "In the exact response": "d current", r"$\psi_{u,v}(x) = ": "d ln y",
    "Square brackets": "change", r"(\{\ldots\})$, of a set": "ln x|[e, f]",
}


@pytest.mark.parametrize("quantity", CASES)
def test_what_stands_in_the_section(quantity: str) -> None:
    section = appendix_text(NET, quantities=[quantity]).split("Bounds on the responses}")[1]
    flat = " ".join(section.split())
    for words in CASES[quantity]:
        assert " ".join(words.split()) in flat
    for notion, users in NOTIONS.items():  # only what is used is explained
        assert (notion in flat) == any(user in quantity for user in users.split("|"))


def test_it_compiles(tmp_path: Path, requires_latex: None) -> None:
    assert "Overfull" not in compiled(appendix_text(NET, quantities=list(CASES)), tmp_path)


def test_many_paths_are_not_written_out(tmp_path: Path, requires_latex: None) -> None:
    """Between two states of the complete graph on five there are 1 + 3 + 6 + 6 = 16 paths."""
    names = "ABCDE"
    rates = [Rates(a, b, f"u_{a}{b}", f"v_{a}{b}") for i, a in enumerate(names)
             for b in names[i + 1:]]
    network = build_network("complete", states=" ".join(names), transitions=rates)
    text = appendix_text(network, quantities=["p[A]/p[B]"])
    assert r"&\le \max_P \frac{w_P^+}{w_P^-}" in text
    assert "$P$ runs over the 16 simple paths from $B$ to $A$" in text
    assert "Overfull" not in compiled(text, tmp_path)
