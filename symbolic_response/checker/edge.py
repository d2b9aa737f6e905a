"""The proof of an edge, from which every bound on the response to its barrier follows."""

from __future__ import annotations

from .algebra import Algebra, X
from .network import Path
from .rows import check_rows


def check_edge(algebra: Algebra[X], e: int, rows: list[Path], entry: str) -> None:
    """Check the identities of an edge: its ends are extremal, and their ratio is a mediant."""
    m, n = algebra.graph.ends[e]
    phi, a_m, a_n = algebra.using(2 * e, n), algebra.trees(m, e), algebra.trees(n, e)
    for i, root, wanted in ((2 * e, m, []), (2 * e + 1, n, []), (2 * e + 1, m, [[phi]])):
        algebra.require(entry, "f_m = b_n = 0 and f_n = b_m", [[algebra.using(i, root)]], wanted)
    for k in range(algebra.graph.states):
        a, f, b = algebra.trees(k, e), algebra.using(2 * e, k), algebra.using(2 * e + 1, k)
        algebra.require(entry, "phi a_k = a_m b_k + a_n f_k", [[phi, a]], [[a_m, b], [a_n, f]])
    check_rows(algebra, rows, n, m, entry, e)
