"""Generator against checker, which share no code: random networks, both verdicts."""

from __future__ import annotations

import copy
import json
from collections.abc import Iterator
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st
from proof_networks import network_on, strong_graphs

from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.record import record_of, record_text
from symbolic_response.checker import check_record
from symbolic_response.errors import QuantityError
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology import Graph

AMOUNTS = ("2", "-1/3", "2*ln(3/2)", "ln(u0)")


@st.composite
def questions(draw: st.DrawFn, graph: Graph) -> str:
    """Responses of every kind that proofs speak of."""
    e = draw(st.integers(0, len(graph.ends) - 1))
    i, j = draw(st.permutations(range(graph.size)))[:2]
    target = draw(st.sampled_from([f"ln(p[s{i}]/p[s{j}])", f"p[s{i}]", f"p[s{i}]/p[s{j}]"]))
    others = [f"t{other}" for other in range(len(graph.ends)) if other != e]
    forms = [f"d {target} / d barrier[t{e}]", f"d {target} / d drive[t{e}]",
             f"d {target} / d energy[s{i}]", f"d {target} / d ln u{e}",
             f"d current[t{e}] / d barrier[t{e}]", f"d current[t{e}] / d drive[t{e}]",
             f"d (d ln(p[s{i}]/p[s{j}]) / d barrier[t{e}]) / d barrier[t{e}]",
             f"change(ln(p[s{i}]/p[s{j}]), barrier[t{e}], {draw(st.sampled_from(AMOUNTS))})",
             f"p[s{i}]/p[s{j}]"]
    if others:
        forms.append(f"d {target} / d barrier[t{e}, {draw(st.sampled_from(others))}]")
    return draw(st.sampled_from(forms))


def record_for(network: Network, text: str) -> Any:
    """Return the record of all that can be proved, None where an infinite path bound is refused."""
    analysis = Analysis(network)
    try:
        made = certify(analysis, text, method="proof")
    except QuantityError:
        assert " / d " not in text  # a one-way path makes the path bound infinite
        return None
    assert not made.without, made.without
    return json.loads(record_text(record_of(made, analysis)))


def leaves(value: Any, path: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """Yield the places of all integers and texts inside the proofs."""
    if isinstance(value, dict):
        for key, inner in value.items():
            if key not in ("form", "kind"):
                yield from leaves(inner, (*path, key))
    elif isinstance(value, list):
        for place, inner in enumerate(value):
            yield from leaves(inner, (*path, place))
    else:
        yield path


def changed(record: Any, path: tuple[Any, ...], step: int) -> Any:
    damaged = copy.deepcopy(record)
    inner = damaged
    for key in path[:-1]:
        inner = inner[key]
    old = inner[path[-1]]
    if isinstance(old, int):
        inner[path[-1]] = old + step
    elif "/" in old or old.lstrip("-").isdigit():
        inner[path[-1]] = str(int(old.split("/")[0]) + step)
    else:
        inner[path[-1]] = old[0] + str((int(old[1:]) + 1) % 3)
    return damaged, inner[path[-1]] != old


@settings(max_examples=200, deadline=None)
@given(st.data())
def test_what_is_proved_is_accepted_and_what_is_damaged_is_not(data: st.DataObject) -> None:
    graph = data.draw(strong_graphs())
    network = network_on(graph)
    record = record_for(network, data.draw(questions(graph)))
    if record is None:
        return
    verdict = check_record(record)
    assert verdict.status == "valid", str(verdict)
    places = [("trees", k) for k in range(len(record["trees"] or ()))]
    places += [("proofs", *path) for path in leaves(record["proofs"])]
    if places:
        path = data.draw(st.sampled_from(places))
        damaged, differs = changed(record, path, data.draw(st.sampled_from((-1, 1, 2))))
        if differs:
            assert check_record(damaged).status in ("invalid", "malformed"), path


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_a_row_left_out_or_said_twice_is_noticed(data: st.DataObject) -> None:
    graph = data.draw(strong_graphs())
    record = record_for(network_on(graph), data.draw(questions(graph)))
    if record is None:
        return
    lists = [(proof, key) for proof in record["proofs"]
             for key in ("cycles", "splittings", "paths", "pairs") if proof.get(key)]
    lists += [(record, "trees")] if record["trees"] else []
    if not lists:
        return
    owner, key = data.draw(st.sampled_from(lists))
    place = data.draw(st.integers(0, len(owner[key]) - 1))
    row = owner[key].pop(place)
    assert check_record(record).status in ("invalid", "malformed"), key
    owner[key][place:place] = [row, row]
    assert check_record(record).status in ("invalid", "malformed"), key


@settings(max_examples=40, deadline=None)
@given(st.data())
def test_the_proofs_of_another_network_are_refused(data: st.DataObject) -> None:
    """A further transition, or one turned round, is another network."""
    graph = data.draw(strong_graphs())
    e = data.draw(st.integers(0, len(graph.ends) - 1))
    record = record_for(network_on(graph), f"d p[s0] / d barrier[t{e}]")
    first = record["network"]["transitions"][0]
    record["network"]["transitions"].append({**first, "name": "more"})
    assert check_record(record).status in ("invalid", "malformed")
