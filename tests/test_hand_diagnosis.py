"""Diagnoses of hand results: injected slips are named, and no finding is contradicted."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import replace
from fractions import Fraction
from functools import cache
from typing import Any

import mpmath
import pytest

from symbolic_response.hand.diagnosis import Finding, diagnose
from symbolic_response.hand.judging.equality import equal
from symbolic_response.network.build import Rates, build_network
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from tests.hand_slips import (
    GRAPHS,
    Graph,
    Slip,
    Steady,
    all_slips,
    point_of,
    swapped,
    value,
    weight_at,
)

OVERALL, FLOOR = Fraction(9, 10), Fraction(1, 2)
ANALYSES = {graph.title: Analysis(graph.network) for graph in GRAPHS}


@cache
def slips() -> list[Slip]:
    return all_slips()


@cache
def diagnosed() -> list[tuple[Slip, tuple[Finding, ...]]]:
    found = []
    for slip in slips():
        network = slip.graph.network
        quantity, hand = (read_quantity(text, network) for text in (slip.quantity, slip.hand))
        found.append((slip, diagnose(ANALYSES[slip.graph.title], quantity, hand)))
    return found


def named(slip: Slip, findings: tuple[Finding, ...]) -> bool:
    return any(all(re.search(pattern, f.text) for pattern in slip.expected) for f in findings)


def points(slip: Slip) -> Iterator[tuple[Mapping[str, Any], Any]]:
    """Yield points and what stands for exp; not to the base 4 where a force is outside it."""
    for seed in range(4):
        at = point_of(slip.graph, seed)
        if slip.exact:
            yield at, None
        else:
            yield {name: mpmath.mpf(int(x)) / 2 for name, x in at.items()}, mpmath.exp


def steady(graph: Graph, at: Mapping[str, Any], exp: Any, **more: Any) -> Steady:
    return Steady(graph, at, **more) if exp is None else Steady(graph, at, exp, **more)


def by_hand(text: str, at: Mapping[str, Any], exp: Any) -> Any:
    return value(text, at) if exp is None else value(text, at, exp)


def test_every_slip_is_a_difference() -> None:
    """Each hand formula differs from the quantity at a witness, by elimination alone."""
    assert len(slips()) >= 100
    for slip in slips():
        gaps = (by_hand(slip.hand, at, exp) - slip.right(steady(slip.graph, at, exp))
                for at, exp in points(slip))
        assert any(abs(gap) > 1e-12 for gap in gaps), slip
        network = slip.graph.network
        derived = closed_form(read_quantity(slip.quantity, network), ANALYSES[slip.graph.title])
        hand = read_quantity(slip.hand, network)
        domain = ANALYSES[slip.graph.title].domain
        assert equal(hand, derived.expression, domain) is False, slip


def test_most_slips_are_named() -> None:
    by_kind: dict[str, list[bool]] = defaultdict(list)
    missed = []
    for slip, findings in diagnosed():
        by_kind[slip.kind].append(named(slip, findings))
        if not by_kind[slip.kind][-1]:
            missed.append((slip, findings))
    for kind, hits in by_kind.items():
        print(f"{kind}: {sum(hits)} of {len(hits)}")
    for slip, findings in missed:
        print(f"missed: {slip.kind}, {slip.graph.title}, {slip.quantity} = {slip.hand[:120]}")
        print(*(f"    {f.kind}: {f.text}" for f in findings), sep="\n")
    everything = [hit for hits in by_kind.values() for hit in hits]
    print(f"all: {sum(everything)} of {len(everything)}")
    assert Fraction(sum(everything), len(everything)) >= OVERALL
    for kind, hits in by_kind.items():
        assert Fraction(sum(hits), len(hits)) >= FLOOR, kind


# -- claims against elimination --------------------------------------------------------------------


def rates_in(graph: Graph, text: str) -> list[tuple[int, bool]]:
    """Return the directed rates that a text names, in order."""
    names = {entry[0]: e for e, entry in enumerate(graph.transitions)}
    found = re.findall(r"\b(\w+) (forward|backward)\b", text)
    return [(names[name], word == "backward") for name, word in found if name in names]


def with_rates(graph: Graph, texts: Mapping[tuple[int, bool], str]) -> Graph:
    """Return a graph with some rates written differently."""
    rows = [(name, a, b, texts.get((e, False), w), v if v is None else texts.get((e, True), v))
            for e, (name, a, b, w, v) in enumerate(graph.transitions)]
    return replace(graph, transitions=tuple(rows))


def quantity_at(text: str, found: Steady) -> Any:
    """Return a probability, current or traffic, None for other quantities."""
    if (match := re.fullmatch(r"p\[([\w, ]+)\]", text)) is not None:
        return sum(found.p[state] for state in match[1].split(", "))
    if (match := re.fullmatch(r"(current|traffic)\[(\w+)\]", text)) is not None:
        e = [entry[0] for entry in found.graph.transitions].index(match[2])
        back = found.flow((e, True)) if e in {x for x, b in found.rates if b} else 0
        return found.flow((e, False)) + back * (1 if match[1] == "traffic" else -1)
    return None


def changed_graph(graph: Graph, text: str) -> tuple[Graph, list[tuple[int, bool]]] | None:
    """Return the graph a finding speaks of, and the rates left out; None for other findings."""
    names = [entry[0] for entry in graph.transitions]
    if (match := re.fullmatch(r"right if (\w+) and (\w+) are exchanged", text)) is not None:
        both = {match[1]: match[2]}
        return with_rates(graph, {r: swapped(graph.rate(r), both) for r in graph.rates()}), []
    if (match := re.fullmatch(r"right if the forward and the backward rate of (\w+) are .*",
                              text)) is not None:
        e = names.index(match[1])
        return with_rates(graph, {(e, b): graph.rate((e, not b)) for b in (False, True)}), []
    if text.startswith("right if the rates ") and text.endswith("are exchanged"):
        one, other = rates_in(graph, text)
        return with_rates(graph, {one: graph.rate(other), other: graph.rate(one)}), []
    if (match := re.fullmatch(r"right if the rate (.*) is put as (.*) throughout",
                              text)) is not None:
        return with_rates(graph, {rates_in(graph, match[1])[0]: f"({match[2]})"}), []
    if (match := re.fullmatch(r"right for .* without the (?:transition|channel) (\w+)",
                              text)) is not None:
        e = names.index(match[1])
        return graph, [rate for rate in graph.rates() if rate[0] == e]
    if "without the rate" in text:
        return graph, rates_in(graph, text)
    return None


def claimed(slip: Slip, text: str, at: Mapping[str, Any], exp: Any) -> Any:
    """Return what a finding says the hand formula is, at a point; None if it is not understood."""
    graph, plain = slip.graph, steady(slip.graph, at, exp)
    if (match := re.fullmatch(r"right for (minus )?(?:the other states, )?(\S.*\]), not for .*",
                              text)) is not None:
        found = quantity_at(match[2], plain)
        return None if found is None else -found if match[1] else found
    if text.startswith("right for the current in the opposite direction"):
        return -slip.right(plain)
    if (match := re.search(r"the hand form is (\S+) times the derived one$", text)) is not None:
        return by_hand(match[1], at, exp) * slip.right(plain)
    changed = changed_graph(graph, text)
    if changed is not None:
        other = steady(changed[0], at, exp, without=changed[1])
        return quantity_at(slip.quantity, other)
    return tree_claim(slip, text, at)


def tree_claim(slip: Slip, text: str, at: Mapping[str, Any]) -> Any:
    """Return N/D with one spanning tree less, or one product more, in either sum or both."""
    match = re.fullmatch(r"the (numerator|normalisation)( and the normalisation)? (?:both )?"
                         r"(lacks?|has|have) (the (?:spanning tree|term).*)", text)
    asked = re.fullmatch(r"p\[([\w, ]+)\]", slip.quantity)
    if match is None or asked is None or ";" in text or "part of" in text:
        return None
    if match[3].startswith("ha") and ("in the place" in text or "rates:" in text):
        return None
    graph = slip.graph
    product = weight_at(graph, tuple(rates_in(graph, match[4])), at)
    if match[3].startswith("lack"):
        product = -product
    above, below = (sum(weight_at(graph, tree, at) for tree in trees) for trees in (
        [t for s in asked[1].split(", ") for t in graph.trees(s)], graph.total()))
    return ((above + product * (match[1] == "numerator"))
            / (below + product * (match[1] == "normalisation" or bool(match[2]))))


def test_no_finding_is_contradicted() -> None:
    """What findings claim, worked out by elimination at points, is the hand formula."""
    understood: dict[str, int] = defaultdict(int)
    for slip, findings in diagnosed():
        for finding in findings:
            for at, exp in points(slip):
                found = claimed(slip, finding.text, at, exp)
                if found is None:
                    break
                assert abs(found - by_hand(slip.hand, at, exp)) < 1e-12, (slip, finding)
            else:
                understood[finding.kind] += 1
    print(dict(understood))
    assert min(understood[kind] for kind in (
        "tree", "exchange", "quantity", "network", "factor", "term")) >= 8


# -- rates that are sums or share symbols, and input of other kinds --------------------------------

TWINS = build_network("twins", states="A B", transitions=[
    Rates("A", "B", "k", "r", "left"), Rates("A", "B", "k", "r", "right")])
SUMS = build_network("sums", states="A B C", transitions=[
    Rates("A", "B", "u + c*v", "r", "ab"), Rates("B", "C", "x", "y", "bc"),
    Rates("C", "A", "z", "w", "ca")])
NUMBERS = build_network("numbers", states="A B C", transitions=[
    Rates("A", "B", 2, 1, "ab"), Rates("B", "C", 3, 1, "bc"), Rates("C", "A", 1, 5, "ca")])


def texts(network: Network, quantity: str, hand: str) -> list[str]:
    sides = (read_quantity(text, network) for text in (quantity, hand))
    return [finding.text for finding in diagnose(Analysis(network), *sides)]


def test_trees_with_the_same_product_are_not_told_apart() -> None:
    first, *_ = texts(TWINS, "p[B]", "2*k/(k + 2*r)")
    assert "lacks one of the 2 spanning trees with the product k" in first
    assert "left forward" in first and "right forward" in first


def test_a_tree_with_a_rate_that_is_a_sum() -> None:
    """Trees towards A: y r, r z, x z; B: (u + c v)(y + z), w y; C: (u + c v) x, w r, w x."""
    below = "y*r + r*z + x*z + (u + c*v)*y + w*y + (u + c*v)*x + w*r + w*x"
    first, *_ = texts(SUMS, "p[A]", f"(y*r + r*z + x*z)/({below})")
    assert first == ("the normalisation lacks the spanning tree towards B: ab forward (u + c*v),"
                     " ca forward (z)")


@pytest.mark.parametrize("network", [TWINS, SUMS, NUMBERS], ids=lambda n: n.title)
def test_any_formula_is_answered(network: Network) -> None:
    e = network.transitions[0].name
    for quantity in (f"current[{e}]", "ln(p[A]/p[B])", f"change(p[A], barrier[{e}], 2)",
                     "entropy_production"):
        for hand in ("0", "1/3", "exp(p[A])", "sqrt(p[A])", "entropy_production/2"):
            if network is not SUMS or hand != "exp(p[A])":
                assert len(texts(network, quantity, hand)) <= 5
