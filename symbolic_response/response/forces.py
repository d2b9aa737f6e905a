"""Cycle forces: their simplest form, which are independent, whether detailed balance holds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.expressions.normal_form import Quotient, normal_form
from symbolic_response.expressions.ring import common_divisor, lift, union
from symbolic_response.expressions.tree import Expression
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import cycle_force
from symbolic_response.topology import Cycle, can_run_along


@dataclass(frozen=True, slots=True)
class CycleForce:
    """A cycle with its force; ``force`` is None where it is infinite, then ``sign`` is +1 or -1.

    The sign of an infinite force: +1 if the cycle can be run along its orientation only.
    """

    cycle: Cycle
    force: Expression | None
    sign: int


@dataclass(frozen=True, slots=True)
class Independence:
    """Which of a list of finite forces are independent over the rationals.

    ``basis``: places of the independent ones, the first that serve; ``relations``: for every
    other one its coefficients in the basis.
    """

    basis: tuple[int, ...]
    relations: dict[int, tuple[Fraction, ...]]


def force_of(cycle: Cycle, analysis: Analysis) -> CycleForce:
    """Return the force of a cycle in its reference orientation, in units of k_B T."""
    if any(analysis.graph.one_way[e] for e in cycle.transitions):
        return CycleForce(cycle, None, 1 if can_run_along(analysis.graph, cycle) else -1)
    force = analysis.simplified(cycle_force(cycle, analysis)).expression()
    return CycleForce(cycle, force, 0)


def force_basis(analysis: Analysis) -> tuple[Cycle, ...]:
    """Return finite-force cycles that every finite cycle force is an integer combination of.

    For networks without one-way transitions the fundamental cycles; else all the cycles that
    avoid them.
    """
    if not any(analysis.graph.one_way):
        return analysis.fundamental_cycles
    return tuple(
        cycle
        for cycle in analysis.cycles
        if not any(analysis.graph.one_way[e] for e in cycle.transitions)
    )


def detailed_balance_holds(analysis: Analysis) -> bool:
    """Return whether every cycle force vanishes identically, decided exactly.

    False for a network in which a one-way transition lies on a cycle.
    """
    if any(analysis.graph.one_way):
        return False
    return all(
        normal_form(cycle_force(cycle, analysis), analysis.domain).is_zero()
        for cycle in analysis.fundamental_cycles
    )


def independent_forces(cycles: Sequence[Cycle], analysis: Analysis) -> Independence:
    """Return which of the (finite) forces are independent, and the others in terms of them.

    Forces are compared as linear combinations of logarithms and symbols in normal form; distinct
    logarithms of primes and of irreducible sums count as independent.
    """
    forms = [normal_form(cycle_force(cycle, analysis), analysis.domain) for cycle in cycles]
    rows = _coordinates(forms)
    if not rows or not rows[0]:
        return Independence((), dict.fromkeys(range(len(rows)), ()))
    columns = [[_fmpq(row[place]) for row in rows] for place in range(len(rows[0]))]
    reduced, rank = flint.fmpq_mat(columns).rref()
    basis = tuple(_pivot(reduced, line) for line in range(rank))
    relations = {
        place: tuple(_fraction(reduced[line, place]) for line in range(rank))
        for place in range(len(rows))
        if place not in basis
    }
    return Independence(basis, relations)


def _pivot(reduced: flint.fmpq_mat, line: int) -> int:
    return next(place for place in range(reduced.ncols()) if reduced[line, place] != 0)


def _coordinates(forms: Sequence[Quotient]) -> list[list[Fraction]]:
    """Return the forms as coordinate vectors over their common monomials."""
    ring = union(form.ring for form in forms)
    common = ring.constant(1)
    lifted = []
    for form in forms:
        top, bottom = (lift(p, form.ring, ring) for p in (form.numerator, form.denominator))
        common = common * (bottom // common_divisor(common, bottom))
        lifted.append((top, bottom))
    polys = [(top * (common // bottom)).to_dict() for top, bottom in lifted]
    monomials = sorted({key for poly in polys for key in poly})
    return [[Fraction(int(poly.get(key, 0))) for key in monomials] for poly in polys]


def _fmpq(value: Fraction) -> flint.fmpq:
    return flint.fmpq(value.numerator, value.denominator)


def _fraction(value: flint.fmpq) -> Fraction:
    return Fraction(int(value.p), int(value.q))
