"""Grids of small pictures, read back from their TikZ and compared with brute force."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations, product

import networkx as nx
import pytest
from diagram_networks import GRAPHS, Parsed, ends_of, networks, parsed, two_way
from proof_networks import network_on

from symbolic_response.errors import InputError, QuantityError
from symbolic_response.figures.diagrams import draw
from symbolic_response.topology import Graph

NETWORKS = networks()
ONE_WAY = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0), (0, 2), (1, 3)),
                (False, True, False, False, True, False))
USED = ("branch", "chosen branch")


def steps(graph: Graph) -> list[tuple[int, int]]:
    """All allowed steps of a graph without parallel transitions."""
    return [*graph.ends, *((b, a) for (a, b), one in zip(graph.ends, graph.one_way, strict=True)
                           if not one)]


def directed_forests(graph: Graph, roots: set[int]) -> Iterator[frozenset[tuple[int, int]]]:
    """Every choice of one way out of each other state that leads to a root."""
    others = [k for k in range(graph.size) if k not in roots]
    exits = [[step for step in steps(graph) if step[0] == k] for k in others]
    for choice in product(*exits):
        out = dict(choice)
        if all(leads(out, k) in roots for k in others):
            yield frozenset(choice)


def leads(out: dict[int, int], state: int) -> int:
    for _ in range(len(out) + 1):
        state = out.get(state, state)
    return state


def drawn(picture: Parsed, looks: tuple[str, ...]) -> frozenset[tuple[int, int]]:
    found = [ends_of(picture, line) for look, line in picture.lines if look in looks]
    assert len(set(found)) == len(found)
    return frozenset(found)


def marked(picture: Parsed, look: str) -> list[int]:
    return [k for k, (name, _) in enumerate(picture.marks) if name == look]


@pytest.mark.parametrize(("graph", "transition"), [
    (GRAPHS["square with chord"], 4), (GRAPHS["K4"], 2), (GRAPHS["ladder"], 0), (ONE_WAY, 1),
], ids=["square with chord", "K4", "ladder", "one way"])
def test_each_tree_is_drawn_once(graph: Graph, transition: int) -> None:
    network = network_on(graph)
    for root in range(graph.size):
        drawing = draw(network, "trees", root=root, transition=transition)
        pictures = parsed(drawing.text)
        trees = [drawn(picture, USED) for picture in pictures]
        wanted = list(directed_forests(graph, {root}))
        assert sorted(map(sorted, trees)) == sorted(map(sorted, wanted))
        assert drawing.shown == drawing.total == len(wanted)
        for picture in pictures:
            assert marked(picture, "root") == [root]
            every = [frozenset(ends_of(picture, line)) for _, line in picture.lines]
            assert sorted(map(sorted, every)) == sorted(map(sorted, graph.ends))
            chosen = [line for look, line in picture.lines if "chosen" in look]
            assert [frozenset(ends_of(picture, line)) for line in chosen] == [
                frozenset(graph.ends[transition])]


@pytest.mark.parametrize(("graph", "count"), [
    (GRAPHS["K4"], 4**2), (GRAPHS["K5"], 5**3), (GRAPHS["cube"], 384), (GRAPHS["K33"], 81),
    (two_way(5, [(k, (k + 1) % 5) for k in range(5)]), 5),
], ids=["Cayley 1889: K4", "Cayley 1889: K5", "cube", "K33: m^(n-1) n^(m-1)", "ring"])
def test_published_numbers_of_trees(graph: Graph, count: int) -> None:
    drawing = draw(network_on(graph), "trees", limit=400)
    assert drawing.shown == drawing.total == count
    trees = {drawn(picture, USED) for picture in parsed(drawing.text)}
    assert len(trees) == count
    assert all(len(tree) == graph.size - 1 and all(
        leads(dict(tree), k) == 0 for k in range(graph.size)) for tree in trees)


def test_beyond_the_limit_one_example_is_drawn() -> None:
    drawing = draw(NETWORKS["cube"], "trees", root="s5")
    assert (drawing.shown, drawing.total) == (1, 384)
    (picture,) = parsed(drawing.text)
    tree = drawn(picture, USED)
    assert len(tree) == 7 and all(leads(dict(tree), k) == 5 for k in range(8))
    large = two_way(30, [(a, b) for a, b in combinations(range(30), 2) if b - a < 4])
    assert draw(network_on(large), "trees").total > 10**9
    single = draw(network_on(Graph(5, tuple((k, (k + 1) % 5) for k in range(5)), (True,) * 5)),
                  "trees", root=2, limit=0)
    (picture,) = parsed(single.text)
    assert drawn(picture, USED) == {(3, 4), (4, 0), (0, 1), (1, 2)}


@pytest.mark.parametrize("name", ["square with chord", "K4", "ladder", "K33"])
def test_each_cycle_is_drawn_once_in_its_orientation(name: str) -> None:
    graph = GRAPHS[name]
    pictures = parsed(draw(NETWORKS[name], "cycles").text)
    found = []
    for number, picture in enumerate(pictures, start=1):
        way = dict(drawn(picture, ("along",)))
        walk = [min(way)]
        while len(walk) < len(way):
            walk.append(way[walk[-1]])
        assert way[walk[-1]] == walk[0] and walk[1] < walk[-1]
        assert [latex for _, _, latex in picture.texts] == [f"C_{{{number}}}"]
        found.append(tuple(walk))
    wanted = list(nx.simple_cycles(nx.Graph(list(graph.ends))))
    assert sorted(map(frozenset, found), key=sorted) == sorted(map(frozenset, wanted), key=sorted)
    assert len(set(found)) == len(wanted)


def test_a_cycle_of_two_channels() -> None:
    pictures = parsed(draw(NETWORKS["twin_ferry"], "cycles").text)
    assert [len(drawn(p, ("along",))) for p in pictures] == [2, 3, 3]
    assert drawn(pictures[0], ("along",)) == {(0, 1), (1, 0)}


@pytest.mark.parametrize(("name", "transition"), [
    ("square with chord", 4), ("K4", 0), ("cube", 3), ("dead ends", 3),
])
def test_splittings(name: str, transition: int) -> None:
    graph = GRAPHS[name]
    drawing = draw(NETWORKS[name], "splittings", transition=f"t{transition}")
    whole = nx.Graph(list(graph.ends))
    first, second = graph.ends[transition]
    others = [k for k in range(graph.size) if k not in (first, second)]
    wanted = set()
    for number in range(len(others) + 1):
        for more in combinations(others, number):
            side = {first, *more}
            rest = set(range(graph.size)) - side
            if nx.is_connected(whole.subgraph(side)) and nx.is_connected(whole.subgraph(rest)):
                wanted.add(frozenset(side))
    pictures = parsed(drawing.text)
    assert {frozenset(marked(picture, "in")) for picture in pictures} == wanted
    assert drawing.shown == drawing.total == len(wanted) == len(pictures)
    for picture in pictures:
        side = set(marked(picture, "in"))
        for look, line in picture.lines:
            a, b = ends_of(picture, line)
            cut = (a in side) != (b in side)
            assert look == ("chosen" if {a, b} == {first, second} else "cut" if cut else "inside")


@pytest.mark.parametrize(("graph", "transition", "root"), [
    (GRAPHS["square with chord"], 4, 1), (GRAPHS["K4"], 2, 0), (GRAPHS["K4"], 5, 1),
    (ONE_WAY, 0, 2),
])
def test_forests_and_their_signs(graph: Graph, transition: int, root: int) -> None:
    drawing = draw(network_on(graph), "forests", transition=transition, root=root, limit=100)
    first, second = graph.ends[transition]
    wanted = []
    for other in set(range(graph.size)) - {root}:
        for forest in directed_forests(graph, {root, other}):
            tree = {k for k in range(graph.size) if leads(dict(forest), k) == root}
            if (first in tree) != (second in tree):
                wanted.append(("+" if second in tree else "-", other, sorted(forest)))
    found = [
        (picture.texts[0][2], marked(picture, "other root")[0], sorted(drawn(picture, USED)))
        for picture in parsed(drawing.text)
    ]
    assert sorted(found) == sorted(wanted)
    assert drawing.shown == drawing.total == len(wanted)


@pytest.mark.parametrize("width", [120.0, 246.0, 345.0])
def test_rows_are_no_wider_than_the_text(width: float) -> None:
    drawing = draw(NETWORKS["K4"], "trees", width=width)
    assert sum(len(row) for row in drawing.rows) == 16
    assert drawing.width <= width
    assert all(len(row) <= len(drawing.rows[0]) for row in drawing.rows)


@pytest.mark.parametrize(("arguments", "error", "message"), [
    ({"what": "tree"}, InputError, "did you mean 'trees'"),
    ({"what": "splittings"}, InputError, "name one"),
    ({"what": "forests", "transition": "t9"}, QuantityError, "no transition 't9'"),
    ({"what": "trees", "root": "s9"}, QuantityError, "no state 's9'"),
    ({"what": "trees", "root": 4}, InputError, "from 0 to 3"),
    ({"what": "network", "letters": "w"}, InputError, "'generator' or 'rate'"),
])
def test_wrong_requests_say_so(
    arguments: dict[str, str], error: type[Exception], message: str
) -> None:
    with pytest.raises(error, match=message):
        draw(NETWORKS["K4"], **arguments)  # type: ignore[arg-type]


def test_a_network_without_cycles_says_so() -> None:
    with pytest.raises(InputError, match="no cycles"):
        draw(NETWORKS["pair"], "cycles")
