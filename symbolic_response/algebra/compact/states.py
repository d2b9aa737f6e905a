"""Tree sums by elimination: how many states to eliminate, and what remains by kernel division."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from random import Random

from flint import fmpz_mat

from symbolic_response.algebra.compact.build import InternalError, require_equal
from symbolic_response.algebra.compact.elimination import Elimination, Rates, Step
from symbolic_response.algebra.compact.expansion import (
    Quotient,
    expanded,
    stands_for,
)
from symbolic_response.algebra.compact.measure import Width, default_width
from symbolic_response.algebra.compact.shifts import forest_definitions
from symbolic_response.algebra.compact.together import (
    HELPERS,
    CompactSums,
    Definition,
    Target,
    compact_together,
    key_of,
)
from symbolic_response.algebra.minors import determinant
from symbolic_response.algebra.rates import RateRing
from symbolic_response.expressions.ring import Poly, Ring, lift
from symbolic_response.expressions.tree import Expression, Symbol, add, divide, multiply, symbols_of
from symbolic_response.topology import Graph, count_rooted_trees

MAX_REMAINING_TREES = 60
MAX_EXPANDED_TREES = 60
POINT_SEED = 20


def eliminated(
    graph: Graph, ring: Ring, rates: Rates, width: Width = default_width, *,
    root: int | None = None, trees: Sequence[Poly] | None = None,
    forests: Sequence[tuple[int, int]] = (),
) -> CompactSums:
    """Return all N_k, or that of one ``root``, by state elimination with named sums.

    ``forests``: pairs (k, e) whose Phi_{k,e} are wanted too, with D and all N_k; then all states
    but one are eliminated, and helpers ``#source[a, e]``, ``#shift[a, e]``, ``#shifts[e]`` named.

    Names: ``#exit[a]`` = S_a, ``#rate[i, j]`` the effective rate from j to i, ``#factor[i]``; keys
    of the results ``#tree[k]``. States are eliminated as long as that makes the whole shorter.
    Every named sum is proved to be what the elimination says, by an exact identity in rates and
    names; where ``trees`` (the N_k) are given and have up to 60 terms, and no forests are asked
    for, everything is also multiplied out and compared with them. ValueError for a network with two
    states, or sets of states, that cannot be left: its tree sums are all 0.
    """
    best: CompactSums | None = None
    shortest = 0
    if forests:
        root = None
    for count in range(graph.size - 1 if forests else 0, graph.size):
        chain = Elimination(graph, ring, rates, width)
        for _ in range(count):
            chain.eliminate(chain.next_state(root))
        if _remaining_trees(chain) > MAX_REMAINING_TREES:
            continue
        sums = _written(chain, root, width, forests)
        length = sums.characters(width)
        if best is None or length < shortest:
            best, shortest = sums, length
    assert best is not None
    _require_point(best, graph, ring, rates)
    if trees is not None and not forests and max(len(tree) for tree in trees) <= MAX_EXPANDED_TREES:
        require_expansion(best, [lift(tree, ring, best.ring) for tree in trees])
        best = replace(best, proof="expansion")
    return best


def _remaining_trees(chain: Elimination) -> int:
    place = {state: index for index, state in enumerate(chain.alive)}
    ends = tuple((place[j], place[i]) for i, j in chain.pairs())
    graph = Graph(len(place), ends, (True,) * len(ends))
    return max(count_rooted_trees(graph, index) for index in range(len(place)))


def _written(
    chain: Elimination, root: int | None, width: Width, forests: Sequence[tuple[int, int]]
) -> CompactSums:
    """Return the tree sums of a network some of whose states are eliminated."""
    wanted = range(chain.graph.size) if root is None else (root,)
    matrix = chain.remaining()
    targets = []
    for index, state in enumerate(chain.alive):
        if root is None or state == root:
            targets.append(Target(key_of("tree", state), _minor(matrix, index, chain.ring)))
    inner = compact_together(chain.ring, targets, width)
    exits = [step.exit.symbol for step in chain.steps]
    definitions = [*chain.names.definitions]
    for d in inner.definitions:
        whole = d.kind == "tree"
        definitions.append(Definition(d.key, multiply([*exits, d.form])) if whole else d)
    for step in reversed(chain.steps):
        if step.state in wanted:
            definitions.append(Definition(key_of("tree", step.state), _from_others(step)))
    if forests:
        whole_sum = add(Symbol(key_of("tree", k)) for k in wanted)
        definitions.append(Definition(key_of("total"), whole_sum, True))
        definitions += forest_definitions(chain, forests)
    leaves = {**chain.names.leaves, **inner.leaves}
    return CompactSums(chain.ring, _in_use(definitions), "elimination", leaves)


def _minor(matrix: list[list[Poly]], root: int, ring: Ring) -> Poly:
    kept = [k for k in range(len(matrix)) if k != root]
    holder = RateRing(Graph(1, (), ()), ring, (), ())
    return determinant([[matrix[i][j] for j in kept] for i in kept], holder)


def _from_others(step: Step) -> Expression:
    """Return N of an eliminated state from those of the states that lead to it."""
    terms = [multiply([rate.symbol, Symbol(key_of("tree", j))]) for j, rate in step.entering]
    return divide(add(terms), step.exit.symbol)


def _in_use(definitions: Sequence[Definition]) -> tuple[Definition, ...]:
    """Return the sums asked for and the definitions that they need."""
    kept: list[Definition] = []
    needed: set[str] = set()
    for d in reversed(definitions):
        if d.kind not in HELPERS or d.key in needed:
            needed |= symbols_of(d.form)
            kept.append(d)
    return tuple(reversed(kept))


def require_expansion(sums: CompactSums, trees: Sequence[Poly]) -> None:
    """Multiply all names out; InternalError unless each ``#tree[k]`` is the k-th polynomial."""
    leaves, one = dict(sums.leaves), sums.ring.constant(1)
    for d in sums.definitions:
        if d.kind == "tree":
            (k,) = d.place
            require_equal(d.form, trees[k], leaves, sums.ring, d.key)
            leaves[Symbol(d.key)] = (trees[k], one)
        else:
            leaves[Symbol(d.key)] = _lowest_terms(expanded(d.form, leaves, sums.ring))


def _require_point(sums: CompactSums, graph: Graph, ring: Ring, rates: Rates) -> None:
    """Compare all tree sums with minors of -W at one point whose values are drawn at random.

    A guard beside the exact check of every step, not what the proof rests on.
    """
    draw, big = Random(POINT_SEED), sums.ring
    values = [draw.randrange(1, 10**9) for _ in big.generators]

    def at_point(poly: Poly) -> int:
        return int(poly(*values))

    leaves = {
        leaf: (big.constant(at_point(top)), big.constant(at_point(below)))
        for leaf, (top, below) in sums.leaves.items()
    }
    matrix = [[0] * graph.size for _ in range(graph.size)]
    for (first, second), pair in zip(graph.ends, rates, strict=True):
        for tail, head, rate in ((first, second, pair[0]), (second, first, pair[1])):
            value = 0 if rate is None else at_point(lift(rate, ring, big))
            matrix[tail][tail] += value
            matrix[head][tail] -= value
    for d in sums.definitions:
        shown = _lowest_terms(expanded(d.form, leaves, big))
        leaves[Symbol(d.key)] = shown
        if d.kind in ("tree", "forest"):
            expected = _minor_at(matrix, *d.place) if d.kind == "tree" else _forest_at(
                matrix, d.place[0], graph.ends[d.place[1]])
            if not stands_for(shown, big.constant(expected)):
                raise InternalError(f"the compact form of {d.key} does not stand for it")


def _minor_at(matrix: list[list[int]], root: int) -> int:
    """Return N_k from the numbers of -W."""
    kept = [k for k in range(len(matrix)) if k != root]
    return int(fmpz_mat(len(kept), len(kept), [matrix[i][j] for i in kept for j in kept]).det())


def _forest_at(matrix: list[list[int]], k: int, ends: tuple[int, int]) -> int:
    """Return Phi_{k,e} by Cramer's rule: -W x = d_n - d_m, one row of it replaced by sum x = 0.

    With all ones in that row the determinant is D.
    """
    size, (first, second) = len(matrix), ends
    right = [(i == second) - (i == first) for i in range(size)]
    rows = [
        [1 if i == size - 1 else matrix[i][j] for j in range(size)] for i in range(size)
    ]
    for i in range(size):
        rows[i][k] = 0 if i == size - 1 else right[i]
    return int(fmpz_mat(size, size, [entry for row in rows for entry in row]).det())


def _lowest_terms(value: Quotient) -> Quotient:
    top, below = value
    shared = top.gcd(below)
    return (top // shared, below // shared) if not shared.is_one() else value
