"""The table of proofs: kind, size, time to find, time to check; and a general prover beside it.

Run as ``python -m tests.benchmarks.proofs``. Every transition of every network, every inequality of
the catalogue that applies; a claim without a proof or a record that the checker does not accept
ends the run.
"""

from __future__ import annotations

import importlib.util
import json
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import combinations

import networkx as nx

from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.proofs.record import form_of, kind_of
from symbolic_response.certificates.record import record_of, record_text
from symbolic_response.checker import check_record
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.text import expression_text
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.response.analysis import Analysis, graph_of
from symbolic_response.topology import spanning_trees
from tests.benchmarks.networks import complete, cube, ladder, network_of, square_with_chord
from tests.benchmarks.timing import Row, compare


def ring(n: int) -> Network:
    """Return the ring of n states."""
    return network_of(nx.cycle_graph(n), f"ring of {n} states")


def two_channels() -> Network:
    """Return a ring of three states, two of them joined by two channels."""
    return build_network("two channels in a ring", states="s1 s2 s3", transitions=[
        Rates("s1", "s2", "W_2_1", "W_1_2", name="e1_2"),
        Rates("s1", "s2", "V_2_1", "V_1_2", name="f1_2"),
        Rates("s2", "s3", "W_3_2", "W_2_3", name="e2_3"),
        Rates("s3", "s1", "W_1_3", "W_3_1", name="e3_1")])


def one_way_ring() -> Network:
    """Return a ring of four states with a one-way step."""
    return build_network("ring with a one-way step", states="s1 s2 s3 s4", transitions=[
        Rates("s1", "s2", "W_2_1", "W_1_2", name="e1_2"),
        Rates("s2", "s3", "W_3_2", "W_2_3", name="e2_3"),
        Rates("s3", "s4", "W_4_3", "W_3_4", name="e3_4"),
        Rates("s4", "s1", "W_1_4", None, name="e4_1")])


def listed() -> list[Network]:
    """Return the networks of the table."""
    return [ring(3), ring(4), ring(5), square_with_chord(), complete(4), complete(5), ladder(3),
            cube(), two_channels(), one_way_ring()]


def questions(network: Network) -> Iterator[tuple[str, str]]:
    """Yield what is asked of a network, each with a heading."""
    ends = "p[s1]/p[s2]"
    for t in network.transitions:
        name = t.name
        a, b = network.states[t.first].name, network.states[t.second].name
        yield "barrier, ratio", f"d ln({ends}) / d barrier[{name}]"
        yield "barrier, probability", f"d p[{a}] / d barrier[{name}]"
        yield "drive, probability", f"d p[{a}] / d drive[{name}]"
        yield "second order", f"d (d ln({ends}) / d barrier[{name}]) / d barrier[{name}]"
        yield "finite change", f"change(ln({ends}), barrier[{name}], 2*ln(3/2))"
        yield "current", f"d current[{name}] / d barrier[{name}]"
        yield "current", f"d current[{name}] / d drive[{name}]"
        yield "one rate", f"d p[{b}] / d ln {symbol_of(network, name)}"
        yield "path", f"p[{b}]/p[{a}]"
    for state in network.states:
        yield "energy", f"d p[{state.name}] / d energy[{state.name}]"
    for one, other in pairs_of_order_one(network):
        yield "bundle", f"d ln({ends}) / d barrier[{one}, {other}]"


def symbol_of(network: Network, name: str) -> str:
    """Return the symbol that is the forward rate of a transition."""
    (transition,) = (t for t in network.transitions if t.name == name)
    return expression_text(transition.forward)


def pairs_of_order_one(network: Network) -> list[tuple[str, str]]:
    """Return the pairs of transitions of which every tree uses r or r + 1."""
    masks = [int(mask) for mask in spanning_trees(graph_of(network)).masks]
    found = []
    for i, j in combinations(range(len(network.transitions)), 2):
        used = {(mask >> i & 1) + (mask >> j & 1) for mask in masks}
        if len(used) == 2:
            found.append((network.transitions[i].name, network.transitions[j].name))
    return found


@dataclass
class Line:
    """The figures of one heading of one network."""

    proofs: set[str]
    records: int = 0
    claims: int = 0
    size: int = 0
    found: float = 0.0
    checked: float = 0.0


def lines(network: Network) -> dict[str, Line]:
    """Certify and check all that is asked of a network."""
    table: dict[str, Line] = {}
    for heading, text in questions(network):
        line = table.setdefault(heading, Line(set()))
        start = time.perf_counter()
        analysis = Analysis(network)
        try:
            made = certify(analysis, text, method="proof")
        except QuantityError:
            if heading != "path":  # that of a ratio is infinite through a one-way step
                raise
            continue
        record = record_text(record_of(made, analysis))
        line.found += time.perf_counter() - start
        assert not made.without, (network.title, text, made.without)
        start = time.perf_counter()
        verdict = check_record(json.loads(record))
        line.checked += time.perf_counter() - start
        assert verdict.status == "valid", (network.title, text, str(verdict))
        line.proofs |= {" ".join(filter(None, (kind_of(proof), form_of(proof))))
                        for proof in made.proved.proofs} or {"pieces"}
        line.records += 1
        line.claims += len(made.proved.claims)
        line.size += len(record.encode())
    return table


def inequality(network: Network, name: str) -> Callable[[], object]:
    """Return the barrier bound of p[s1]/p[s2] as a question to a general solver (z3, nlsat).

    All rates free and positive; s at least the square root of exp of every cycle force, either way;
    is abs(response) (s + 1) > s - 1 possible?
    """
    import z3

    analysis = Analysis(network)
    e = [t.name for t in network.transitions].index(name)
    rates = [z3.Real(f"x{place}") for place in range(len(analysis.rates.ring.generators))]

    def polynomial(poly: object) -> object:
        total = z3.RealVal(0)
        for exponents, coefficient in poly.terms():  # type: ignore[attr-defined]
            term = z3.RealVal(int(coefficient))
            for rate, power in zip(rates, exponents, strict=True):
                for _ in range(int(power)):
                    term = term * rate
            total = total + term
        return total

    whole = [polynomial(analysis.tree_sum(k)) for k in (0, 1)]
    free = [polynomial(analysis.tree_sum_without(k, e)) for k in (0, 1)]
    response = (whole[0] - free[0]) * free[1] - (whole[1] - free[1]) * free[0]
    s = z3.Real("s")
    conditions = [rate > 0 for rate in rates] + [s >= 1]
    for cycle in analysis.cycles:
        if e in cycle.transitions:
            along = against = z3.RealVal(1)
            for t, ahead in zip(cycle.transitions, cycle.along, strict=True):
                back = analysis.rates.backward[t]
                assert back is not None
                one, other = rates[analysis.rates.forward[t]], rates[back]
                along, against = (along * one, against * other) if ahead else (
                    along * other, against * one)
            conditions += [s * s * against >= along, s * s * along >= against]
    most = (s - 1) * whole[0] * whole[1]
    conditions.append(z3.Or(response * (s + 1) > most, -response * (s + 1) > most))

    def work() -> None:
        solver = z3.Tactic("qfnra-nlsat").solver()
        solver.add(*conditions)
        assert solver.check() == z3.unsat

    return work


def proof_of(network: Network, name: str) -> Callable[[], object]:
    """Return the proof of the same inequality, found and checked."""

    def work() -> None:
        analysis = Analysis(network)
        made = certify(analysis, f"d ln(p[s1]/p[s2]) / d barrier[{name}]", method="proof",
                       only="barrier")
        assert check_record(record_of(made, analysis)).status == "valid"

    return work


def rows() -> list[Row]:
    """Return one proof, found and checked, against the general solver where it is installed."""
    if importlib.util.find_spec("z3") is None:
        print("z3 is not installed (pip install -e '.[bench]'): its rows are left out")
        return []
    found = []
    for network, name in ((ring(3), "e1_2"), (square_with_chord(), "e1_2")):
        found.append(compare(f"{network.title}: one barrier bound, proved and checked",
                             proof_of(network, name), "z3 (nlsat)", inequality(network, name), 1))
    return found


def edges(network: Network, count: int) -> str:
    """Return the time to find and to check the edge proofs of the first transitions."""
    found = checked = 0.0
    size = 0
    for transition in network.transitions[:count]:
        start = time.perf_counter()
        analysis = Analysis(network)
        made = certify(analysis, f"d ln(p[s1]/p[s2]) / d barrier[{transition.name}]",
                       method="proof")
        record = record_text(record_of(made, analysis))
        found += time.perf_counter() - start
        start = time.perf_counter()
        verdict = check_record(json.loads(record))
        checked += time.perf_counter() - start
        assert verdict.status == "valid" and not made.without, str(verdict)
        size += len(record)
    (proof,) = made.proved.proofs
    return (f"edge proofs of {count} transitions, {network.title}, {form_of(proof)}: found in"
            f" {found:.1f} s, checked in {checked:.1f} s, {size / 1e6:.2f} MB")


def main() -> None:
    """Print the table."""
    print("| network | asked | proofs | records | claims | kB | find, s | check, s |")
    print("| --- | --- | --- | --- | --- | --- | --- | --- |")
    for network in listed():
        for heading, line in lines(network).items():
            print(f"| {network.title} | {heading} | {', '.join(sorted(line.proofs))} |"
                  f" {line.records} | {line.claims} | {line.size / 1000:.1f} |"
                  f" {line.found:.2f} | {line.checked:.2f} |", flush=True)


if __name__ == "__main__":
    main()
