"""The edge proof: all that follows from the two ends of one transition.

e runs from m to n with rates w+ and w-, N_k = a_k + w+ f_k + w- b_k, phi = f_n = b_m. The identity
phi a_k = a_m b_k + a_n f_k (all-minors theorem, Chaiken 1982) gives phi N_k = f_k N_n + b_k N_m:
all probabilities are mixtures of the two at the ends with weights that do not know the rates of e,
so no ratio of probabilities responds to them more than p_n/p_m does. And a_m, a_n are sums over the
paths from n to m. See DEVELOPERS.md, The end-pair theorem.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from symbolic_response.algebra.rates import polynomial_from_masks
from symbolic_response.certificates.proofs.rows import (
    EXPANDED_PRODUCTS,
    EXPANDED_TREES,
    Row,
    path_rows,
    undirected,
)
from symbolic_response.expressions.ring import Poly
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.topology.trees import count_undirected_trees, rooted


@dataclass(frozen=True, slots=True)
class EdgeProof:
    """The paths from the second end to the first that avoid a transition, with their forests.

    ``expanded``: the checker multiplies all identities out; else it takes the theorem for granted
    and tries them at a random point modulo a prime.
    """

    transition: int
    expanded: bool
    rows: tuple[Row, ...]

    def subject(self, network: Network) -> str:
        """Return what the proof is about in the words of the file."""
        return network.transitions[self.transition].name


def edge_proof(analysis: Analysis, e: int) -> EdgeProof:
    """Return the edge proof of a transition; SizeLimitError past 100,000 paths."""
    graph = analysis.graph
    first, second = graph.ends[e]
    rows = path_rows(graph, second, first, e)
    expanded = edge_products(analysis, e) <= EXPANDED_PRODUCTS
    if expanded:
        require_identities(analysis, e)
    return EdgeProof(e, expanded, rows)


def edge_products(analysis: Analysis, e: int) -> int:
    """Return about how many products of terms the identities of a transition expand to."""
    trees = count_undirected_trees(undirected(analysis.graph))
    if trees > EXPANDED_TREES or trees * analysis.graph.size > analysis.tree_limit:
        return EXPANDED_PRODUCTS + 1
    free = count_undirected_trees(undirected(analysis.graph, e))
    return 2 * analysis.graph.size * free * (trees - free)


def require_identities(analysis: Analysis, e: int) -> None:
    """Multiply out phi a_k = a_m b_k + a_n f_k for every state k, once for each transition.

    ArithmeticError if one fails: then the trees are wrong, and nothing may be certified.
    """
    if e in analysis.identities_checked:
        return
    first, second = analysis.graph.ends[e]
    parts = [_split(analysis, e, k) for k in range(analysis.graph.size)]
    phi = parts[second][1]
    sound = phi == parts[first][2] and not len(parts[first][1]) and not len(parts[second][2])
    for free, ahead, back in parts:
        sound = sound and phi * free == parts[first][0] * back + parts[second][0] * ahead
    if not sound:
        raise ArithmeticError(f"the trees of transition {e} do not satisfy the end-pair identities")
    analysis.identities_checked.add(e)


def _split(analysis: Analysis, e: int, root: int) -> tuple[Poly, Poly, Poly]:
    """Return a_k, f_k and b_k: trees without e, with e forward and backward, e's rate left out.

    The missing backward rate of a one-way transition makes no difference to b_k.
    """
    forward, backward = rooted(analysis.trees, root, allowed_back=e)
    bit = np.uint64(1 << e)
    ahead, back = (forward & bit) != 0, (backward & bit) != 0
    free = ~(ahead | back)
    return (
        polynomial_from_masks(analysis.rates, forward[free], backward[free]),
        polynomial_from_masks(analysis.rates, forward[ahead] & ~bit, backward[ahead]),
        polynomial_from_masks(analysis.rates, forward[back], backward[back] & ~bit),
    )
