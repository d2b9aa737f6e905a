"""Forest differences by elimination: D times the shift x of W x = d_m - d_n with sum 0.

A state a is eliminated from the equations as from the tree sums. Its source b_a (1 at n, -1 at m)
goes on to the others, A_ia b_a/S_a to state i; backwards S_a y_a = b_a + sum over j of A_aj y_j, y
of the last state 0. Then Phi_k = D y_k - N_k Y with Y the sum of the y.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from symbolic_response.algebra.compact.elimination import Elimination, Entry, Names
from symbolic_response.algebra.compact.expansion import Quotient
from symbolic_response.algebra.compact.relations import along, spanning
from symbolic_response.algebra.compact.together import Definition, key_of
from symbolic_response.expressions.ring import Poly, lift
from symbolic_response.expressions.tree import (
    ONE,
    Expression,
    Number,
    Symbol,
    add,
    divide,
    multiply,
    negate,
)


def forest_definitions(
    chain: Elimination, wanted: Iterable[tuple[int, int]]
) -> list[Definition]:
    """Return the definitions of Phi_{k,e} for pairs (k, e); one state must remain.

    They name ``#tree[k]`` and ``#total[]``. Transitions that close a cycle are given by the others.
    """
    pairs = sorted(set(wanted))
    transitions = sorted({e for _, e in pairs})
    tree = spanning(chain.graph, transitions)
    definitions: list[Definition] = []
    for e in sorted(transitions, key=lambda e: (e not in tree, e)):
        states = [k for k, other in pairs if other == e]
        path = [] if e in tree else along(chain.graph, e, tree)
        if path and all((k, step) in pairs for k in states for step, _ in path):
            definitions += [
                Definition(key_of("forest", k, e), path_sum(k, path), True) for k in states
            ]
            continue
        shift, helpers = _shift(chain, e)
        definitions += helpers
        definitions += [
            Definition(key_of("forest", k, e), _forest(k, e, shift)) for k in states
        ]
    return definitions


def path_sum(k: int, path: Sequence[tuple[int, bool]]) -> Expression:
    """Return the sum of Phi_{k,e} along a path of transitions (reversed: minus)."""
    terms = [(backward, Symbol(key_of("forest", k, step))) for step, backward in path]
    ordered = sorted(terms, key=lambda term: term[0])
    return add(negate(symbol) if backward else symbol for backward, symbol in ordered)


def _forest(k: int, e: int, shift: dict[int, Expression]) -> Expression:
    total = negate(multiply([Symbol(key_of("tree", k)), Symbol(key_of("shifts", e))]))
    if k not in shift:
        return total
    return add([multiply([Symbol(key_of("total")), shift[k]]), total])


def _shift(chain: Elimination, e: int) -> tuple[dict[int, Expression], list[Definition]]:
    """Return the names of the y of a transition where not 0, and the definitions they need."""
    states = range(chain.graph.size)
    keys = [key_of(kind, state, e) for kind in ("source", "shift") for state in states]
    names = chain.names.extended([*keys, key_of("shifts", e)])
    sources = _sources(chain, e, names)
    shift: dict[int, Entry] = {}
    for step in reversed(chain.steps):
        terms = [sources[step.state]] if step.state in sources else []
        for j, rate in step.entering:
            if j in shift:
                into = lift(rate.poly, chain.ring, names.ring) * shift[j].poly
                terms.append(Entry(multiply([rate.symbol, shift[j].symbol]), into))
        if terms:
            form = divide(add(term.symbol for term in terms), step.exit.symbol)
            below = lift(step.exit.poly, chain.ring, names.ring)
            shift[step.state] = names.define(
                key_of("shift", step.state, e), form, _sum(terms, names), below)
    ordered = [shift[state] for state in sorted(shift)]
    whole = add(entry.symbol for entry in ordered)
    names.define(key_of("shifts", e), whole, _sum(ordered, names), names.ring.constant(1))
    return {state: entry.symbol for state, entry in shift.items()}, names.definitions


def _sum(entries: Iterable[Entry], names: Names) -> Poly:
    return sum((entry.poly for entry in entries), names.ring.constant(0))


def _sources(chain: Elimination, e: int, names: Names) -> dict[int, Entry]:
    """Return the source that a state has when it is eliminated, where it has one."""
    first, second = chain.graph.ends[e]
    one = names.ring.constant(1)
    forms: dict[int, list[Expression]] = {second: [ONE], first: [negate(ONE)]}
    values: dict[int, Quotient] = {second: (one, one), first: (-one, one)}
    sources: dict[int, Entry] = {}
    for step in chain.steps:
        if step.state not in forms:
            continue
        form, (top, below) = add(forms[step.state]), values[step.state]
        if not len(top):
            continue
        source = (Entry(form, top // below) if isinstance(form, Number)
                  else names.define(key_of("source", step.state, e), form, top, below))
        sources[step.state] = source
        leave = lift(step.exit.poly, chain.ring, names.ring)
        for i, rate in step.leaving:
            out = lift(rate.poly, chain.ring, names.ring)
            alone = rate is step.exit
            share = source.symbol if alone else divide(
                multiply([rate.symbol, source.symbol]), step.exit.symbol)
            forms.setdefault(i, []).append(share)
            top, below = values.get(i, (0 * one, one))
            values[i] = (top * leave + out * source.poly * below, below * leave)
    return sources
