"""Cycle forces: their simplest form, which are independent, whether detailed balance holds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import flint

from symbolic_response.expressions.normal_form import Quotient, normal_form
from symbolic_response.expressions.ring import lift, union
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
    basis: list[int] = []
    relations: dict[int, tuple[Fraction, ...]] = {}
    for place, row in enumerate(rows):
        found = _combination([rows[b] for b in basis], row)
        if found is None:
            basis.append(place)
        else:
            relations[place] = found
    size = len(basis)
    padded = {place: (*found, *[Fraction(0)] * (size - len(found)))
              for place, found in relations.items()}
    return Independence(tuple(basis), padded)


def _coordinates(forms: Sequence[Quotient]) -> list[list[Fraction]]:
    """Return the forms as coordinate vectors over their common monomials."""
    ring = union(form.ring for form in forms)
    common = ring.constant(1)
    lifted = []
    for form in forms:
        top, bottom = (lift(p, form.ring, ring) for p in (form.numerator, form.denominator))
        common = common * (bottom // common.gcd(bottom))
        lifted.append((top, bottom))
    polys = [(top * (common // bottom)).to_dict() for top, bottom in lifted]
    monomials = sorted({key for poly in polys for key in poly})
    return [[Fraction(int(poly.get(key, 0))) for key in monomials] for poly in polys]


def _combination(
    basis: Sequence[Sequence[Fraction]], row: Sequence[Fraction]
) -> tuple[Fraction, ...] | None:
    """Return the coefficients of ``row`` in independent rows, None if it is not in their span."""
    if not any(row):
        return (Fraction(0),) * len(basis)
    if not basis:
        return None
    size = len(basis)
    entries = [[_fmpq(vector[c]) for vector in basis] + [_fmpq(row[c])] for c in range(len(row))]
    reduced, rank = flint.fmpq_mat(entries).rref()
    if rank > size:
        return None
    return tuple(Fraction(int(reduced[i, size].p), int(reduced[i, size].q)) for i in range(size))


def _fmpq(value: Fraction) -> flint.fmpq:
    return flint.fmpq(value.numerator, value.denominator)
