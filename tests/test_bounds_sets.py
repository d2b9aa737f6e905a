"""Bounds for parameters that scale a set of transitions or of rates: derived here.

The oracle: trees by trying all sets, cycles by trying all sequences of states, W p' = -W' p on
fractions.
"""

import random
from fractions import Fraction
from itertools import combinations

import pytest
from random_networks import Numbers, random_numbers, ring

from symbolic_response.bounds.bundle import rank
from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.decide import Weighted
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated
from symbolic_response.bounds.registry import applicable, claims_for
from symbolic_response.bounds.report import bound, report_text
from symbolic_response.bounds.sides import left_text, right_text
from symbolic_response.bounds.target import Extreme
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, graph_of
from symbolic_response.response.deriving import derive
from symbolic_response.response.values import Point
from symbolic_response.topology import Graph
from symbolic_response.topology.tree_weights import tree_weights

PAIR = Numbers(2, ((0, 1, Fraction(4), Fraction(1)), (0, 1, Fraction(1), Fraction(4))))


def undirected_uses(numbers: Numbers, chosen: set[int]) -> set[int]:
    """Return how many of a set of transitions spanning trees use, one-way steps as if both ways."""
    both = Numbers(numbers.size, tuple(
        (a, b, w, v or Fraction(1)) for a, b, w, v in numbers.transitions))
    return {len({rate // 2 for rate in rates} & chosen) for root, rates, _ in both.trees()
            if root == 0}


def claims_of(network: Network, text: str) -> dict[str, Claim]:
    return {claim.name: claim
            for claim in applicable(read_quantity(text, network), Analysis(network))}


def evaluated(network: Network, claim: Claim) -> Evaluated:
    return ClaimPoint(Analysis(network), Point(network, {})).evaluate(claim)


def left_of(numbers: Numbers, chosen: set[int]) -> Fraction:
    """Return |d ln(p_A/p_B)| as all rates of some transitions are scaled."""
    p, dp = numbers.change([(Fraction(e in chosen),) * 2
                            for e in range(len(numbers.transitions))])
    return abs(dp[0] / p[0] - dp[1] / p[1])


@pytest.mark.parametrize("seed", range(6))
def test_bundles_on_random_networks(seed: int) -> None:
    rng = random.Random(f"bundles {seed}")
    tightest = 0.0
    for _ in range(25):
        numbers = ring(rng, rng.randint(2, 4)) if rng.random() < 0.3 else random_numbers(rng)
        network, count = numbers.network(), len(numbers.transitions)
        if count < 2:
            continue
        chosen = set(rng.sample(range(count), rng.randint(2, count)))
        text = f"d ln(p[A]/p[B]) / d barrier[{', '.join(f't{e}' for e in sorted(chosen))}]"
        claims = claims_of(network, text)
        uses = undirected_uses(numbers, chosen)
        assert ("bundle" in claims) == (max(uses) - min(uses) <= 1)
        directed = [len({rate for rate in rates if rate // 2 in chosen})
                    for _, rates, _ in numbers.trees()]
        found = evaluated(network, claims["directed-bundle"])
        left = left_of(numbers, chosen)
        assert (found.left, found.right_value()) == (left, max(directed) - min(directed))
        assert found.holds is True
        if "bundle" not in claims:
            continue
        assert claims["bundle"].data["used"] == [min(uses), max(uses)]
        found = evaluated(network, claims["bundle"])
        force = numbers.force(lambda cycle, inside=chosen: cycle & inside and cycle - inside)
        expected = Weighted(Fraction(int(max(uses) > min(uses))),
                            force if max(uses) > min(uses) else None)
        assert (found.left, found.right, found.holds) == (left, (expected,), True)
        tightest = max(tightest, float(found.ratio()))
    assert 0.5 < tightest <= 1


def test_a_ring_is_a_bundle_with_any_part_of_it() -> None:
    """Derived here: the complement of a tree of a ring is one transition."""
    rng = random.Random("rings")
    numbers = ring(rng, 5)
    network = numbers.network()
    for count in (2, 3, 4):
        for chosen in combinations(range(5), count):
            names = ", ".join(f"t{e}" for e in chosen)
            claim = claims_of(network, f"d p[A] / d barrier[{names}]")["bundle"]
            assert claim.data["used"] == [count - 1, count]
    whole = claims_of(network, "d p[A] / d barrier[t0, t1, t2, t3, t4]")["bundle"]
    assert right_text(whole, Analysis(network)) == "0"


def test_two_parallel_transitions_reach_the_bound() -> None:
    """Rates 4, 1 and 1, 4: 3/5 = tanh(ln(16)/4), a parameter scaling the first."""
    network = PAIR.network({0: "x"})
    report = bound(network, "d ln(p[A]/p[B]) / d ln x", {"x": 1})
    found = {row.claim.name: row.evaluated for row in report.rows}["bundle"]
    assert found is not None and found.left == Fraction(3, 5)
    assert isinstance(found, Evaluated) and found.ratio() == 1


def test_a_block_has_no_influence_on_the_rest() -> None:
    """Two triangles that share a state: every tree uses two transitions of each."""
    rng = random.Random("blocks")
    for _ in range(10):
        rates = ring(rng, 3).transitions, ring(rng, 3).transitions
        second = [(0 if a == 0 else a + 2, 0 if b == 0 else b + 2, w, v)
                  for a, b, w, v in rates[1]]
        network = Numbers(5, (*rates[0], *second)).network()
        for text in ("ln(p[A]/p[D])", "p[B]", "ln(p[B]/p[C])"):
            quantity = f"d {text} / d barrier[t0, t1, t2]"
            claim = claims_of(network, quantity)["bundle"]
            found = evaluated(network, claim)
            assert (found.left, found.right_value(), found.holds) == (0, 0, True)
        assert claim.data["used"] == [2, 2]
    assert derive(network, "d p[B] / d barrier[t0, t1, t2]").expression == "0"


def test_a_symbol_must_change_whole_transitions_alike() -> None:
    def names(*transitions: Rates) -> set[str]:
        return set(claims_of(build_network("n", states="A B C", transitions=transitions),
                             "d p[A] / d ln x"))

    rest = Rates("C", "A", "1", "2", name="r")
    assert "bundle" in names(Rates("A", "B", "x", "2*x"), Rates("B", "C", "x", "k*x"), rest)
    assert "bundle" in names(Rates("A", "B", "x", None), Rates("B", "C", "x", "k*x"), rest)
    assert "bundle" not in names(Rates("A", "B", "x", "2"), Rates("B", "C", "x", "k*x"), rest)
    assert {"bundle", "directed-bundle"}.isdisjoint(
        names(Rates("A", "B", "x**2", "2*x**2"), Rates("B", "C", "x", "k*x"), rest))
    assert {"bundle", "directed-bundle"}.isdisjoint(
        names(Rates("A", "B", "x", "2*x"), Rates("B", "C", "1/x", "k/x"), rest))


def test_one_power_may_depend_on_the_parameter() -> None:
    network = build_network("n", states="A B", transitions=[
        Rates("A", "B", "k*x**3", "u*x**3", name="e"), Rates("A", "B", "1", "2", name="f")])
    claim = claims_of(network, "d ln(p[A]/p[B]) / d x")["bundle"]
    assert right_text(claim, Analysis(network)) == "3*tanh(abs(ln(2*k/u))/4)/x"
    assert left_text(claim, network) == "abs(d ln(p[A]/p[B]) / d x)"


def test_an_infinite_force() -> None:
    numbers = Numbers(3, ((0, 1, Fraction(1), Fraction(2)), (1, 2, Fraction(3), Fraction(4)),
                          (2, 0, Fraction(5), Fraction(0))))
    claim = claims_of(numbers.network(), "d ln(p[A]/p[B]) / d barrier[t0, t1]")["bundle"]
    assert right_text(claim, Analysis(numbers.network())) == "1"
    assert evaluated(numbers.network(), claim).holds is True


def test_barriers_together_as_single_barriers() -> None:
    """Owen, Gingrich & Horowitz 2020, summed over the transitions."""
    network = ring(random.Random("sum"), 4).network()
    claim = claims_of(network, "d ln(p[A]/p[B]) / d barrier[t0, t1]")["parameter"]
    assert claim.data["barriers"] == {"t0": "1", "t1": "1"} and claim.data["energies"] == {}
    found = evaluated(network, claim)
    assert found.holds is True and [term.factor for term in found.right] == [0, 1, 1]


def test_texts_and_data() -> None:
    network = PAIR.network({0: "x"})
    report = report_text(bound(network, "d ln(p[A]/p[B]) / d ln x", {"x": 1}))
    assert "bundle: abs(d ln(p[A]/p[B]) / d ln x) <= tanh(abs(ln(16))/4)" in report
    assert "cycles through t0 and others (1), each with its force:" in report
    assert "limiting cycle for t0 and others: A -[t0]-> B -[t1]-> A, force ln(16)" in report
    assert "source: derived here; see DEVELOPERS.md" in report
    claim = claims_of(network, "d p[A] / d ln x")["directed-bundle"]
    assert claim.data == {"rates": ["forward[t0]", "backward[t0]"], "used": [0, 1]}


@pytest.mark.parametrize("seed", range(4))
def test_ranks_and_numbers_of_rates_by_enumeration(seed: int) -> None:
    rng = random.Random(f"ranks {seed}")
    for _ in range(40):
        numbers = random_numbers(rng)
        graph = graph_of(numbers.network())
        count = len(numbers.transitions)
        chosen = set(rng.sample(range(count), rng.randint(0, count)))
        assert rank(chosen, graph) == max(undirected_uses(numbers, chosen))
        rates = [(e, back) for e, t in enumerate(numbers.transitions) for back in (False, True)
                 if (t[3] or not back) and rng.random() < 0.5]
        places = {2 * e + back for e, back in rates}
        uses = [len(tree & places) for _, tree, _ in numbers.trees()]
        assert tree_weights(graph, dict.fromkeys(rates, 1)) == (min(uses), max(uses))


def test_large_networks_need_no_enumeration() -> None:
    """The complete graph on 14 states has 14^12 trees towards each state."""
    ends = tuple(combinations(range(14), 2))
    graph = Graph(14, ends, (False,) * len(ends))
    star = [(e, pair[0] != 0) for e, pair in enumerate(ends) if 0 in pair]
    assert tree_weights(graph, {(e, not back): 1 for e, back in star}) == (0, 13)
    assert tree_weights(graph, dict.fromkeys(star, 1)) == (0, 1)  # the rates out of one state
    assert tree_weights(graph, {(e, back): 1 for e, _ in star for back in (False, True)}) == (1, 13)
    assert rank([e for e, _ in star], graph) == 13


def test_a_whole_bound_is_a_single_number_where_the_observable_has_one_value() -> None:
    network = PAIR.network({0: "x"})
    (claim,) = claims_for(read_quantity("d (p[A] + p[B]) / d ln x", network),
                          Analysis(network), "bundle")
    assert not isinstance(claim.right[0].factor, Extreme)
    assert right_text(claim, Analysis(network)) == "0"
