"""State elimination with named sums: short tree sums of networks with many trees.

To eliminate state a is to let its neighbours exchange effective rates
A_ij + A_ia A_aj / S_a, S_a = sum over i of A_ia being its exit rate. This is the Schur complement
of -W in its entry at a, so N_k = S_a N'_k for every state k that remains, N' made of the effective
rates, and stationarity at a gives the other one: S_a N_a = sum over j of A_aj N_j.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.algebra.compact.build import InternalError
from symbolic_response.algebra.compact.expansion import Quotient, expanded, stands_for
from symbolic_response.algebra.compact.factor import factored_with_leaves
from symbolic_response.algebra.compact.measure import Width
from symbolic_response.algebra.compact.together import Definition, key_of
from symbolic_response.expressions.ring import Generator, Poly, Ring, lift, union
from symbolic_response.expressions.tree import Expression, Symbol, add, divide, multiply
from symbolic_response.topology import Graph

NAME_RANK = 2 * 10**9
Rates = Sequence[tuple[Poly, Poly | None]]
Pair = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Entry:
    """An effective rate or an exit rate as it is written, and as a polynomial over names."""

    symbol: Expression
    poly: Poly


@dataclass(frozen=True, slots=True)
class Step:
    """A state that was eliminated: its exit rate and its effective rates to and from others."""

    state: int
    exit: Entry
    leaving: tuple[tuple[int, Entry], ...]
    entering: tuple[tuple[int, Entry], ...]


@dataclass(frozen=True, slots=True)
class Names:
    """Definitions over a ring that has a generator for each of their names."""

    ring: Ring
    leaves: dict[Expression, Quotient]
    definitions: list[Definition]

    def define(self, key: str, form: Expression, top: Poly, below: Poly) -> Entry:
        """Name a form, which must stand for top / below with all names independent: exact."""
        shown, under = expanded(form, self.leaves, self.ring)
        if not stands_for((shown * below, under), top):
            raise InternalError(f"the compact form of {key} does not stand for it")
        self.definitions.append(Definition(key, form))
        return Entry(Symbol(key), self.generator(key))

    def generator(self, key: str) -> Poly:
        """Return the generator of a name."""
        return self.ring.context.gen(self.ring.index[name_generator(key)])

    def extended(self, keys: Sequence[str]) -> Names:
        """Return a longer ring for further definitions, none of them made yet."""
        ring = with_names(self.ring, keys)
        leaves = {
            leaf: (lift(top, self.ring, ring), lift(below, self.ring, ring))
            for leaf, (top, below) in self.leaves.items()
        }
        further = Names(ring, leaves, [])
        one = ring.constant(1)
        leaves |= {Symbol(key): (further.generator(key), one) for key in keys}
        return further


class Elimination:
    """A network while its states are eliminated one by one.

    ``ring`` holds the generators of the rates and one for each name; ``names`` has the definitions,
    each checked when it is made.
    """

    def __init__(self, graph: Graph, ring: Ring, rates: Rates, width: Width) -> None:
        self.graph = graph
        self.width = width
        self.names = Names(ring, {}, []).extended(_keys(graph.size))
        self.ring = self.names.ring
        self.alive = list(range(graph.size))
        self.steps: list[Step] = []
        self._frozen: dict[Pair, Entry] = {}
        self._terms: dict[Pair, list[Expression]] = {}
        self._values: dict[Pair, Quotient] = {}
        direct: dict[Pair, Poly] = {}
        for (first, second), (forward, backward) in zip(graph.ends, rates, strict=True):
            for pair, rate in (((second, first), forward), ((first, second), backward)):
                if rate is not None and len(rate):
                    lifted = lift(rate, ring, self.ring)
                    direct[pair] = direct[pair] + lifted if pair in direct else lifted
        for pair, poly in direct.items():
            form, leaves = factored_with_leaves(poly, self.ring, width)
            self.names.leaves.update(leaves)
            self._terms[pair] = [form]
            self._values[pair] = (poly, self.ring.constant(1))

    def pairs(self) -> list[Pair]:
        """Return the (target, source) pairs of states that exchange rates now."""
        alive = set(self.alive)
        return sorted((i, j) for i, j in self._terms if i in alive and j in alive)

    def entry(self, pair: Pair) -> Entry:
        """Return the effective rate of a (target, source) pair; it gets a name unless short."""
        if pair not in self._frozen:
            form, (top, below) = add(self._terms[pair]), self._values[pair]
            if len(self._terms[pair]) == 1 and len(top) == 1 and below.is_one():
                self._frozen[pair] = Entry(form, top)
            else:
                self._frozen[pair] = self.names.define(key_of("rate", *pair), form, top, below)
        return self._frozen[pair]

    def next_state(self, keep: int | None) -> int:
        """Return the state whose elimination makes the fewest new effective rates.

        ValueError where no state but ``keep`` can be left.
        """
        present = set(self.pairs())
        left = {j for _, j in present} - {keep}
        if not left:
            raise ValueError("no state can be left: the network is not connected")

        def cost(state: int) -> tuple[int, int, int]:
            out = [i for i, j in present if j == state]
            into = [j for i, j in present if i == state]
            made = [(i, j) for i in out for j in into if i != j]
            return sum(pair not in present for pair in made), len(made), state

        return min(left, key=cost)

    def eliminate(self, state: int) -> None:
        """Eliminate a state that can be left."""
        pairs = self.pairs()
        leaving = tuple((i, self.entry((i, j))) for i, j in pairs if j == state)
        entering = tuple((j, self.entry((i, j))) for i, j in pairs if i == state)
        leave = leaving[0][1] if len(leaving) == 1 else self._exit(state, leaving)
        for i, out in leaving:
            for j, into in entering:
                if i != j:
                    self._pass_through((i, j), out, into, leave)
        self.alive.remove(state)
        self.steps.append(Step(state, leave, leaving, entering))

    def _exit(self, state: int, leaving: Sequence[tuple[int, Entry]]) -> Entry:
        total = sum((entry.poly for _, entry in leaving), self.ring.constant(0))
        form = add(entry.symbol for _, entry in leaving)
        return self.names.define(key_of("exit", state), form, total, self.ring.constant(1))

    def _pass_through(self, pair: Pair, out: Entry, into: Entry, leave: Entry) -> None:
        """Add the rate of the way through an eliminated state to a pair."""
        form = (into.symbol if out is leave
                else divide(multiply([out.symbol, into.symbol]), leave.symbol))
        self._terms.setdefault(pair, []).append(form)
        top, below = self._values.get(pair, (self.ring.constant(0), self.ring.constant(1)))
        self._values[pair] = (
            top * leave.poly + out.poly * into.poly * below, below * leave.poly
        ) if out is not leave else (top + into.poly * below, below)

    def remaining(self) -> list[list[Poly]]:
        """Return -W of the effective rates among the states that remain, in their order."""
        place = {state: index for index, state in enumerate(self.alive)}
        size, zero = len(place), self.ring.constant(0)
        matrix = [[zero for _ in range(size)] for _ in range(size)]
        for i, j in self.pairs():
            rate, row, column = self.entry((i, j)).poly, place[i], place[j]
            matrix[row][column] = matrix[row][column] - rate
            matrix[column][column] = matrix[column][column] + rate
        return matrix


def with_names(ring: Ring, keys: Sequence[str]) -> Ring:
    """Return a ring with a generator for every name as well."""
    names = [name_generator(key) for key in keys]
    return union([ring, Ring(sorted(names, key=Generator.order), [1] * len(names))])


def _keys(size: int) -> list[str]:
    exits = [key_of("exit", state) for state in range(size)]
    return exits + [key_of("rate", i, j) for i in range(size) for j in range(size) if i != j]


def name_generator(key: str) -> Generator:
    """Return the generator that stands for a name."""
    return Generator("symbol", NAME_RANK, key, Symbol(key), True)
