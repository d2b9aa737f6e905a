"""Steady states and responses by elimination of states: the short way for large networks.

The states are taken out one after the other, without any subtraction (Grassmann, Taksar & Heyman,
Oper. Res. 33, 1107 (1985)): without k the rate from i to j becomes w_ij + w_ik w_kj / (sum of the
w_kl). The probabilities come back in the opposite order. A response is the derivative of the
whole program, step by step; nothing is enumerated.
"""

from __future__ import annotations

from collections.abc import Iterable

from symbolic_response.errors import QuantityError
from symbolic_response.export.program import Named, Node, Program, Rate, differentiated, translated
from symbolic_response.expressions.derivative import by_symbol
from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    divide,
    function,
    multiply,
    negate,
)
from symbolic_response.network.quantities import (
    BySymbol,
    Change,
    Current,
    DirectedRate,
    EntropyProduction,
    Mean,
    Perturbation,
    Probability,
    Response,
    Traffic,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import elementary_weight


class Elimination:
    """Quantities of a network in a program whose leaves are symbols and directed rates."""

    def __init__(
        self, analysis: Analysis, program: Program, raised: tuple[int, Expression] | None = None
    ) -> None:
        self.analysis, self.network = analysis, analysis.network
        self.program, self.raised = program, raised
        self._steady: tuple[list[int], int] | None = None

    def rate(self, e: int, backward: bool) -> int:
        """Return a directed rate, 0 for the missing one of a one-way transition."""
        transition = self.network.transitions[e]
        if backward and transition.backward is None:
            return self.program.number(0)
        own = self.program.rate(e, backward)
        if self.raised is None or self.raised[0] != e:
            return own
        factor = self.part(function("exp", negate(self.raised[1])))
        return self.program.multiply([(factor, 1), (own, 1)])

    def steady(self) -> tuple[list[int], int]:
        """Return the weights of all states, proportional to their probabilities, and their sum."""
        if self._steady is None:
            self._steady = self._solved()
        return self._steady

    def _solved(self) -> tuple[list[int], int]:
        program, size = self.program, len(self.network.states)
        flows: dict[tuple[int, int], int] = {}

        def gain(i: int, j: int, more: int) -> None:
            before = flows.get((i, j))
            total = more if before is None else program.add([(1, before), (1, more)])
            flows[i, j] = program.keep(total) if before is not None else total

        for e, transition in enumerate(self.network.transitions):
            gain(transition.first, transition.second, self.rate(e, False))
            if transition.backward is not None:
                gain(transition.second, transition.first, self.rate(e, True))
        shares: dict[int, list[tuple[int, int]]] = {}
        for k in self._order()[:-1]:
            into = [(i, flows.pop((i, k))) for i in range(size) if (i, k) in flows]
            out = [(j, flows.pop((k, j))) for j in range(size) if (k, j) in flows]
            leaving = program.keep(program.add([(1, flow) for _, flow in out]))
            shares[k] = [(i, program.keep(program.multiply([(flow, 1), (leaving, -1)])))
                         for i, flow in into]
            for i, share in shares[k]:
                for j, flow in out:
                    if i != j:
                        gain(i, j, program.multiply([(share, 1), (flow, 1)]))
        return self._weights_back(shares)

    def _order(self) -> list[int]:
        """Return the states, those with few neighbours first."""
        ends = [(t.first, t.second) for t in self.network.transitions]
        near = {k: {b if a == k else a for a, b in ends if k in (a, b)}
                for k in range(len(self.network.states))}
        order: list[int] = []
        while near:
            k = min(near, key=lambda state: (len(near[state]), -state))
            around = near.pop(k)
            for i in around:
                near[i] = (near[i] | around) - {i, k}
            order.append(k)
        return order

    def _weights_back(self, shares: dict[int, list[tuple[int, int]]]
                      ) -> tuple[list[int], int]:
        program, size = self.program, len(self.network.states)
        (last,) = set(range(size)) - shares.keys()
        weights = {last: program.number(1)}
        for k in reversed(list(shares)):
            weights[k] = program.keep(program.add(
                [(1, program.multiply([(share, 1), (weights[i], 1)])) for i, share in shares[k]]))
        total = program.keep(program.add([(1, weights[k]) for k in range(size)]))
        return [weights[k] for k in range(size)], total

    def _average(self, terms: Iterable[tuple[int, int]]) -> int:
        """Return the sum of parts times parts, each with a weight of a state, over all weights."""
        program, (_, total) = self.program, self.steady()
        above = program.add([(1, program.multiply([(one, 1), (other, 1)])) for one, other in terms])
        return program.multiply([(above, 1), (total, -1)])

    def part(self, quantity: Expression) -> int:
        """Return a quantity or response as a part of the program."""
        return translated(self.program, quantity, self._leaf)

    def _leaf(self, leaf: Expression) -> int:
        program = self.program
        match leaf:
            case Probability(states):
                weights, one = self.steady()[0], program.number(1)
                return self._average([(one, weights[k]) for k in states])
            case Mean(place):
                values = self.network.observables[place].values
                return self._average(
                    zip([self.part(value) for value in values], self.steady()[0], strict=True))
            case Current(e):
                return self._average([(program.number(1), self._flow(e, -1))])
            case Traffic(e):
                return self._average([(program.number(1), self._flow(e, 1))])
            case DirectedRate(e, backward):
                return self.rate(e, backward)
            case EntropyProduction():
                return self._entropy_production()
            case Response(inner, by):
                return self.response(self.part(inner), by)
            case Change(inner, e, amount):
                after = Elimination(self.analysis, program, (e, amount)).part(inner)
                return program.add([(1, after), (-1, self.part(inner))])
        raise QuantityError(f"no function for {type(leaf).__name__}")

    def _flow(self, e: int, sign: int) -> int:
        """Return forward flow plus or minus backward flow, times the sum of the weights."""
        program, p = self.program, self.steady()[0]
        transition = self.network.transitions[e]
        forward = program.multiply([(self.rate(e, False), 1), (p[transition.first], 1)])
        backward = program.multiply([(self.rate(e, True), 1), (p[transition.second], 1)])
        return program.add([(1, forward), (sign, backward)])

    def _entropy_production(self) -> int:
        """Return the sum of J ln(w+/w-): the ln(p_m/p_n) add up to nothing."""
        terms = []
        for e in range(len(self.network.transitions)):
            ratio = self.program.multiply([(self.rate(e, False), 1), (self.rate(e, True), -1)])
            terms.append((self.program.apply("ln", ratio), self._flow(e, -1)))
        return self._average(terms)

    def response(self, part: int, by: Perturbation) -> int:
        """Return the derivative of a part by a perturbation."""
        program = self.program

        def leaf(node: Node) -> int:
            if isinstance(node, Rate):
                return self._rate_change(node, by)
            if isinstance(node, Named) and isinstance(by, BySymbol) and node.name == by.name:
                return program.symbol(by.name) if by.logarithmic else program.number(1)
            return program.number(0)

        return differentiated(program, part, leaf)

    def _rate_change(self, rate: Rate, by: Perturbation) -> int:
        """Return the change of a rate: the rate times that of its logarithm.

        The latter, made of symbols, is left alone by energies, barriers and drives.
        """
        transition = self.network.transitions[rate.transition]
        own = self.program.rate(rate.transition, rate.backward)
        if isinstance(by, BySymbol):
            expression = transition.backward if rate.backward else transition.forward
            assert expression is not None
            slope = divide(by_symbol(expression, by.name), expression)
            if by.logarithmic:
                slope = multiply([Symbol(by.name), slope])
            return self.program.multiply([(own, 1), (self.part(self.analysis.tidy(slope)), 1)])
        source = transition.second if rate.backward else transition.first
        weight = elementary_weight(by, rate.transition, rate.backward, source)
        return self.program.multiply([(own, 1)], weight or 0)
