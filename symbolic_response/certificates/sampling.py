"""Exact sample points, the same on every machine: the rule ``dyadic-strata-1``.

Every random choice is the SHA-256 of ``"INDEX ATTEMPT WHAT SEED"`` read as one big integer, modulo
the number of possibilities. Point INDEX belongs to stratum INDEX mod 4:

0. every symbol drawn independently, evenly over its grid numbers in its range;
1. the same, then every fundamental cycle brought near balance, |force| < 0.1;
2. the same, then one fundamental cycle brought to a moderate force, about 0.1 to 5;
3. the same, then one brought to a large force, above 5.

In strata 2 and 3 every second round first brings the others near balance, so that the chosen cycle
sets the largest force. A cycle is brought to a force by moving one symbol at a time on its grid,
by bisection on the exact ratio of rates, until the force is reached. Draws with a rate that is not
positive are repeated.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Mapping
from fractions import Fraction

import flint

from symbolic_response.certificates.axes import BITS, Axis, axes_for, grid_number
from symbolic_response.errors import EvaluationError, UndecidedError
from symbolic_response.expressions.text import expression_text
from symbolic_response.expressions.tree import Expression, symbols_of
from symbolic_response.network.model import Network
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.direct import direct_value
from symbolic_response.topology import Cycle

RULE = "dyadic-strata-1"
STRATA = 4
MAX_ATTEMPTS = 200

Places = dict[str, int]
Values = dict[str, Expression]
Rate = tuple[Expression, frozenset[str]]


def rate_expressions(network: Network) -> tuple[Expression, ...]:
    """Return all directed rates of a network."""
    return tuple(rate for t in network.transitions for rate in (t.forward, t.backward)
                 if rate is not None)


class Sampler:
    """Exact points of one network for one seed.

    ``expressions``: what must be rational at every point beside the rates. Raises UndecidedError
    where no point makes the rates rational, EvaluationError for a range without a sampling point.
    """

    def __init__(
        self, analysis: Analysis, seed: str, expressions: Iterable[Expression] = ()
    ) -> None:
        self.analysis = analysis
        self.seed = seed
        self.rates = rate_expressions(analysis.network)
        self.axes = axes_for(analysis.network, (*self.rates, *expressions))
        self._by_name = {axis.name: axis for axis in self.axes}
        one_way = analysis.graph.one_way
        self.cycles = tuple(
            cycle for cycle in analysis.fundamental_cycles
            if not any(one_way[e] for e in cycle.transitions)
        )
        self._movers = tuple(self._symbols_of_cycle(cycle) for cycle in self.cycles)

    def point(self, index: int) -> Values:
        """Return the values of all symbols at sample point ``index``.

        Raises EvaluationError if 200 draws give no point with positive rates.
        """
        failing = None
        for attempt in range(MAX_ATTEMPTS):
            draw = _Draw(self.seed, index, attempt)
            places = {axis.name: axis.first + draw.below(axis.last - axis.first + 1, axis.name)
                      for axis in self.axes}
            self._enter_stratum(index, places, draw)
            values = self.values(places)
            failing = self.not_positive(values)
            if failing is None:
                return values
        assert failing is not None
        raise EvaluationError(
            f"{MAX_ATTEMPTS} draws within the ranges of the symbols gave no point with positive"
            f" rates; the last failed at rate '{expression_text(failing)}': change the ranges"
        )

    def values(self, places: Mapping[str, int], bits: int = BITS) -> Values:
        """Return the values of all symbols from their grid numbers."""
        return {name: self._by_name[name].value(place, bits) for name, place in places.items()}

    def not_positive(self, values: Mapping[str, Expression]) -> Expression | None:
        """Return a rate that is not positive at a point, None where all are."""
        for rate in self.rates:
            value = direct_value(rate, values)
            if value is None:
                raise UndecidedError(f"rate '{expression_text(rate)}' is not rational at exact"
                                     " points, so nothing is decided")
            if value <= 0:
                return rate
        return None

    # -- strata ----------------------------------------------------------------------------

    def _enter_stratum(self, index: int, places: Places, draw: _Draw) -> None:
        stratum, turn = index % STRATA, index // STRATA
        if stratum == 0 or not self.cycles:
            return
        if stratum == 1:
            for which in range(len(self.cycles)):
                self._balance(which, range(which), places, draw)
            return
        chosen = turn // 2 % len(self.cycles)
        others = [which for which in range(len(self.cycles)) if which != chosen]
        if turn % 2:
            for count, which in enumerate(others):
                self._balance(which, others[:count], places, draw)
        low, high = (8, 7 << BITS) if stratum == 2 else (8 << BITS, 24 << BITS)
        target = grid_number(low + draw.below(high - low, "force"))
        self._steer(chosen, others, target, places, draw)

    def _balance(
        self, which: int, settled: Iterable[int], places: Places, draw: _Draw
    ) -> None:
        target = 1 + Fraction(draw.below(12, f"balance{which}"), 128)
        self._steer(which, settled, target, places, draw)

    def _steer(
        self, which: int, settled: Iterable[int], target: Fraction, places: Places, draw: _Draw
    ) -> None:
        """Bring the ratio of a cycle to the target or its inverse, settled cycles kept if possible.
        """
        taken = {name for other in settled for name in self._movers[other]}
        symbols = [name for name in self._movers[which] if name not in taken]
        symbols = symbols or list(self._movers[which])
        if not symbols:
            return
        start = draw.below(len(symbols), f"mover{which}")
        if draw.below(2, f"sign{which}"):
            target = 1 / target
        goal = flint.fmpq(target.numerator, target.denominator)
        for name in symbols[start:] + symbols[:start]:
            if self._move(self.cycles[which], goal, name, places):
                return

    def _move(self, cycle: Cycle, goal: flint.fmpq, name: str, places: Places) -> bool:
        """Move a symbol so that the ratio of a cycle comes next to a goal; whether it got there."""
        axis = self._by_name[name]
        ratio_at = self._ratio(cycle, axis, self.values(places))
        low, high = axis.first, axis.last
        start, end = ratio_at(low), ratio_at(high)
        if start is None or end is None or start == end:
            return False
        rising = start < end
        while high - low > 1:
            middle = (low + high) // 2
            ratio = ratio_at(middle)
            if ratio is None:
                return False
            if (ratio <= goal) == rising:
                low = middle
            else:
                high = middle
        past = end <= goal if rising else end >= goal
        places[name] = axis.last if past else low
        return bool(min(start, end) <= goal <= max(start, end))

    def _ratio(
        self, cycle: Cycle, axis: Axis, values: Values
    ) -> Callable[[int], flint.fmpq | None]:
        """Return the product of rates along over against as a function of one symbol's place.

        None where a rate is not positive.
        """
        above, below = self._sides(cycle)
        fixed: flint.fmpq | None = flint.fmpq(1)
        moving = []
        for rates, exponent in ((above, 1), (below, -1)):
            for rate, names in rates:
                if axis.name in names:
                    moving.append((rate, exponent))
                else:
                    fixed = _times(fixed, rate, exponent, values)

        def ratio_at(place: int) -> flint.fmpq | None:
            at = {**values, axis.name: axis.value(place)}
            result = fixed
            for rate, exponent in moving:
                result = _times(result, rate, exponent, at)
            return result

        return ratio_at

    def _sides(self, cycle: Cycle) -> tuple[list[Rate], list[Rate]]:
        """Return the rates along a cycle and those against it, with their symbols."""
        above: list[Rate] = []
        below: list[Rate] = []
        for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
            transition = self.analysis.network.transitions[e]
            assert transition.backward is not None
            pair = [(rate, symbols_of(rate)) for rate in (transition.forward, transition.backward)]
            above.append(pair[0 if ahead else 1])
            below.append(pair[1 if ahead else 0])
        return above, below

    def _symbols_of_cycle(self, cycle: Cycle) -> tuple[str, ...]:
        sides = self._sides(cycle)
        found = frozenset().union(*(names for side in sides for _, names in side))
        return tuple(axis.name for axis in self.axes if axis.name in found)


class _Draw:
    """The random choices of one attempt at one point."""

    def __init__(self, seed: str, index: int, attempt: int) -> None:
        self._head = f"{index} {attempt}"
        self._seed = seed

    def below(self, bound: int, what: str) -> int:
        """Return an integer from 0 to ``bound`` - 1."""
        text = f"{self._head} {what} {self._seed}".encode()
        return int.from_bytes(hashlib.sha256(text).digest(), "big") % bound


def _times(
    product: flint.fmpq | None, rate: Expression, exponent: int, values: Values
) -> flint.fmpq | None:
    """Return a product times a power of a rate, None where the rate is not positive."""
    value = direct_value(rate, values)
    if product is None or value is None or value <= 0:
        return None
    return product * value**exponent
