"""The diagrams of a document, read back from its TikZ and its log; counts by brute force."""

from __future__ import annotations

import re
import subprocess
import time
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from functools import cache
from itertools import combinations, pairwise, permutations, product
from pathlib import Path

import pytest
from appendix_networks import ALL, RING
from diagram_networks import GRAPHS, Parsed, ends_of, parsed
from proof_networks import network_on

from symbolic_response.appendix import Layout, appendix_text, figures_section
from symbolic_response.errors import NetworkError
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.toml_reader import read_network, read_network_text
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Graph

WORKED = Path(__file__).parent.parent / "worked_cases"
SHORT = {"bounds": False}
ONE_WAY = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2), (1, 3)),
                (False, True, False, False, True, False))
FEW = ["current[t0]", "d p[s0] / d barrier[t0]", "d p[s1] / d drive[t1]"]
FIGURE = re.compile(r"\\begin\{figure\*?\}\[[^]]*\]\n(.*?)\\end\{figure\*?\}", re.DOTALL)
WIDE_ONE = Layout(width=510.0)


def on_graph(graph: Graph, name: str) -> Network:
    return replace(network_on(graph, name), appendix=SHORT)


NETWORKS = {
    "square": on_graph(GRAPHS["square with chord"], "square"),
    "K4": on_graph(GRAPHS["K4"], "K4"),
    "K5": on_graph(GRAPHS["K5"], "K5"),
    "one way": on_graph(ONE_WAY, "one way"),
    "ring": read_network_text(RING),
    "pair": read_network_text(ALL["pair"]),
}
for _case in ("twin_ferry", "stamp_press"):
    NETWORKS[_case] = read_network(WORKED / _case / "network.toml")
COMPILED = [
    ("square", Layout("revtex", 2)), ("K4", Layout("article", 1, 12)),
    ("K4", Layout("article", 2, 10)), ("K5", Layout("revtex", 2)), ("ring", WIDE_ONE),
    ("twin_ferry", Layout("article", 2, 11)), ("stamp_press", Layout("revtex", 1)),
    ("one way", Layout("article", 1, 11)), ("pair", Layout("article", 1, 10)),
]


@cache
def analysed(name: str) -> Analysis:
    return Analysis(NETWORKS[name])


@cache
def text_of(name: str, layout: Layout = Layout("article", 1, 10)) -> str:  # noqa: B008
    network = NETWORKS[name]
    quantities = FEW if network.states[0].name == "s0" else None
    return appendix_text(network, analysis=analysed(name), layout=layout, quantities=quantities)


def figures(text: str) -> dict[str, str]:
    """Return the figures by label."""
    found = {}
    for body in FIGURE.findall(text):
        label, = re.findall(r"\\label\{(fig:[a-z]*)\}", body)
        assert label not in found
        found[label] = body
    return found


def caption(figure: str) -> str:
    return " ".join(figure.split(r"\caption{")[1].split(r"\label")[0].split())


# -- TeX -------------------------------------------------------------------------------------------


@cache
def logs(folder: Path) -> dict[tuple[str, Layout], tuple[str, str]]:
    """Compile the variants once, two at a time: log and aux."""
    def one(place: int) -> tuple[str, str]:
        where = folder / f"{place}"
        where.mkdir()
        text = texts[place].replace(r"\begin{thebibliography}",
                                    r"\label{sources}\begin{thebibliography}")
        (where / "one.tex").write_text(text, encoding="ascii")
        for _ in range(2):
            subprocess.run(["pdflatex", "-interaction=batchmode", "-halt-on-error", "one.tex"],
                           cwd=where, capture_output=True, timeout=120, check=True)
        return ((where / "one.log").read_text(encoding="latin-1"),
                (where / "one.aux").read_text(encoding="latin-1"))

    texts = [text_of(*case) for case in COMPILED]
    with ThreadPoolExecutor(2) as pool:
        return dict(zip(COMPILED, pool.map(one, range(len(texts))), strict=True))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("figures")


@pytest.mark.parametrize("case", COMPILED, ids=lambda c: f"{c[0]} {c[1].document_class}"
                         f"{c[1].columns}")
def test_nothing_sticks_out_and_figures_come_in_time(
    case: tuple[str, Layout], folder: Path, requires_latex: None
) -> None:
    log, aux = logs(folder)[case]
    assert not re.findall(r"Overfull.*|.*undefined.*|.*multiply.*|.*too large.*", log)
    pages = dict(re.findall(r"\\newlabel\{([a-z:]+)\}\{\{[^}]*\}\{(\d+)\}", aux))
    drawn = {name: int(page) for name, page in pages.items() if name.startswith("fig:")}
    assert set(drawn) == set(figures(text_of(*case)))
    assert max(drawn.values()) <= int(pages["sources"])


@pytest.mark.parametrize("case", COMPILED, ids=lambda c: f"{c[0]} {c[1].document_class}"
                         f"{c[1].columns}")
def test_every_figure_is_referred_to(case: tuple[str, Layout]) -> None:
    text = text_of(*case)
    assert "fig:network" in figures(text) and "fig:trees" in figures(text)
    for label in figures(text):
        place = text.find(rf"\ref{{{label}}}")
        wide = r"\begin{figure*}" in text
        assert place > -1 and (wide or place < text.find(rf"\label{{{label}}}"))
        assert text.count(rf"\label{{{label}}}") == 1
    cited = list(dict.fromkeys(re.findall(r"\\ref\{(fig:[a-z]*)\}", text)))
    assert cited == list(figures(text))


TWO = r"""\documentclass[aps,pre,reprint]{revtex4-2}
%s
\newtheorem{theorem}{Theorem}
\begin{document}
\title{A paper}
\maketitle
\appendix
\input{one}
\input{two}
\end{document}
"""


def test_two_fragments_have_no_label_in_common(tmp_path: Path, requires_latex: None) -> None:
    labels, needed = [], set()
    for prefix, name in (("one", "square"), ("two", "pair")):
        text = text_of(name, Layout("revtex", 2, fragment=True, prefix=prefix))
        (tmp_path / f"{prefix}.tex").write_text(text)
        labels += re.findall(r"\\label\{(.*?)\}", text)
        needed |= {line[4:] for line in text.splitlines() if line.startswith("%   \\use")}
        assert rf"\ref{{{prefix}:fig:network}}" in text
    assert len(labels) == len(set(labels)) and r"\usepackage{tikz}" in needed
    (tmp_path / "a.tex").write_text(TWO % "\n".join(sorted(needed)))
    subprocess.run(["pdflatex", "-interaction=batchmode", "-halt-on-error", "a.tex"], cwd=tmp_path,
                   capture_output=True, timeout=120, check=True)
    log = (tmp_path / "a.log").read_text(encoding="latin-1")
    assert "Overfull" not in log and "multiply" not in log


# -- what is drawn ---------------------------------------------------------------------------------


def drawn_steps(picture: Parsed, looks: tuple[str, ...]) -> frozenset[tuple[int, int]]:
    return frozenset(ends_of(picture, line) for look, line in picture.lines if look in looks)


@pytest.mark.parametrize("name", ["square", "K4", "K5", "ring", "one way"])
def test_cycles_are_those_of_the_table_in_its_order(name: str) -> None:
    """The states of each row of the table, against the arrows of the picture of its number."""
    text = text_of(name, Layout("revtex", 2))
    labels = text_labels(name)
    section = text.split(r"\section{Cycles")[1].split(r"\section{Spanning")[0]
    rows = re.findall(r"^\$(\d+)\$ & (.*?) (?:&|\\\\)", section, re.MULTILINE)
    pictures = parsed(figures(text)["fig:network"])[1:]
    listed = [[labels.index(part.strip()) for part in row.replace("$", "").split(r"\to")]
              for _, row in rows]
    assert [int(number) for number, _ in rows] == list(range(1, len(rows) + 1))
    assert len(pictures) == len(rows) > 0
    for number, (picture, states) in enumerate(zip(pictures, listed, strict=True), start=1):
        assert drawn_steps(picture, ("along",)) == frozenset(pairwise(states))
        (_, _, latex), = picture.texts
        assert latex == rf"\mathcal{{F}}_{{{number}}}"
    assert len(rows) == brute_cycles(analysed(name).graph)
    number = "Its cycle" if len(rows) == 1 else f"Its {len(rows)} cycles"
    assert number in caption(figures(text)["fig:network"])


def text_labels(name: str) -> list[str]:
    """The labels in the picture of the network, in the order of the states."""
    picture = parsed(figures(text_of(name, Layout("revtex", 2)))["fig:network"])[0]
    return [latex for _, _, latex in picture.texts[:len(NETWORKS[name].states)]]


def brute_cycles(graph: Graph) -> int:
    """Closed walks without repetition that can run one way, orientations alike (simple graphs)."""
    allowed = set(ways(graph))
    found = set()
    for size in range(3, graph.size + 1):
        for states in permutations(range(graph.size), size):
            steps = list(pairwise([*states, states[0]]))
            if set(steps) <= allowed:
                found.add(frozenset(map(frozenset, steps)))
    return len(found)


def ways(graph: Graph) -> list[tuple[int, int]]:
    return [*graph.ends, *((b, a) for (a, b), one in zip(graph.ends, graph.one_way, strict=True)
                           if not one)]


def brute_forests(graph: Graph, roots: set[int]) -> Iterator[dict[int, int]]:
    """Every choice of one way out of each other state that leads to a root (simple graphs)."""
    others = [k for k in range(graph.size) if k not in roots]
    for choice in product(*([step for step in ways(graph) if step[0] == k] for k in others)):
        out = dict(choice)
        if all(end_of(out, k) in roots for k in others):
            yield out


def end_of(out: dict[int, int], state: int) -> int:
    for _ in range(len(out) + 1):
        state = out.get(state, state)
    return state


@pytest.mark.parametrize("name", ["square", "K4", "K5", "one way", "ring"])
def test_trees_are_counted_and_drawn(name: str) -> None:
    graph = analysed(name).graph
    figure = figures(text_of(name))["fig:trees"]
    counts = [len(list(brute_forests(graph, {k}))) for k in range(graph.size)]
    roots = [[k for k, (look, _) in enumerate(picture.marks) if look == "root"]
             for picture in parsed(figure)]
    assert all(len(found) == 1 for found in roots)
    shown = [sum(found == [k] for found in roots) for k in range(graph.size)]
    words = caption(figure)
    whole = [k for k in range(graph.size) if shown[k] == counts[k]]
    for k in range(graph.size):
        if k not in whole:
            assert shown[k] == 1 and f": 1 of {counts[k]}" in figure
    named = words.split("circle: ")[1].split(" towards")[0]
    if whole:
        numbers = re.findall(r"\d+", named)
        assert numbers in ([f"{counts[k]}" for k in whole], [f"{counts[whole[0]]}"])
    else:
        assert named == "one"
    if name == "K5":
        assert not whole and counts == [125] * 5  # Cayley
    if name in ("square", "ring"):
        assert len(whole) == graph.size


@pytest.mark.parametrize("name", ["square", "K4", "one way"])
def test_forests_are_counted_and_signed(name: str) -> None:
    """Roots k and one end of e, the other end in the tree of k: by brute force."""
    graph = analysed(name).graph
    first, second = graph.ends[0]
    signed: list[tuple[str, list[tuple[int, int]]]] = []
    for other in range(1, graph.size):
        for out in brute_forests(graph, {0, other}):
            sides = [end_of(out, first), end_of(out, second)]
            if sides[0] != sides[1]:
                signed.append(("+" if sides[1] == 0 else "-", sorted(out.items())))
    figure = figures(text_of(name))["fig:forests"]
    pictures = parsed(figure)
    found = [(picture.texts[0][2], sorted(drawn_steps(picture, ("branch",))))
             for picture in pictures]
    assert sorted(found) == sorted(signed)
    assert f"The {len(signed)} spanning forests" in caption(figure)
    assert r"\Phi_{" in caption(figure)


@pytest.mark.parametrize("name", ["square", "K4", "K5", "one way"])
def test_splittings_are_counted_and_drawn(name: str) -> None:
    graph = analysed(name).graph
    figure = figures(text_of(name))["fig:splittings"]
    every = [brute_splittings(graph, e) for e in (0, 1)]
    sets = [frozenset(k for k, (look, _) in enumerate(picture.marks) if look == "in")
            for picture in parsed(figure)]
    assert sets == [*sets[:len(every[0])], *sets[len(every[0]):]]
    assert set(sets[:len(every[0])]) == every[0] and set(sets[len(every[0]):]) == every[1]
    assert len(sets) == len(every[0]) + len(every[1])
    assert re.findall(r"(\d+) of \$", caption(figure)) == [f"{len(found)}" for found in every]


def brute_splittings(graph: Graph, e: int) -> set[frozenset[int]]:
    first, second = graph.ends[e]
    sets = [frozenset(inside) for size in range(1, graph.size)
            for inside in combinations(range(graph.size), size)
            if first in inside and second not in inside]
    return {inside for inside in sets
            if connected(graph, inside) and connected(graph, frozenset(range(graph.size)) - inside)}


def connected(graph: Graph, states: frozenset[int]) -> bool:
    reached = {min(states)}
    for _ in states:
        reached |= {b for a, b in [*graph.ends, *(ends[::-1] for ends in graph.ends)]
                    if a in reached and b in states}
    return reached == states


def test_the_perturbed_transition_is_set_off_in_trees() -> None:
    graph = analysed("square").graph
    for picture in parsed(figures(text_of("square"))["fig:trees"]):
        chosen = [frozenset(ends_of(picture, line)) for look, line in picture.lines
                  if "chosen" in look]
        assert chosen == [frozenset(graph.ends[0])]


# -- options and limits ----------------------------------------------------------------------------


def with_section(section: str) -> Network:
    return read_network_text(f"{RING}\n[appendix]\n{section}\n")


@pytest.mark.parametrize("layout", [Layout(), Layout(fragment=True, prefix="x")])
def test_diagrams_can_be_left_out(layout: Layout) -> None:
    text = appendix_text(with_section("diagrams = false"), layout=layout)
    assert "tikz" not in text and r"\begin{figure" not in text and "fig:" not in text
    assert "tikz" in appendix_text(with_section("diagrams = true"), layout=layout)


def test_a_faulty_key_is_refused() -> None:
    with pytest.raises(NetworkError, match=r"^\[appendix\] diagrams is not true or false$"):
        appendix_text(with_section('diagrams = "no"'))


def test_what_is_too_large_is_left_out_with_a_sentence() -> None:
    size = 34
    ring = build_network("ring", states=[f"s{k}" for k in range(size)], transitions=[
        Rates(f"s{k}", f"s{(k + 1) % size}", "u", "v") for k in range(size)])
    text = appendix_text(replace(ring, appendix=SHORT), quantities=["current[s0_s1]"])
    assert "with its 34 states, is too large for diagrams" in text and "fig:" not in text


def test_more_cycles_than_the_limit() -> None:
    """Fundamental cycles are listed then, and drawn in their order."""
    network = NETWORKS["K5"]
    text = appendix_text(network, analysis=Analysis(network, cycle_limit=20),
                         quantities=["current[t0]"])
    figure = figures(text)["fig:network"]
    assert "The 6 fundamental cycles of the list, of more than 20," in caption(figure)
    assert len(parsed(figure)) == 7  # transitions - states + 1, and the network
    assert "fig:splittings" not in text


def test_the_cube_is_drawn_in_a_second(monkeypatch: pytest.MonkeyPatch) -> None:
    """A ratio to the time of the rest of a small document, so that a slow machine passes."""
    spent = []

    def timed(*given: object) -> object:
        start = time.perf_counter()
        made = figures_section.diagrams(*given)  # type: ignore[arg-type]
        spent.append(time.perf_counter() - start)
        return made

    monkeypatch.setattr("symbolic_response.appendix.document.diagrams", timed)
    start = time.perf_counter()
    text = appendix_text(on_graph(GRAPHS["cube"], "cube"), quantities=FEW)
    whole = time.perf_counter() - start
    assert spent[0] < max(1.0, 0.5 * whole)
    assert "Its 28 cycles" in caption(figures(text)["fig:network"])
    assert "1 of 384" in figures(text)["fig:trees"]
    assert "One of the 896" in caption(figures(text)["fig:forests"])
