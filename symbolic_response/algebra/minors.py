"""The second route to tree sums: principal minors of the generator, by fraction-free elimination.

Shares nothing with the enumeration of trees: the matrix is filled from the rates alone.
"""

from __future__ import annotations

from symbolic_response.algebra.rates import RateRing
from symbolic_response.expressions.ring import Poly


def tree_sums_by_minors(rates: RateRing) -> list[Poly]:
    """Return N_k for every state k as the determinant of -W without row and column k.

    Bareiss elimination with exact division. Another route: ``Analysis.tree_sum``.

    >>> from symbolic_response.algebra.rates import rate_ring
    >>> from symbolic_response.topology import Graph
    >>> pair = rate_ring(Graph(2, ((0, 1),), (False,)), ("hop",))
    >>> [str(poly) for poly in tree_sums_by_minors(pair)]
    ['rate:backward[hop]', 'rate:forward[hop]']
    """
    matrix = _negative_generator(rates)
    size = rates.graph.size
    sums = []
    for root in range(size):
        kept = [k for k in range(size) if k != root]
        sums.append(determinant([[matrix[i][j] for j in kept] for i in kept], rates))
    return sums


def _negative_generator(rates: RateRing) -> list[list[Poly]]:
    size = rates.graph.size
    matrix = [[rates.ring.constant(0) for _ in range(size)] for _ in range(size)]
    for transition, (first, second) in enumerate(rates.graph.ends):
        for tail, head, backward in ((first, second, False), (second, first, True)):
            rate = rates.generator(transition, backward)
            matrix[tail][tail] = matrix[tail][tail] + rate
            matrix[head][tail] = matrix[head][tail] - rate
    return matrix


def determinant(matrix: list[list[Poly]], rates: RateRing) -> Poly:
    """Return the determinant of a square matrix of polynomials (Bareiss 1968)."""
    rows = [list(row) for row in matrix]
    size, sign, previous = len(rows), 1, rates.ring.constant(1)
    for step in range(size - 1):
        pivot = next((i for i in range(step, size) if len(rows[i][step])), None)
        if pivot is None:
            return rates.ring.constant(0)
        if pivot != step:
            rows[step], rows[pivot], sign = rows[pivot], rows[step], -sign
        for i in range(step + 1, size):
            for j in range(step + 1, size):
                cross = rows[i][j] * rows[step][step] - rows[i][step] * rows[step][j]
                rows[i][j] = cross // previous
        previous = rows[step][step]
    return rows[-1][-1] * sign if rows else rates.ring.constant(1)
