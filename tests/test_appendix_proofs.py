"""The appendix's proofs: what it states, weights against enumeration, the record beside it."""

from __future__ import annotations

import hashlib
import json
import re
from pathlib import Path

import pytest
from appendix_networks import ALL, ENERGY, K4, ONE_WAY, RING
from proof_networks import rooted_trees, undirected_trees
from test_appendix_document import check_log, compiled

import symbolic_response.appendix.proofs_data as proofs_data
from symbolic_response.appendix import Layout, appendix_text, write_appendix
from symbolic_response.appendix.forests import forests_into
from symbolic_response.appendix.letters import PROOF_LETTERS, proof_letters
from symbolic_response.appendix.proofs_section import EQUATIONS
from symbolic_response.bounds.registry import NAMES
from symbolic_response.checker import check_file
from symbolic_response.cli import run
from symbolic_response.errors import NetworkError, OutputError, SizeLimitError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.tree import add, multiply, negate
from symbolic_response.network import Rates, build_network
from symbolic_response.network.toml_reader import read_network_text
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.notation import notation_of

CHANNELS = """
title = "Channels, a bridge and a one-way step"
symbols = {a={}, b={}, c={}, f={}, g={}, h={}, u={}, v={}, x={}}
[states.A]
[states.B]
[states.C]
[states.D]
[[transitions]]
name = "one"
between = ["A", "B"]
rates = ["a*c", "b"]
[[transitions]]
name = "two"
between = ["A", "B"]
rates = ["f*c", "g"]
[[transitions]]
name = "next"
between = ["B", "C"]
rates = ["h", "u"]
[[transitions]]
name = "back"
between = ["C", "A"]
rates = ["v"]
[[transitions]]
name = "side"
between = ["C", "D"]
rates = ["x", "2*x"]
[observables.busy]
B = 1
C = "1/2"
"""
EVERY_KIND = [
    "d p[A] / d barrier[one]", "d mean[busy] / d drive[back]", "d p[D] / d energy[C]",
    "d p[B] / d barrier[side]", "d p[A] / d ln c", "d ln(p[A]/p[B]) / d ln x",
    "d current[next] / d barrier[next]", "d current[one] / d drive[one]",
    "p[A]/p[B]", "d p[A] / d barrier[next, back]", "change(ln(p[A]/p[C]), barrier[next], 1/2)",
    "d (d ln(p[A]/p[B]) / d barrier[next]) / d barrier[next]",
]


def proofs_of(text: str) -> str:
    """Return the section of proofs."""
    return re.split(r"\\section\{Certificates\}|\\begin\{thebibliography\}",
                    re.split(r"\\section\{(?:Proofs|Inequalities without a proof)\}", text)[1])[0]


def rows_of(text: str, head: str) -> list[list[str]]:
    """Return the cells of the table with a head."""
    body = text.split(head)[1].split(r"\endhead")[1].split(r"\bottomrule")[0]
    lines = body.replace(r"$\allowbreak$", "").split("\\\\\n")
    return [[cell.strip() for cell in line.split("&")] for line in lines if line.strip()]


def test_weights_of_cycles_are_those_of_enumeration() -> None:
    """Every cycle through e, with the trees whose path it closes, from all trees by brute force."""
    network = read_network_text(K4)
    section = proofs_of(appendix_text(network))
    forests = {row[0]: row[2] for row in rows_of(section, r"$\Sigma_c$ & Forests")}
    analysis = Analysis(network)
    trees = undirected_trees(analysis.graph)
    rows = rows_of(section, "Trees without $e$")
    assert len(rows) == 5
    for label, cycles, total in rows:
        numbers = re.findall(r"\d+", cycles)
        e = list(notation_of(network).transitions).index(label.strip("$"))
        avoiding = [tree for tree in trees if e not in tree]
        for number in numbers:
            cycle = set(analysis.cycles[int(number) - 1].transitions)
            assert e in cycle
            count = sum(cycle - {e} <= set(tree) for tree in avoiding)
            assert forests[f"${number}$"] == f"${count}$"
        assert total.endswith(f"= {len(avoiding)}$")
    for label, cuts, total in rows_of(section, "Trees with $e$"):
        e = list(notation_of(network).transitions).index(label.strip("$"))
        using = sum(e in tree for tree in trees)
        assert int(total) == using == sum(map(int, re.findall(r"\((\d+)\)", cuts)))


@pytest.mark.parametrize("source", [K4, CHANNELS, ENERGY, ONE_WAY])
def test_sums_over_forests_are_those_of_enumeration(source: str) -> None:
    analysis = Analysis(read_network_text(source))
    graph = analysis.graph
    for cycle in analysis.cycles:
        inside = set(cycle.states)
        # trees to a state of the cycle, what the states of the cycle do left out
        found = {
            frozenset(rate for rate in tree if tail(graph, rate) not in inside)
            for tree in rooted_trees(graph, cycle.states[0])
            if all(head(graph, rate) in inside for rate in tree if tail(graph, rate) in inside)
        }
        expected = add([multiply([analysis.rate_expression(*rate) for rate in forest])
                        for forest in found])
        difference = add([expected, negate(forests_into(analysis, inside))])
        assert normal_form(difference, analysis.domain).is_zero()


def tail(graph, rate):  # type: ignore[no-untyped-def]
    return graph.ends[rate[0]][1 if rate[1] else 0]


def head(graph, rate):  # type: ignore[no-untyped-def]
    return graph.ends[rate[0]][0 if rate[1] else 1]


def test_each_piece_is_printed_only_where_it_is_used() -> None:
    network = read_network_text(CHANNELS)
    energies = proofs_of(appendix_text(network, quantities=["d p[A] / d energy[B]"]))
    assert r"\begin{theorem}" not in energies and r"\label{eq:energy}" in energies
    currents = proofs_of(appendix_text(
        network, quantities=["d current[one] / d barrier[one]"]))
    assert r"\begin{theorem}" in currents and r"\label{eq:current}" in currents
    assert "eq:tanh" not in currents and "eq:observable" not in currents
    barrier = proofs_of(appendix_text(network, quantities=["d p[A] / d barrier[one]"]))
    for label in ("free", "ends", "mixture", "tanh", "cycles", "mediant", "covariance"):
        assert rf"\label{{eq:{label}}}" in barrier
    for label in ("paths", "parameter", "bundle", "local", "current", "energy"):
        assert rf"eq:{label}" not in barrier


def test_what_is_referred_to_is_there() -> None:
    section = proofs_of(appendix_text(read_network_text(CHANNELS), quantities=EVERY_KIND))
    labels = re.findall(r"\\label\{(.*?)\}", section)
    assert len(labels) == len(set(labels))
    assert set(re.findall(r"\\eqref\{(.*?)\}", section)) <= set(labels)
    assert set(EQUATIONS) == set(NAMES)


@pytest.mark.parametrize("name", ["ring", "one_way", "energy", "odd", "k4", "pair"])
def test_no_letter_of_a_proof_is_a_symbol_of_the_file(name: str) -> None:
    notation = notation_of(read_network_text(ALL[name]))
    letters = proof_letters(notation)
    bases = {re.split(r"[_^']", latex)[0] for latex in notation.symbols.values()}
    assert not bases & set(letters.values())
    assert not set(notation.letters.values()) & set(letters.values())
    assert len(set(letters.values())) == len(letters) == len(PROOF_LETTERS)


def test_the_file_is_written_and_valid(tmp_path: Path) -> None:
    network = read_network_text(RING + "[appendix]\nquantities = ['d p[A] / d barrier[flip]', "
                                "'d p[B] / d energy[A]', 'p[A]']\ndigests = true\n")
    files = write_appendix(network, tmp_path / "ring one.tex")
    assert [file.name for file in files] == ["ring one.tex", "ring one.proofs.json"]
    data = json.loads(files[1].read_bytes())
    assert (data["kind"], len(data["records"])) == ("several", 2)
    assert check_file(files[1]).status == "valid"
    text = files[0].read_text()
    shown = re.sub(r"\\allowbreak\{\}|\\texttt\{|\}", "", text)
    assert "recheck ring one.proofs.json" in shown
    digest = hashlib.sha256(files[1].read_bytes()).hexdigest()
    assert digest in text.replace(r"}\allowbreak{}\texttt{", "")


def test_the_record_of_every_kind_of_proof_is_valid(tmp_path: Path) -> None:
    _, record = write_appendix(read_network_text(CHANNELS), tmp_path / "out.tex",
                               quantities=EVERY_KIND)
    verdict = check_file(record)
    assert verdict.status == "valid", str(verdict)
    assert len(json.loads(record.read_bytes())["records"]) == len(EVERY_KIND)


def test_neither_file_is_changed_where_one_cannot_be_written(tmp_path: Path) -> None:
    (tmp_path / "out.proofs.json").mkdir()
    with pytest.raises(OutputError, match=r"out.proofs.json.*folder"):
        write_appendix(read_network_text(RING), tmp_path / "out.tex")
    assert [path.name for path in tmp_path.iterdir()] == ["out.proofs.json"]


@pytest.mark.parametrize("section", ["proofs = false", "bounds = false"])
def test_proofs_can_be_left_out(section: str, tmp_path: Path) -> None:
    network = read_network_text(f"{RING}[appendix]\n{section}\n")
    assert [file.name for file in write_appendix(network, tmp_path / "out.tex")] == ["out.tex"]
    text = (tmp_path / "out.tex").read_text()
    assert r"\section{Proofs}" not in text and "proofs.json" not in text
    assert (r"\section{Bounds" in text) == (section == "proofs = false")
    assert [path.name for path in tmp_path.iterdir()] == ["out.tex"]


@pytest.mark.parametrize("section", ["proofs = 1", "proofs = 'no'", "proofs=true\nbounds=false"])
def test_faulty_entries(section: str) -> None:
    with pytest.raises(NetworkError, match=r"\[appendix\] proofs is"):
        appendix_text(read_network_text(f"{RING}[appendix]\n{section}\n"))


def test_what_cannot_be_proved_is_listed_with_the_reason(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    odd = read_network_text(ALL["odd"])
    assert [file.name for file in write_appendix(odd, tmp_path / "odd.tex")] == ["odd.tex"]
    section = proofs_of((tmp_path / "odd.tex").read_text())
    assert r"need not be positive for all values of the symbols." in section
    assert section.count(r"\item") == 1 and r"\begin{theorem}" not in section

    def beyond(*_: object) -> None:
        raise SizeLimitError("past a limit of 3 paths")

    monkeypatch.setattr("symbolic_response.certificates.proofs.prove.edge_proof", beyond)
    section = proofs_of(appendix_text(read_network_text(RING), quantities=[
        "d p[A] / d barrier[flip]", "d p[A] / d energy[B]"]))
    assert r"\item $\displaystyle \frac{\partial \pi_{A}}{\partial B_{\mathrm{flip}}}$ limited" \
        in section and "past a limit of 3 paths." in section
    assert "sums from $0$ to $1$" in section


def test_forests_that_do_not_add_up_stop_the_document(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(proofs_data, "count_undirected_trees", lambda graph: 1000)
    with pytest.raises(ArithmeticError, match="incomplete"):
        appendix_text(read_network_text(K4))


def test_large_networks_have_the_numbers_only() -> None:
    section = proofs_of(appendix_text(read_network_text(ALL["cube"]), quantities=[
        "d p[s000] / d barrier[s000_s001]"]))
    ((_, cycles, trees),) = rows_of(section, "Trees without $e$")
    ((_, cuts, using),) = rows_of(section, "Trees with $e$")
    assert (cycles, trees, using) == ("14", "160", "224")  # 384 * 7/12 trees use each edge
    assert cuts.endswith("splittings") and r"\Sigma_c$ & Forests" not in section


def test_the_verb_reports_both_files(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("net.toml").write_text(RING)
    assert run(["appendix", "net.toml", "-o", "out.tex", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert (data["file"], data["proofs"]) == ("out.tex", "out.proofs.json")
    assert run(["appendix", "net.toml", "-o", "out.tex", "--quiet"]) == 0
    assert capsys.readouterr().err == "wrote out.tex\nwrote out.proofs.json\n"


@pytest.mark.parametrize("width", [246.0, 345.0])
def test_every_kind_of_proof_compiles(width: float, tmp_path: Path, requires_latex: None) -> None:
    network = read_network_text(
        CHANNELS + "[appendix]\ncertificates = 2\ndigests = true\n")
    text = appendix_text(network, quantities=EVERY_KIND, layout=Layout(width=width),
                         proofs_file="a_rather_long_name_of_a_network.proofs.json")
    check_log(compiled(text, tmp_path))


def test_a_bundle_compiles(tmp_path: Path, requires_latex: None) -> None:
    text = appendix_text(read_network_text(RING), quantities=["d p[A] / d barrier[bind, flip]"])
    assert "matching for" in text and r"\label{eq:bundle}" in text
    check_log(compiled(text, tmp_path))


def test_cycles_that_run_neither_way_are_counted() -> None:
    """Two one-way steps against each other: a row of the proof, no cycle of the document."""
    network = build_network("against", states="A B C", transitions=[
        Rates("A", "B", "a", "b", name="load"), Rates("B", "A", "k", name="drop"),
        Rates("B", "C", "h", name="go"), Rates("C", "A", "f", "g", name="ret")])
    text = appendix_text(network, quantities=["d ln(p[A]/p[C]) / d barrier[ret]"])
    flat = " ".join(text.split())
    assert "let be run neither way" in flat
    assert "& 2 & 2" in flat  # two cycles through ret, two trees without it
