"""One network, analysed: its trees, tree sums and what follows from them, each made once.

An :class:`Analysis` is made explicitly and passed explicitly. Notation: transition e from m to n
with rates w+ and w-; N_k the sum over spanning trees towards k, D the sum of the N_k;
C_e = w+ N_m - w- N_n the numerator of e's current, T_e = w+ N_m + w- N_n that of its traffic;
Phi_{k,e} the difference of two-tree forest sums.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import cached_property

import numpy as np

from symbolic_response.algebra.factored import Factored, from_polynomial
from symbolic_response.algebra.rates import RateRing, polynomial_from_masks, rate_ring
from symbolic_response.algebra.simplify import simplify
from symbolic_response.algebra.substitution import Substitution
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain, Generator, Poly, Polynomial
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.model import Network
from symbolic_response.topology import (
    Cycle,
    Graph,
    Progress,
    SpanningTrees,
    count_rooted_trees,
    cycles,
    fundamental_cycles,
    rooted,
    spanning_trees,
    two_tree_forests,
)

TREE_LIMIT = 2_000_000
TERM_LIMIT = 200_000
CYCLE_LIMIT = 200_000


class Analysis:
    """The exact analysis of one network; results are kept, the network does not change.

    ``tree_limit``: rooted spanning trees that are enumerated at the most; ``term_limit``: terms
    of an expanded polynomial; ``cycle_limit``: cycles. Past a limit SizeLimitError is raised.
    """

    def __init__(
        self,
        network: Network,
        *,
        tree_limit: int = TREE_LIMIT,
        term_limit: int = TERM_LIMIT,
        cycle_limit: int = CYCLE_LIMIT,
        progress: Progress | None = None,
    ) -> None:
        self.network = network
        self.tree_limit = tree_limit
        self.term_limit = term_limit
        self.cycle_limit = cycle_limit
        self.progress = progress
        self._tree_sums: dict[int, Poly] = {}
        self._currents: dict[int, Poly] = {}
        self._forests: dict[tuple[int, int], Poly] = {}
        self._images: dict[Polynomial, Factored] = {}
        self.identities_checked: set[int] = set()
        """Transitions whose end-pair identities were multiplied out and found to hold."""

    @cached_property
    def graph(self) -> Graph:
        """The graph of the network."""
        return graph_of(self.network)

    @cached_property
    def domain(self) -> Domain:
        """The symbols of the network and their signs."""
        return domain_of(self.network)

    @cached_property
    def rates(self) -> RateRing:
        """The ring in which every rate is one generator."""
        return rate_ring(self.graph, tuple(t.name for t in self.network.transitions))

    def rate_expression(self, transition: int, backward: bool = False) -> Expression:
        """Return a directed rate in the user's symbols; it must exist."""
        entry = self.network.transitions[transition]
        expression = entry.backward if backward else entry.forward
        if expression is None:
            raise ValueError(f"transition {entry.name!r} has no backward rate")
        return expression

    @cached_property
    def substitution(self) -> Substitution:
        """The user's expressions for the rates."""
        directions = self.rates.directions()

        def image(generator: Generator, _: int) -> Expression:
            return self.rate_expression(*directions[generator.rank])

        return Substitution(self.domain, image)

    def simplified(self, tree: Expression) -> Factored:
        """Return a tree over symbols and polynomials in the rates in factored form."""
        return simplify(tree, self.substitution.context, self._substituted)

    def tidy(self, expression: Expression) -> Expression:
        """Return an expression in the user's symbols alone, in normal form."""
        return normal_form(expression, self.domain).expression()

    def _substituted(self, leaf: Polynomial) -> Factored:
        if leaf.ring != self.rates.ring:
            return from_polynomial(leaf.poly, leaf.ring, self.substitution.context)
        if leaf not in self._images:
            self._images[leaf] = self.substitution.apply(leaf.poly, leaf.ring)
        return self._images[leaf]

    # -- trees -----------------------------------------------------------------------------

    @cached_property
    def tree_counts(self) -> tuple[int, ...]:
        """The number of spanning trees towards each state whose product does not vanish."""
        return tuple(count_rooted_trees(self.graph, root) for root in range(self.graph.size))

    @cached_property
    def trees(self) -> SpanningTrees:
        """All spanning trees as bit masks."""
        return spanning_trees(self.graph, limit=self.tree_limit, progress=self.progress)

    def require_terms(self, count: int, what: str) -> None:
        """Raise SizeLimitError if a polynomial would have more terms than the limit."""
        if count > self.term_limit:
            raise SizeLimitError(
                f"{what} has {count} terms, more than the limit of {self.term_limit} (raise it"
                " with --terms); exact values with --at still work"
            )

    def tree_sum(self, root: int) -> Poly:
        """Return N_k, the sum over spanning trees towards k of the product of their rates.

        Kirchhoff; Schnakenberg, Rev. Mod. Phys. 48, 571 (1976). Another route:
        ``tree_sums_by_minors``.
        """
        if root not in self._tree_sums:
            name = self.network.states[root].name
            self.require_terms(self.tree_counts[root], f"the tree sum of state {name!r}")
            self._tree_sums[root] = polynomial_from_masks(self.rates, *rooted(self.trees, root))
        return self._tree_sums[root]

    def tree_sum_of(self, states: Iterable[int]) -> Poly:
        """Return the sum of N_k over a set of states."""
        chosen = tuple(states)
        count = sum(self.tree_counts[k] for k in chosen)
        self.require_terms(count, "the sum over spanning trees")
        return sum((self.tree_sum(k) for k in chosen), self.rates.ring.constant(0))

    def tree_sum_without(self, root: int, transition: int) -> Poly:
        """Return a_k, the part of N_k from trees that do not use a transition."""
        name = self.network.states[root].name
        self.require_terms(self.tree_counts[root], f"the tree sum of state {name!r}")
        forward, backward = rooted(self.trees, root)
        free = (forward | backward) & np.uint64(1 << transition) == 0
        return polynomial_from_masks(self.rates, forward[free], backward[free])

    @cached_property
    def normalisation(self) -> Poly:
        """D, the sum over all rooted spanning trees."""
        return self.tree_sum_of(range(self.graph.size))

    def current_numerator(self, transition: int) -> Poly:
        """Return C_e = w+ N_m - w- N_n; the current is C_e / D."""
        if transition not in self._currents:
            self._currents[transition] = self._flow(transition, -1)
        return self._currents[transition]

    def traffic_numerator(self, transition: int) -> Poly:
        """Return T_e = w+ N_m + w- N_n; the traffic is T_e / D."""
        return self._flow(transition, 1)

    def flow_numerator(self, transition: int, backward: bool) -> Poly:
        """Return w+ N_m or w- N_n: a directed flow times D."""
        first, second = self.graph.ends[transition]
        source = second if backward else first
        return self.rates.generator(transition, backward) * self.tree_sum(source)

    def _flow(self, transition: int, sign: int) -> Poly:
        forward = self.flow_numerator(transition, False)
        return forward + self.flow_numerator(transition, True) * sign

    def forest_difference(self, state: int, transition: int) -> Poly:
        """Return Phi_{k,e}: d pi_k / d barrier[e] = -C_e Phi_{k,e} / D^2.

        Two-tree forests that separate the ends of e, k a root: those with e's second end in k's
        tree minus those with its first. Chaiken's all-minors theorem (1982).
        """
        key = (state, transition)
        if key not in self._forests:
            signs, forward, backward = two_tree_forests(self.trees, transition, state)
            self.require_terms(len(signs), "a two-tree forest sum")
            self._forests[key] = polynomial_from_masks(self.rates, forward, backward, signs)
        return self._forests[key]

    # -- cycles ----------------------------------------------------------------------------

    @cached_property
    def cycles(self) -> tuple[Cycle, ...]:
        """All cycles that can be run at least one way, each in its reference orientation."""
        return cycles(self.graph, limit=self.cycle_limit, progress=self.progress)

    @cached_property
    def fundamental_cycles(self) -> tuple[Cycle, ...]:
        """One cycle for each transition outside a spanning tree."""
        return tuple(fundamental_cycles(self.graph))


class AnalysisInRates(Analysis):
    """An analysis whose forms are written in rates, each a symbol of its own.

    Shares what ``analysis`` has found so far; for printing, not for exact values.
    """

    def __init__(self, analysis: Analysis) -> None:
        self.__dict__.update(vars(analysis))
        self._images = {}

    def rate_expression(self, transition: int, backward: bool = False) -> Expression:
        """Return a directed rate as itself; it must exist."""
        super().rate_expression(transition, backward)
        return Polynomial(self.rates.ring, self.rates.generator(transition, backward))

    def _substituted(self, leaf: Polynomial) -> Factored:
        return from_polynomial(leaf.poly, leaf.ring, self.substitution.context)


def as_analysis(subject: Network | Analysis) -> Analysis:
    """Return the analysis itself, or a new one of a network."""
    return subject if isinstance(subject, Analysis) else Analysis(subject)


def graph_of(network: Network) -> Graph:
    """Return the graph of a network."""
    return Graph(
        len(network.states),
        tuple((t.first, t.second) for t in network.transitions),
        tuple(t.backward is None for t in network.transitions),
    )


def domain_of(network: Network) -> Domain:
    """Return the symbols of a network, in file order, with their signs."""
    return Domain(tuple(entry.name for entry in network.symbols), network.positive_symbols)
