"""Linear programs solved exactly: a basis from floating point, checked and repaired exactly."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import flint

Column = dict[int, int]
"""The non-zero entries of a column, by row."""

_PRIME = 2**61 - 1
_TOLERANCE = 1e-7


@dataclass(frozen=True, slots=True)
class LinearProgram:
    """Make sum of ``costs`` x least, subject to sum of ``columns`` x = ``right`` and x >= 0.

    The rows must be independent, and the least value bounded from below.
    """

    columns: tuple[Column, ...]
    costs: tuple[Fraction, ...]
    right: tuple[Fraction, ...]


@dataclass(frozen=True, slots=True)
class Solution:
    """``x`` is least: ``dual`` y has columns y <= costs and right y = costs x = ``value``."""

    x: tuple[Fraction, ...]
    dual: tuple[Fraction, ...]
    value: Fraction


def solve(program: LinearProgram, *, floating: bool = True) -> Solution:
    """Return an optimal vertex, exactly, with the dual solution that shows it optimal.

    The columns that a floating-point solution uses, and those whose constraint its dual solution
    meets, give a basis; it is solved exactly. Where that is not optimal, the simplex method with
    Bland's rule (Math. Oper. Res. 2, 103 (1977)) goes on from it, or, where its x is not feasible,
    begins anew. ``floating`` False: begins anew at once. Raises ValueError for a program without a
    solution or with dependent rows.
    """
    basis = _floating_basis(program) if floating else None
    if basis is None or min(_basic(program, basis)) < 0:
        basis = _feasible_basis(program)
    basis, dual = _descend(program, basis)
    x = [Fraction(0)] * len(program.columns)
    for place, value in zip(basis, _basic(program, basis), strict=True):
        x[place] = _fraction(value)
    y = tuple(_fraction(value) for value in dual)
    return Solution(
        tuple(x), y, sum((a * b for a, b in zip(program.costs, x, strict=True) if b), Fraction(0)))


# -- bases -----------------------------------------------------------------------------------------


def _floating_basis(program: LinearProgram) -> list[int] | None:
    """Return a basis from a floating-point solution, None where there is no such solution."""
    from scipy.optimize import linprog
    from scipy.sparse import csr_matrix

    rows, places, entries = [], [], []
    for place, column in enumerate(program.columns):
        for row, entry in column.items():
            rows.append(row)
            places.append(place)
            entries.append(float(entry))
    shape = (len(program.right), len(program.columns))
    costs = [float(cost) for cost in program.costs]
    found = linprog(costs, A_eq=csr_matrix((entries, (rows, places)), shape=shape),
                    b_eq=[float(value) for value in program.right], method="highs-ds")
    if found.status != 0:
        return None
    dual = found.eqlin.marginals
    slack = [cost - sum(dual[row] * entry for row, entry in column.items())
             for cost, column in zip(costs, program.columns, strict=True)]
    used = [j for j, value in enumerate(found.x) if value > _TOLERANCE]
    tight = [j for j, value in enumerate(slack) if value < _TOLERANCE]
    return _extended(program, [*used, *tight])


def _extended(program: LinearProgram, first: Sequence[int]) -> list[int]:
    """Return a basis that takes independent columns of ``first``, then of the others.

    Chosen modulo a prime: independent there is independent.
    """
    order = list(dict.fromkeys([*first, *range(len(program.columns))]))
    matrix = flint.nmod_mat(len(program.right), len(order), _PRIME)
    for place, j in enumerate(order):
        for row, entry in program.columns[j].items():
            matrix[row, place] = entry
    reduced, rank = matrix.rref()
    if rank < len(program.right):
        raise ValueError("the rows of the linear program are dependent")
    basis, place = [], 0
    for row in range(rank):
        while int(reduced[row, place]) == 0:
            place += 1
        basis.append(order[place])
    return basis


def _matrix(program: LinearProgram, basis: Sequence[int]) -> Any:
    size = len(program.right)
    matrix = flint.fmpq_mat(size, size)
    for place, j in enumerate(basis):
        for row, entry in program.columns[j].items():
            matrix[row, place] = entry
    return matrix


def _basic(program: LinearProgram, basis: Sequence[int]) -> list[flint.fmpq]:
    return list(_matrix(program, basis).solve(_column(program.right)).entries())


def _column(values: Sequence[Fraction]) -> Any:
    return flint.fmpq_mat(len(values), 1, [flint.fmpq(v.numerator, v.denominator) for v in values])


def _fraction(value: flint.fmpq) -> Fraction:
    return Fraction(int(value.p), int(value.q))


# -- the simplex method ----------------------------------------------------------------------------


def _feasible_basis(program: LinearProgram) -> list[int]:
    """Return a basis whose x is not negative: least sum of one more variable for each row."""
    count, size = len(program.columns), len(program.right)
    extra = tuple({row: -1 if value < 0 else 1} for row, value in enumerate(program.right))
    costs = (Fraction(0),) * count + (Fraction(1),) * size
    wider = LinearProgram((*program.columns, *extra), costs, program.right)
    basis, _ = _descend(wider, list(range(count, count + size)))
    used = [(j, value) for j, value in zip(basis, _basic(wider, basis), strict=True) if value]
    if any(j >= count for j, _ in used):
        raise ValueError("the linear program has no solution")
    return _extended(program, [j for j, _ in used])


def _descend(program: LinearProgram, basis: list[int]) -> tuple[list[int], list[flint.fmpq]]:
    """Return an optimal basis and its dual solution, from a feasible basis, by Bland's rule."""
    costs = [flint.fmpq(cost.numerator, cost.denominator) for cost in program.costs]
    while True:
        matrix = _matrix(program, basis)
        dual = matrix.transpose().solve(
            flint.fmpq_mat(len(basis), 1, [costs[j] for j in basis])).entries()
        entering = next(
            (j for j, column in enumerate(program.columns)
             if sum((dual[row] * entry for row, entry in column.items()), flint.fmpq(0)) > costs[j]
             ), None)
        if entering is None:
            return basis, list(dual)
        both = flint.fmpq_mat(len(basis), 2)
        for row, value in enumerate(program.right):
            both[row, 0] = flint.fmpq(value.numerator, value.denominator)
        for row, entry in program.columns[entering].items():
            both[row, 1] = entry
        moved = matrix.solve(both)
        limits = [(moved[i, 0] / moved[i, 1], basis[i], i)
                  for i in range(len(basis)) if moved[i, 1] > 0]
        if not limits:
            raise ValueError("the linear program has no least value")
        basis = list(basis)
        basis[min(limits)[2]] = entering
