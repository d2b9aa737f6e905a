"""The steepness program. Oracle: every piece of the family written out, in floating point."""

import random
import time
from fractions import Fraction
from itertools import combinations, product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from proof_networks import analysis_of, strong_graphs
from scipy.optimize import linprog

from symbolic_response.control.family import Family, family_of
from symbolic_response.control.linear_program import LinearProgram, solve
from symbolic_response.control.program import (
    cost,
    dual_value,
    optimum,
    sparse_amounts,
    total,
)
from symbolic_response.topology import Graph

F = Fraction


def float_optimum(family: Family, change: list[Fraction], t: list[Fraction]) -> float:
    """Return the least limit from single pieces: sets of states, bundles, drives, sets of rates.

    max a - min a is the least sum of amounts of sets of states (and of all, which is free).
    """
    columns, costs = [], []
    for size in range(1, family.size):
        for states in combinations(range(family.size), size):
            columns.append([float(j in states) for j in family.sources])
            costs.append(1.0)
    for part, price in [*zip(family.bundles, t, strict=True), *((b, 0) for b in family.blocks)]:
        columns.append([float(e in part) for e, _ in family.rates])
        costs.append(float(price))
    for f in family.drives:
        columns.append([(0.5 - back) * (e == f) for e, back in family.rates])
        costs.append(0.5 if family.is_one_way(f) else 1.0)
    if family.directed:
        for j in range(family.size):
            own = [r for r, k in enumerate(family.sources) if k == j]
            for size in range(1, len(own) + 1):
                for chosen in combinations(own, size):
                    columns.append([float(r in chosen) for r in range(len(family.rates))])
                    costs.append(1.0)
    matrix = np.array(columns).T
    found = linprog([*costs, *costs], A_eq=np.hstack([matrix, -matrix]),
                    b_eq=[float(x) for x in change])
    return float(found.fun)


@st.composite
def problems(draw: st.DrawFn) -> tuple[Family, list[Fraction], list[Fraction]]:
    graph = draw(strong_graphs(max_size=4, extra=3))
    family = family_of(analysis_of(graph), single=draw(st.booleans()), directed=draw(st.booleans()))
    value = st.fractions(-2, 2, max_denominator=3)
    change = draw(st.lists(value, min_size=len(family.rates), max_size=len(family.rates)))
    parts = st.fractions(0, 1, max_denominator=50)
    t = draw(st.lists(parts, min_size=len(family.bundles), max_size=len(family.bundles)))
    return family, change, t


@settings(max_examples=120, deadline=None)
@given(problems())
def test_the_exact_optimum_is_that_of_all_pieces(
    problem: tuple[Family, list[Fraction], list[Fraction]]
) -> None:
    family, change, t = problem
    found = optimum(family, tuple(change), t)
    assert float(found.value) == pytest.approx(float_optimum(family, change, t), abs=1e-7)
    assert total(family, found.amounts) == tuple(change)
    assert cost(family, found.amounts, t) == found.value
    assert dual_value(family, tuple(change), found.dual, t) == found.value


@settings(max_examples=40, deadline=None)
@given(problems())
def test_the_simplex_method_alone_agrees(
    problem: tuple[Family, list[Fraction], list[Fraction]]
) -> None:
    family, change, t = problem
    exact = optimum(family, tuple(change), t, floating=False)
    assert exact.value == optimum(family, tuple(change), t).value
    assert total(family, sparse_amounts(family, tuple(change))) == tuple(change)


@settings(max_examples=40, deadline=None)
@given(problems(), st.randoms())
def test_a_wrong_dual_is_refused(
    problem: tuple[Family, list[Fraction], list[Fraction]], rng: random.Random
) -> None:
    """Any numbers y that keep the constraints give a lower bound; the optimum is the largest."""
    family, change, t = problem
    best = optimum(family, tuple(change), t)
    for _ in range(5):
        dual = list(best.dual)
        dual[rng.randrange(len(dual))] += F(rng.choice([-1, 1]), 10**12)
        value = dual_value(family, tuple(change), tuple(dual), t)
        assert value is None or value <= best.value
    far = tuple(y + 3 for y in best.dual)
    assert dual_value(family, tuple(change), far, t) is None


# -- worked examples -------------------------------------------------------------------------------

RING = Graph(4, ((0, 1), (1, 2), (2, 3), (3, 0)), (False,) * 4)
# both rates out of state 1, and 2 -> 3 and 4 -> 3
STEERED = tuple(map(F, (1, 0, 1, 0, 0, 1, 0, 1)))


@pytest.mark.parametrize("t", [F(0), F(1, 7), F(1, 2), F(3, 5), F(99, 100), F(1)])
def test_a_ring_of_four_states(t: Fraction) -> None:
    analysis = analysis_of(RING)

    def least(**options: bool) -> Fraction:
        family = family_of(analysis, **options)
        return optimum(family, STEERED, [t] * len(family.bundles)).value

    assert least(single=True, directed=False) == 2 + 2 * t
    assert least(single=True) == min(2 + 2 * t, F(3))
    assert least() == 2 + t


def test_two_triangles_that_share_a_state() -> None:
    """Scaling all rates of one of them changes nothing."""
    graph = Graph(5, ((0, 1), (1, 2), (2, 0), (0, 3), (3, 4), (4, 0)), (False,) * 6)
    family = family_of(analysis_of(graph))
    change = tuple(F(e < 3) for e, _ in family.rates)
    found = optimum(family, change, [F(1)] * len(family.bundles))
    assert found.value == 0 and not any(found.dual)
    assert sum(map(bool, sparse_amounts(family, change).blocks)) == 1


def test_elementary_changes() -> None:
    """An energy 1, a barrier t, a drive 1, one rate 1; half for the drive of a one-way step."""
    graph = Graph(3, ((0, 1), (1, 2), (2, 0), (0, 2)), (False, False, True, False))
    family = family_of(analysis_of(graph))
    t = [F(1, 3)] * len(family.bundles)

    def least(entries: dict[tuple[int, bool], Fraction]) -> Fraction:
        change = tuple(entries.get(rate, F(0)) for rate in family.rates)
        return optimum(family, change, t).value

    assert least({rate: F(1) for rate, k in zip(family.rates, family.sources, strict=True)
                  if k == 0}) == 1
    assert least({(0, False): F(1), (0, True): F(1)}) == F(1, 3)
    assert least({(0, False): F(1, 2), (0, True): F(-1, 2)}) == 1
    assert least({(1, True): F(1)}) == 1
    assert least({(2, False): F(1)}) == F(1, 3)  # the barrier of a one-way step is its rate
    free = family_of(analysis_of(graph), directed=False)
    change = tuple(F(rate == (2, False), 2) for rate in free.rates)
    assert optimum(free, change, [F(1)] * len(free.bundles)).value == F(1, 2)
    assert least(dict.fromkeys(family.rates, F(5))) == 0


def test_values_of_t_are_checked() -> None:
    family = family_of(analysis_of(RING))
    with pytest.raises(ValueError, match="one t between 0 and 1"):
        optimum(family, STEERED, [F(1, 2)])
    with pytest.raises(ValueError, match="one t between 0 and 1"):
        optimum(family, STEERED, [F(3, 2)] * len(family.bundles))


def test_the_cube_takes_a_moment() -> None:
    """8 states, 12 transitions, 24 rates; t with many digits."""
    graph = Graph(8, tuple((k, k | bit) for k in range(8) for bit in (1, 2, 4) if not k & bit),
                  (False,) * 12)
    family = family_of(analysis_of(graph))
    rng = random.Random("cube")
    started = time.perf_counter()
    for _ in range(10):
        change = tuple(F(rng.randint(-3, 3)) for _ in family.rates)
        t = [F(rng.randint(0, 10**30), 10**30) for _ in family.bundles]
        found = optimum(family, change, t)
        assert float(found.value) == pytest.approx(float_optimum(family, list(change), t))
    assert time.perf_counter() - started < 20


# -- linear programs -------------------------------------------------------------------------------


def test_a_program_without_a_solution() -> None:
    program = LinearProgram(({0: 1}, {0: 1, 1: 1}), (F(1), F(1)), (F(1), F(2)))
    with pytest.raises(ValueError, match="no solution"):
        solve(program)


def test_a_program_without_a_least_value() -> None:
    program = LinearProgram(({0: 1}, {0: -1}), (F(-2), F(1)), (F(1),))
    for floating in (True, False):
        with pytest.raises(ValueError, match="no least value"):
            solve(program, floating=floating)


def test_dependent_rows() -> None:
    program = LinearProgram(({0: 1, 1: 1}, {0: 2, 1: 2}), (F(1), F(1)), (F(1), F(1)))
    with pytest.raises(ValueError, match="dependent"):
        solve(program)


def test_a_basis_that_floating_point_gets_wrong() -> None:
    """Costs that differ by less than a float can tell; the least one is found nonetheless."""
    small = F(1, 10**40)
    program = LinearProgram(({0: 1}, {0: 1}, {0: 1}), (1 + 2 * small, 1 + small, 1 + 3 * small),
                            (F(1),))
    assert solve(program).value == 1 + small
    tiny = LinearProgram(({0: 1}, {1: 1}, {0: 1, 1: 1}), (F(1), F(1), F(3)), (small, F(1)))
    assert solve(tiny).x == (small, F(1), F(0))


def test_degenerate_programs_end() -> None:
    """Many vertices in one: right sides that are 0, and a classical example of circling.

    Beale, Nav. Res. Logist. Q. 2, 269 (1955), scaled to integers.
    """
    columns = ({0: 25, 1: 50}, {0: -6000, 1: -9000}, {0: -4, 1: -2}, {0: 900, 1: 300, 2: 0},
               {0: 100}, {1: 100}, {2: 1})
    columns = (columns[0], columns[1], {**columns[2], 2: 1}, {0: 900, 1: 300}, *columns[4:])
    costs = (F(-3, 4), F(150), F(-1, 50), F(6), F(0), F(0), F(0))
    for floating in (True, False):
        found = solve(LinearProgram(columns, costs, (F(0), F(0), F(1))), floating=floating)
        assert found.value == F(-1, 20) == found.dual[2]
        for column, price in zip(columns, costs, strict=True):
            assert sum(found.dual[row] * entry for row, entry in column.items()) <= price
    for signs in product((0, 1), repeat=3):
        flat = LinearProgram(({0: 1, 1: 1}, {1: 1, 2: 1}, {0: -1, 2: 1}, {2: 1}),
                             (F(1), F(1), F(1), F(2)), tuple(map(F, signs)))
        answers = set()
        for floating in (True, False):
            try:
                answers.add(solve(flat, floating=floating).value)
            except ValueError:
                answers.add(None)
        assert len(answers) == 1
