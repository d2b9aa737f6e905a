"""The smallest limit on a change of the rates that a family of pieces gives: a linear program.

For changes v of ln of the rates and numbers 0 <= t <= 1, one for each bundle,

    H = min (max a - min a) + sum t |b| + sum |f| + sum |c|

over energies a, bundles b, blocks (free), drives f (one-way: |f|/2) and sets c of rates out of one
state whose sum is v. Of the sets only their sum x matters: with P_j and -Q_j the largest and
smallest x of the rates out of state j, or 0, nested sets need P_j + Q_j, and no others less.

The dual: H = max v y over numbers y of the rates that add up to 0 in every block, to at most t in
size in every bundle, with |y forward - y backward| <= 2 (one-way: |y| <= 1); the positive ones of
their sums over the rates out of a state add up to at most 1; with sets of rates, so do the positive
y out of a state, and the negative ones.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from symbolic_response.control.changes import Vector
from symbolic_response.control.family import Family
from symbolic_response.control.linear_program import Column, LinearProgram, solve

_ZERO = Fraction(0)
_Put = Callable[[str, Column, Fraction, bool], None]


@dataclass(frozen=True, slots=True)
class Amounts:
    """How much of each piece: one number for each state, bundle, block, drive, and rate.

    ``directed``: the sum of the sets of rates out of one state, per rate.
    """

    energies: Vector
    bundles: Vector
    blocks: Vector
    drives: Vector
    directed: Vector


@dataclass(frozen=True, slots=True)
class Optimum:
    """Pieces that reach the least limit ``value``, and the ``dual`` y that shows it is least."""

    amounts: Amounts
    value: Fraction
    dual: Vector


def optimum(
    family: Family, change: Vector, t: Sequence[Fraction], *, floating: bool = True
) -> Optimum:
    """Return the least limit on the response of ln(p_i/p_j), exactly, for rational t.

    ``t``: tanh(F/4) of each bundle of the family, in 0 .. 1. The pieces add up to ``change``, the
    dual solution keeps its constraints and both have the same value: checked on exact fractions.
    """
    if len(t) != len(family.bundles) or not all(0 <= x <= 1 for x in t):
        raise ValueError("one t between 0 and 1 for each bundle of the family")
    layout = _Layout.of(family, tuple(t), False)
    solution = solve(layout.program(change), floating=floating)
    amounts = _shared_as_energies(family, layout.amounts(solution.x))
    found = Optimum(amounts, solution.value, solution.dual[: len(family.rates)])
    if (total(family, amounts) != change or cost(family, amounts, t) != found.value
            or dual_value(family, change, found.dual, t) != found.value):
        raise AssertionError("the pieces and the bound from below do not agree")
    return found


def sparse_amounts(family: Family, change: Vector) -> Amounts:
    """Return the pieces whose amounts have the least sum of sizes, exactly; so they are few.

    Each energy and block counts as well, and a drive by 3/4: one drive is then less than two single
    rates, and a single rate less than half a barrier with a drive.
    """
    layout = _Layout.of(family, (Fraction(1),) * len(family.bundles), True)
    amounts = _shared_as_energies(family, layout.amounts(solve(layout.program(change)).x))
    if total(family, amounts) != change:
        raise AssertionError("the pieces do not add up to the change")
    return amounts


def _shared_as_energies(family: Family, amounts: Amounts) -> Amounts:
    """Return the pieces with sets of all rates out of a state as energies, which cost no more."""
    energies, directed = list(amounts.energies), list(amounts.directed)
    for j in range(family.size):
        own = [r for r, k in enumerate(family.sources) if k == j]
        least, most = min(directed[r] for r in own), max(directed[r] for r in own)
        shared = max(least, _ZERO) + min(most, _ZERO)
        energies[j] += shared
        for r in own:
            directed[r] -= shared
    return replace(amounts, energies=tuple(energies), directed=tuple(directed))


def total(family: Family, amounts: Amounts) -> Vector:
    """Return the sum of all pieces, per rate."""
    result = [amounts.energies[j] + x
              for j, x in zip(family.sources, amounts.directed, strict=True)]
    for parts, values in ((family.bundles, amounts.bundles), (family.blocks, amounts.blocks)):
        of_transition = [_ZERO] * len(family.drives)
        for part, value in zip(parts, values, strict=True):
            if value:
                for e in part:
                    of_transition[e] += value
        result = [x + of_transition[e] for x, (e, _) in zip(result, family.rates, strict=True)]
    return tuple(x + amounts.drives[e] / (-2 if backward else 2)
                 for x, (e, backward) in zip(result, family.rates, strict=True))


def cost(family: Family, amounts: Amounts, t: Sequence[Fraction]) -> Fraction:
    """Return how much ln(p_i/p_j) responds to the pieces at the most."""
    result = max(amounts.energies) - min(amounts.energies)
    result += sum((x * abs(b) for x, b in zip(t, amounts.bundles, strict=True)), _ZERO)
    for e, value in enumerate(amounts.drives):
        result += abs(value) / (2 if family.is_one_way(e) else 1)
    for j in range(family.size):
        own = [x for x, k in zip(amounts.directed, family.sources, strict=True) if k == j]
        result += max([_ZERO, *own]) - min([_ZERO, *own])
    return result


def dual_value(
    family: Family, change: Vector, dual: Vector, t: Sequence[Fraction]
) -> Fraction | None:
    """Return the lower bound that numbers y of the rates give on the least limit.

    None where they break a constraint: those of the dual program above.
    """
    by_transition = [_ZERO] * len(family.drives)
    difference = [_ZERO] * len(family.drives)
    for (e, backward), y in zip(family.rates, dual, strict=True):
        by_transition[e] += y
        difference[e] += -y if backward else y
    holds = all(sum((by_transition[e] for e in block), _ZERO) == 0 for block in family.blocks)
    holds &= all(abs(sum((by_transition[e] for e in part), _ZERO)) <= x
                 for part, x in zip(family.bundles, t, strict=True))
    holds &= all(abs(x) <= (1 if family.is_one_way(e) else 2) for e, x in enumerate(difference))
    outward = _ZERO
    for j in range(family.size):
        own = [y for y, k in zip(dual, family.sources, strict=True) if k == j]
        outward += max(_ZERO, sum(own, _ZERO))
        if family.directed:
            holds &= sum((max(y, _ZERO) for y in own), _ZERO) <= 1
            holds &= sum((min(y, _ZERO) for y in own), _ZERO) >= -1
    if not holds or outward > 1:
        return None
    return sum((v * y for v, y in zip(change, dual, strict=True)), _ZERO)


@dataclass(frozen=True, slots=True)
class _Layout:
    """The columns of the program, and where each kind of piece begins among them.

    Rows: one for each rate; then for each state a_j + slack = A (not where sparse); then, with sets
    of rates, for each rate x+ + slack = P_j and x- + slack = Q_j.
    """

    family: Family
    columns: tuple[Column, ...]
    costs: tuple[Fraction, ...]
    begins: dict[str, int]

    @classmethod
    def of(cls, family: Family, t: tuple[Fraction, ...], sparse: bool) -> _Layout:
        """Return the layout; its costs are those of the limit, or of ``sparse_amounts``."""
        columns: list[Column] = []
        costs: list[Fraction] = []
        begins: dict[str, int] = {}
        one, count = Fraction(1), len(family.rates)

        def put(kind: str, column: Column, price: Fraction, signed: bool = True) -> None:
            begins.setdefault(kind, len(columns))
            columns.append(column)
            costs.append(price)
            if signed:
                columns.append({row: -entry for row, entry in column.items()})
                costs.append(price)

        for j in range(family.size):
            column = {r: 1 for r, k in enumerate(family.sources) if k == j}
            if not sparse:
                column[count + j] = 1
            put("energies", column, one if sparse else _ZERO, signed=sparse)
        if not sparse:
            for j in range(family.size):
                put("slacks", {count + j: 1}, _ZERO, signed=False)
            put("range", {count + j: -1 for j in range(family.size)}, one, signed=False)
        for part, price in zip(family.bundles, t, strict=True):
            put("bundles", dict.fromkeys(family.places(part), 1), price)
        for block in family.blocks:
            put("blocks", dict.fromkeys(family.places(block), 1), one if sparse else _ZERO)
        for e in family.drives:  # in halves
            column = {r: -1 if family.rates[r][1] else 1 for r in family.places((e,))}
            price = one if family.is_one_way(e) else Fraction(2)
            put("drives", column, Fraction(3, 2) if sparse else price)
        if family.directed:
            _put_directed(family, count + (0 if sparse else family.size), put)
        return cls(family, tuple(columns), tuple(costs), begins)

    def program(self, change: Vector) -> LinearProgram:
        """Return the program for a change of the rates."""
        rows = 1 + max(row for column in self.columns for row in column)
        right = (*change, *(_ZERO,) * (rows - len(change)))
        return LinearProgram(self.columns, self.costs, right)

    def amounts(self, x: Sequence[Fraction]) -> Amounts:
        """Return the pieces of a solution."""
        family = self.family

        def signed(kind: str, count: int) -> Vector:
            start = self.begins.get(kind, 0)
            return tuple(x[start + 2 * i] - x[start + 2 * i + 1] for i in range(count))

        start = self.begins["energies"]
        energies = (tuple(x[start : start + family.size]) if "range" in self.begins
                    else signed("energies", family.size))
        directed = (signed("directed", len(family.rates)) if family.directed
                    else (_ZERO,) * len(family.rates))
        return Amounts(
            energies, signed("bundles", len(family.bundles)),
            signed("blocks", len(family.blocks)),
            tuple(2 * half for half in signed("drives", len(family.drives))), directed)


def _put_directed(family: Family, first_row: int, put: _Put) -> None:
    """Add x+ and x- of every rate, what they lack to P and Q of their state, and P and Q."""
    for r in range(len(family.rates)):
        for sign, row in ((1, first_row + 2 * r), (-1, first_row + 2 * r + 1)):
            put("directed", {r: sign, row: 1}, _ZERO, False)
    for r in range(len(family.rates)):
        for row in (first_row + 2 * r, first_row + 2 * r + 1):
            put("gaps", {row: 1}, _ZERO, False)
    for j in range(family.size):
        own = [first_row + 2 * r for r, k in enumerate(family.sources) if k == j]
        for offset in (0, 1):
            put("extremes", {row + offset: -1 for row in own}, Fraction(1), False)
