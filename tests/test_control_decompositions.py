"""Changes of rates, their decompositions, and those that a network file gives."""

from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from proof_networks import strong_graphs

from symbolic_response.control.changes import change_of
from symbolic_response.control.decomposition import (
    Decomposition,
    Piece,
    check_sum,
    linear_form,
    piece_sums,
    sparsest,
    tightest,
)
from symbolic_response.control.family import family_of
from symbolic_response.control.program import optimum
from symbolic_response.control.user_decomposition import parameter_of, user_decomposition
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.reader import read_expression
from symbolic_response.expressions.tree import ONE, ZERO, add, negate, number
from symbolic_response.network import Network, Rates, build_network, read_network
from symbolic_response.network.entries import DocumentError
from symbolic_response.network.quantities import BarrierOf, BarriersOf, BySymbol, DriveOf, EnergyOf
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes
from symbolic_response.topology import Graph

F = Fraction
LN_C = BySymbol("c", True)
FACTORS = ("1", "c", "c**2", "1/c", "sqrt(c)", "(k + c)", "c/(k + c)", "1/(1 + c/k)")


def with_factors(graph: Graph, factors: list[str]) -> Network:
    """Return a network whose rates are numbers times factors of c and k."""
    drawn = iter(factors)
    transitions = [
        Rates(f"s{a}", f"s{b}", f"2*{next(drawn)}", None if single else f"3*{next(drawn)}",
              name=f"t{e}")
        for e, ((a, b), single) in enumerate(zip(graph.ends, graph.one_way, strict=True))]
    transitions.append(Rates("s0", "s1", "k*c", "1", name="also"))
    return build_network("drawn", states=[f"s{k}" for k in range(graph.size)],
                         symbols={"c": {}, "k": {}}, transitions=transitions)


@st.composite
def networks(draw: st.DrawFn) -> Network:
    graph = draw(strong_graphs(max_size=4, extra=2))
    count = 2 * len(graph.ends)
    return with_factors(graph, draw(st.lists(st.sampled_from(FACTORS), min_size=count,
                                             max_size=count)))


def sums_to_change(made: Decomposition, analysis: Analysis) -> bool:
    changes = rate_changes(LN_C, analysis)
    return all(
        normal_form(add([given_, negate(changes.get(r, ZERO))]), analysis.domain).is_zero()
        for r, given_ in enumerate(piece_sums(made, analysis)))


@settings(max_examples=50, deadline=None)
@given(networks(), st.fractions(0, 1, max_denominator=9))
def test_decompositions_sum_to_the_change(network: Network, t: Fraction) -> None:
    analysis = Analysis(network)
    change, family = change_of(analysis, LN_C), family_of(analysis)
    for made in (sparsest(analysis, change, family),
                 tightest(analysis, change, family, [t] * len(family.bundles))):
        assert sums_to_change(made, analysis)
        again = user_decomposition(analysis, LN_C, made.data(network))
        assert sums_to_change(again, analysis)
        if change.parts:
            continue
        pair, other = (linear_form(d, analysis).numbers() for d in (made, again))
        assert pair is not None and other is not None and sorted(pair[1].items()) == sorted(
            other[1].items()) and pair[0] == other[0]
        least = optimum(family, change.numbers, [t] * len(family.bundles)).value
        at_t = pair[0] + t * sum(pair[1].values())
        assert at_t >= least
    if not change.parts:
        assert at_t == least


def test_numbers_apart_from_expressions() -> None:
    network = build_network("mixed", states=["A", "B"], symbols={"c": {}, "k": {}}, transitions=[
        Rates("A", "B", "k + c", "c**2*k", name="one"),
        Rates("A", "B", "k*c/(k + c)", "(k + c)**3", name="two"),
        Rates("A", "B", "exp(c)", "c*exp(-2*c)", name="three"),
    ])
    change = change_of(Analysis(network), LN_C)
    share, linear = read_expression("c/(k + c)"), read_expression("c")
    assert [normal_form(add([s, negate(e)]), Analysis(network).domain).is_zero()
            for (s, _), e in zip(change.parts, (share, linear), strict=True)] == [True, True]
    assert change.numbers == tuple(map(F, (0, 2, 1, 0, 0, 1)))
    assert [u for _, u in change.parts] == [tuple(map(F, (1, 0, -1, 3, 0, 0))),
                                            tuple(map(F, (0, 0, 0, 0, 1, -2)))]


def test_a_symbolic_change_is_limited_part_by_part() -> None:
    """Both rates of one transition grow with 1 + c: c/(1 + c) times its tanh."""
    network = build_network("leak", states=["A", "B"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "2*(1 + c)", "1 + c", name="one"), Rates("A", "B", "1", "3", name="two")])
    analysis = Analysis(network)
    family = family_of(analysis)
    made = tightest(analysis, change_of(analysis, LN_C), family, [F(1, 2)])
    assert linear_form(made, analysis).text(network) == "(c/(c + 1))*t[one]"


def test_an_energy_is_one_piece() -> None:
    network = build_network("out", states=["A", "B", "C"], symbols={"c": {}}, transitions=[
        Rates("A", "B", "c", "1"), Rates("B", "C", "1", "2"), Rates("C", "A", "3", "c")])
    analysis = Analysis(network)
    made = sparsest(analysis, change_of(analysis, LN_C), family_of(analysis))
    assert made == Decomposition((ONE, ZERO, ZERO)) and made.count == 1
    assert linear_form(made, analysis).text(network) == "1"


@pytest.mark.parametrize("directed", [True, False])
def test_elementary_changes_are_one_piece(directed: bool) -> None:
    network = build_network("square", states=list("ABCD"), symbols={"c": {}}, transitions=[
        Rates(a, b, "c" if a + b == "CD" else "1", "2", name=a + b)
        for a, b in ("AB", "BC", "CD", "DA", "AC")])
    analysis = Analysis(network)
    family = family_of(analysis, directed=directed)
    found = {by: sparsest(analysis, change_of(analysis, by), family)
             for by in (EnergyOf(0), BarrierOf(1), BarriersOf((0, 1)), DriveOf(4), LN_C)}
    assert found[EnergyOf(0)] == Decomposition((ONE, ZERO, ZERO, ZERO))
    assert found[BarrierOf(1)].bundles == (Piece((1,), number(-1)),)
    assert found[BarriersOf((0, 1))].bundles == (Piece((0, 1), number(-1)),)
    assert found[DriveOf(4)].drives == (Piece((4,), ONE),)
    counts = [made.count for made in found.values()]
    assert counts == [1, 1, 1, 1, 1 if directed else 2]
    if directed:
        assert found[LN_C].directed == (Piece((4,), ONE),)


def test_bundles_of_barriers_and_free_blocks() -> None:
    network = build_network("two rings", states=list("ABC"), transitions=[
        Rates("A", "B", "1", "2", name="a"), Rates("A", "B", "3", "1", name="b"),
        Rates("B", "C", "1", "1", name="c")])
    analysis = Analysis(network)
    family = family_of(analysis)
    by = BarriersOf((0, 2))
    made = sparsest(analysis, change_of(analysis, by), family)
    assert made.bundles == (Piece((0,), number(-1)),) and made.blocks == (Piece((2,), number(-1)),)
    assert linear_form(made, analysis).text(network) == "t[a]"


# -- decompositions of the user's own --------------------------------------------------------------

TEXT = """
title = "ring"
symbols.c = {}
symbols.q = {}
states = {A = {}, B = {}, C = {}}
[[transitions]]
name = "bind"
between = ["A", "B"]
rates = ["c*q", "c"]
[[transitions]]
name = "flip"
between = ["B", "C"]
rates = ["2*c", "c"]
[[transitions]]
name = "leave"
between = ["C", "A"]
rates = ["5"]
[[transitions]]
name = "tail"
between = ["C", "A"]
rates = ["c**2", "1"]
"""


@pytest.fixture
def analysis(tmp_path: object) -> Analysis:
    path = tmp_path / "ring.toml"  # type: ignore[operator]
    path.write_text(TEXT + """
[[control]]
parameter = "ln c"
bundles = [{transitions = ["bind", "flip"], amount = "1"}]
drives = {tail = 1}
directed = [{rates = ["forward[tail]"], amount = "1"},
            {rates = ["forward[tail]", "backward[tail]"], amount = 0.5}]
""", encoding="utf-8")
    return Analysis(read_network(path))


def test_an_entry_of_the_file(analysis: Analysis) -> None:
    (entry,) = analysis.network.control
    by = parameter_of(entry, analysis.network)
    assert by == LN_C
    made = user_decomposition(analysis, by, entry)
    assert made.bundles == (Piece((0, 1), ONE),) and made.count == 4
    # both rates of one transition: a tree uses one of them or none
    assert linear_form(made, analysis).text(analysis.network) == "5/2 + t[bind, flip]"


def test_a_set_of_rates_of_several_states(analysis: Analysis) -> None:
    """Of the rates bind and flip forward a tree uses up to two."""
    entry = {"directed": [
        {"rates": ["forward[bind]", "forward[flip]"], "amount": "1"},
        {"rates": ["backward[bind]"], "amount": 1}, {"rates": ["backward[flip]"], "amount": "1"},
        {"rates": ["forward[tail]"], "amount": "2"}]}
    made = user_decomposition(analysis, LN_C, entry)
    assert linear_form(made, analysis).text(analysis.network) == "6"


def test_amounts_may_hold_symbols(analysis: Analysis) -> None:
    entry = {"energies": {"A": "q/(1 + q)", "B": "0"}, "directed": [
        {"rates": ["forward[bind]", "backward[tail]"], "amount": "-q/(1 + q)"}],
        "bundles": [{"transitions": ["flip"], "amount": 1}, {"transitions": ["bind"], "amount": 1},
                    {"transitions": ["tail"], "amount": 1}],
        "drives": {"tail": "2"}}
    with pytest.raises(DocumentError, match=r"d ln\(forward\[tail\]\) / d ln c: they give"):
        user_decomposition(analysis, LN_C, {**entry, "drives": {"tail": "q"}})
    made = user_decomposition(analysis, LN_C, entry)
    assert sums_to_change(made, analysis)


@pytest.mark.parametrize(("entry", "message"), [
    ({"bundles": [{"transitions": ["bind"], "amount": "1/2"}]},
     "the pieces do not sum to d ln(forward[bind]) / d ln c: they give 1/2, it is 1"),
    ({}, "the pieces do not sum to d ln(forward[bind]) / d ln c: they give 0, it is 1"),
    ({"energies": {"A": "q"}},
     "the pieces do not sum to d ln(forward[bind]) / d ln c: they give q, it is 1"),
    ({"energies": {"a": "1"}}, "there is no state 'a'; did you mean 'A'?"),
    ({"energies": ["A"]}, 'energies is an array; write energies = {name = "amount"}'),
    ({"energies": {"A": "1 +"}}, "energies of 'A': "),
    ({"energies": {"A": "r"}}, "energies of 'A': the symbol 'r' is not declared"),
    ({"drives": {"bimd": "1"}}, "there is no transition 'bimd'; did you mean 'bind'?"),
    ({"drives": {"bind": True}}, "drives of 'bind' is true; write an exact number"),
    ({"bundle": []}, "a control entry has no key 'bundle'; did you mean 'bundles'?"),
    ({"bundles": {"transitions": ["bind"]}}, "bundles is a table; write bundles = [{transitions"),
    ({"bundles": [["bind"]]}, "entry 1 of bundles is an array; write bundles = [{transitions"),
    ({"bundles": [{"amount": "1"}]}, "entry 1 of bundles has no transitions; write"),
    ({"bundles": [{"transitions": ["bind"]}]}, "entry 1 of bundles has no amount; write"),
    ({"bundles": [{"transitions": "bind", "amount": 1}]},
     "transitions of entry 1 of bundles is a text; write"),
    ({"bundles": [{"transitions": [3], "amount": 1}]}, "3 is a number; write a name in quotes"),
    ({"bundles": [{"transitions": [], "amount": 1}]}, "entry 1 of bundles names none of its"),
    ({"bundles": [{"transitions": ["bind", "bind"], "amount": 1}]},
     "entry 1 of bundles names one twice of its transitions"),
    ({"bundles": [{"transitions": ["bind", "tail"], "amount": 1}, {"rates": [], "amount": 1}]},
     "entry 2 of bundles has no key 'rates'"),
    ({"directed": [{"rates": ["backward[leave]"], "amount": "1"}]},
     "'backward[leave]' does not exist: the transition is one-way"),
    ({"directed": [{"rates": ["bind"], "amount": "1"}]},
     "'bind' is not a rate; write forward[...] or backward[...]"),
    ({"directed": [{"rates": ["forward[bimd]"], "amount": "1"}]}, "there is no transition 'bimd'"),
    ({"parameter": "ln c", "observables": []}, "a control entry has no key 'observables'"),
])
def test_entries_that_cannot_be_used(
    analysis: Analysis, entry: dict[str, object], message: str
) -> None:
    with pytest.raises(DocumentError) as caught:
        user_decomposition(analysis, LN_C, entry, ("control", 0))
    assert message in str(caught.value) and "\n" not in str(caught.value)
    assert caught.value.place[:2] == ("control", 0)


def test_transitions_that_are_no_bundle() -> None:
    """Two opposite transitions of a square with both diagonals."""
    pairs = ["AB", "BC", "CD", "DA", "AC", "BD"]
    network = build_network("full", states=list("ABCD"), symbols={"c": {}}, transitions=[
        Rates(a, b, "c" if a + b in ("AB", "CD") else "1", "2", name=a + b) for a, b in pairs])
    with pytest.raises(DocumentError, match="a spanning tree uses between 0 and 2 of them"):
        user_decomposition(Analysis(network), LN_C,
                           {"bundles": [{"transitions": ["AB", "CD"], "amount": "1/2"}]})


@pytest.mark.parametrize(("entry", "message"), [
    ({}, "a control entry has no parameter"),
    ({"parameter": 3}, "parameter is not a line of text"),
    ({"parameter": "ln x"}, "parameter: in 'ln x': "),
    ({"parameter": "energy[A]"}, "parameter 'energy[A]': write a symbol, or ln of one"),
])
def test_parameters_that_cannot_be_used(
    analysis: Analysis, entry: dict[str, object], message: str
) -> None:
    with pytest.raises(DocumentError) as caught:
        parameter_of(entry, analysis.network, ("control", 2))
    assert message in str(caught.value) and caught.value.place[:2] == ("control", 2)


def test_further_keys_can_be_allowed(analysis: Analysis) -> None:
    (entry,) = analysis.network.control
    user_decomposition(analysis, LN_C, {**entry, "observables": []}, also=("observables",))


def test_sums_are_checked_for_what_is_handed_in(analysis: Analysis) -> None:
    with pytest.raises(QuantityError, match=r"forward\[bind\]"):
        check_sum(Decomposition((ZERO,) * 3), analysis, LN_C)


def test_the_fewest_pieces_where_three_suffice() -> None:
    """A lubricated step and one rate: two pieces, though halves of larger bundles cost as much."""
    valve = read_network(Path(__file__).parent.parent / "worked_cases/dew_valve/network.toml")
    analysis = Analysis(valve)
    made = sparsest(analysis, change_of(analysis, BySymbol("m", True)), family_of(analysis))
    data = made.data(valve)
    assert made.count == 2
    assert data["bundles"] == [{"transitions": ["slide"], "amount": "1"}]
    assert data["directed"] == [{"rates": ["forward[soak]"], "amount": "1"}]
