"""Sampled rates and the envelope of a barrier bound: a cloud of exact points below tanh(F/4)."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, replace
from fractions import Fraction

from symbolic_response.bounds.claim import Claim, CycleMaximum
from symbolic_response.bounds.decide import Weighted, holds
from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.bounds.registry import claims_for
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.bounds.target import Absolute, Extreme, absolute
from symbolic_response.bounds.topological import competing
from symbolic_response.certificates.construct import constructed
from symbolic_response.certificates.points import (
    STRETCH,
    Step,
    check_seed,
    process_pool,
    results_in_order,
    symbolic_parts,
    values_text,
)
from symbolic_response.certificates.sampling import Sampler, Values
from symbolic_response.certificates.tally import Stretch
from symbolic_response.control.curve_data import csv_text, decimal_text, logarithm
from symbolic_response.errors import QuantityError, RefutedError
from symbolic_response.expressions.text import fraction_text
from symbolic_response.expressions.tree import ONE, ZERO, Expression, Sum, Symbol, divide, rebuild
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Response
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, as_analysis
from symbolic_response.response.notation import Notation, notation_of
from symbolic_response.response.quantity_latex import perturbation_in, quantity_in
from symbolic_response.response.values import Point
from symbolic_response.topology import can_run_against, can_run_along

COUNT = 2000
STRENGTHS = tuple(Fraction(4) ** k for k in range(1, 9))
"""exp of the forces at which points near the envelope are made."""


@dataclass(frozen=True, slots=True)
class CloudPoint:
    """One exact point: ``g`` = exp(F_max), ``value`` the size of the normalised response.

    ``end_pair``: exp(|ln r|), r the cross ratio of the two ends. ``made``: by construction.
    """

    g: Fraction
    value: Fraction
    end_pair: Fraction
    made: bool = False

    @property
    def force(self) -> float:
        """F_max, for drawing."""
        return logarithm(self.g)

    @property
    def end_pair_force(self) -> float:
        """|ln r|, for drawing."""
        return logarithm(self.end_pair)


@dataclass(frozen=True, slots=True)
class Cloud:
    """The response to one barrier at sampled points, divided by the factor Y of its bound.

    ``value_text``, ``value_latex``: |response|/Y. ``transition``: the one whose barrier is raised.
    ``points``: ``count`` samples drawn from ``seed``, then those by construction; ``skipped`` says
    why there are none of these.
    """

    value_text: str
    value_latex: str
    transition: str
    transition_latex: str
    force_latex: str
    seed: str
    count: int
    points: tuple[CloudPoint, ...]
    skipped: str | None = None


def cloud(
    subject: Network | Analysis,
    text: str,
    count: int = COUNT,
    seed: str = "0",
    workers: int | None = None,
    progress: Step | None = None,
) -> Cloud:
    """Return the normalised response to a barrier against the largest cycle force, exactly.

    The points are those of certificates (stratified in force), then points made to be near the
    envelope. The outcome does not depend on ``workers`` (processes; all cores by default);
    ``progress`` is called with points done and their total. Raises QuantityError where the barrier
    bound does not apply, is infinite (a one-way transition in a cycle) or is zero (a bridge, a
    constant), EvaluationError and UndecidedError as ``certify`` does.
    """
    check_seed(seed)
    analysis = as_analysis(subject)
    if count < 1:
        raise QuantityError("a cloud needs one point or more")
    network = analysis.network
    quantity = read_quantity(text, network)
    (claim,) = claims_for(quantity, analysis, "barrier")
    (ends,) = claims_for(quantity, analysis, "end-pair")
    e = _transition(claim, analysis)
    expressions = tuple(symbolic_parts(quantity, network))
    sampler = Sampler(analysis, seed, expressions)
    sampler.point(0)  # refuses at once what cannot be sampled
    whole = Stretch(network, (claim, ends), expressions, seed, 0, count, analysis.cycle_limit)
    report = progress or (lambda done, total: None)
    with process_pool(workers, None, count) as pool:
        points = _sampled(whole, analysis, pool, lambda done: report(done, count))
    made, skipped = _constructed(whole, analysis, sampler)
    notation = notation_of(network)
    term = claim.right[0].factor
    return Cloud(
        quantity_text(divide(absolute(claim.left), term), network),
        _value_latex(claim.left, term, notation),
        network.transitions[e].name, notation.transitions[e],
        rf"{notation.letters['force']}_{{\max}}",
        seed, count, (*points, *made), skipped,
    )


def _transition(claim: Claim, analysis: Analysis) -> int:
    """Return the transition of a barrier bound that is neither infinite nor zero."""
    (term,) = claim.right
    force = term.force
    assert isinstance(force, CycleMaximum)
    name = analysis.network.transitions[force.transition].name
    cycles = competing(force, analysis)
    if not cycles:
        raise QuantityError(f"{name} is a bridge: nothing responds to its barrier")
    if term.factor == ZERO:
        raise QuantityError("a constant observable does not respond to a barrier")
    graph = analysis.graph
    for cycle in cycles:
        if not (can_run_along(graph, cycle) and can_run_against(graph, cycle)):
            raise QuantityError(f"a one-way transition in a cycle through {name} makes its largest"
                                " force infinite everywhere; there is no cloud to draw against it")
    return force.transition


def _sampled(
    whole: Stretch, analysis: Analysis, pool: Executor | None, report: Callable[[int], None]
) -> list[CloudPoint]:
    stretches = [replace(whole, start=start, stop=min(start + STRETCH, whole.stop))
                 for start in range(0, whole.stop, STRETCH)]
    parts = ((_stretch(stretch, analysis) for stretch in stretches) if pool is None
             else results_in_order([pool.submit(_stretch, stretch) for stretch in stretches]))
    points: list[CloudPoint] = []
    for part in parts:
        points += part
        report(len(points))
    return points


def _stretch(stretch: Stretch, analysis: Analysis | None = None) -> list[CloudPoint]:
    """Return the points of a stretch; fit for a process of its own."""
    if analysis is None:
        analysis = Analysis(stretch.network, cycle_limit=stretch.cycle_limit)
    sampler = Sampler(analysis, stretch.seed, stretch.expressions)
    indices = range(stretch.start, stretch.stop)
    return [_point(stretch.claims, analysis, sampler.point(index)) for index in indices]


def _constructed(
    whole: Stretch, analysis: Analysis, sampler: Sampler
) -> tuple[list[CloudPoint], str | None]:
    """Return points near the envelope, at several forces, or why there are none."""
    points: list[CloudPoint] = []
    for strength in STRENGTHS:
        made = constructed(whole.claims[0], analysis, sampler, strength)
        if made.skipped is not None:
            return [], made.skipped
        points += [_point(whole.claims, analysis, values, made=True) for values in made.points
                   if sampler.not_positive(values) is None]
    return points, None


def _point(
    claims: Sequence[Claim], analysis: Analysis, values: Values, made: bool = False
) -> CloudPoint:
    """Return the cloud's point at some values of the symbols; RefutedError above the envelope."""
    place = ClaimPoint(analysis, Point(analysis.network, values))
    claim, ends = claims
    force, cross = claim.right[0].force, ends.right[0].force
    assert force is not None and cross is not None
    g, end_pair = place.force(force), place.force(cross)
    assert g is not None and end_pair is not None  # no one-way transition in a cycle through e
    value = abs(place.value(claim.left)) / place.value(claim.right[0].factor)
    if not holds(value, [Weighted(Fraction(1), g)]):
        raise RefutedError(f"{claim.name} is refuted at {values_text(values)}: the normalised"
                           f" response is {fraction_text(value)}, exp(F) is {fraction_text(g)}")
    return CloudPoint(g, value, end_pair, made)


def _value_latex(response: Expression, factor: Expression, notation: Notation) -> str:
    """Return |response|/Y on one line; maxima and absolute values in Y as functions."""
    assert isinstance(response, Response)
    inner = quantity_in(notation, response.quantity)
    inner = rf"\left({inner}\right)" if isinstance(response.quantity, Sum) else inner
    inner = rf"\, {inner}" if inner.startswith(r"\ln") else inner
    by = perturbation_in(notation, response.perturbation)
    shown = rf"\left|\partial {inner} \, / \, \partial {by}\right|"
    if factor == ONE:
        return shown
    return rf"{shown} \, / \, \left[{_factor_latex(factor, notation)}\right]"


def _factor_latex(factor: Expression, notation: Notation) -> str:
    names: dict[str, str] = {}

    def leaf(part: Expression) -> Expression:
        match part:
            case Extreme(name, parts):
                inner = ", ".join(_factor_latex(entry, notation) for entry in parts)
                shown = rf"\{name}({inner})"
            case Absolute(inside):
                shown = rf"\left|{_factor_latex(inside, notation)}\right|"
            case _:
                return part
        names["#" + shown] = shown
        return Symbol("#" + shown)

    plain = rebuild(factor, leaf)
    return quantity_in(replace(notation, symbols={**notation.symbols, **names}), plain)


def cloud_csv(data: Cloud) -> str:
    """Return the points as CSV: exp of the forces and values exactly, and decimals of all."""
    rows = [[f"exp(force_max[{data.transition}])", f"force_max[{data.transition}] (decimal)",
             data.value_text, f"{data.value_text} (decimal)",
             "exp(abs(ln(r)))", "abs(ln(r)) (decimal)", "point"]]
    for point in data.points:
        rows.append([fraction_text(point.g), f"{point.force:.12g}",
                     fraction_text(point.value), decimal_text(point.value),
                     fraction_text(point.end_pair), f"{point.end_pair_force:.12g}",
                     "constructed" if point.made else "sampled"])
    return csv_text(rows)
