"""Figures about certificates: exact evaluation against SymPy, generator, checker, tightness."""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from fractions import Fraction
from functools import cache
from pathlib import Path

import sympy

from symbolic_response.bounds.claim import Claim, CycleMaximum
from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.bounds.registry import claims_for
from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.record import write_certificate
from symbolic_response.certificates.report import ratio_text
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.certificates.search import search
from symbolic_response.checker import check_file
from symbolic_response.expressions.tree import number
from symbolic_response.network import Network, read_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_form import closed_form
from symbolic_response.response.values import Point
from tests.benchmarks.networks import cube, square_with_chord
from tests.benchmarks.timing import Row, compare

TIDE = Path(__file__).parents[2] / "worked_cases" / "tide_lamp" / "network.toml"
PROBABILITY = "p[s1]"


def _values(network: Network) -> dict[str, Fraction]:
    return {entry.name: Fraction(2 * place + 3, place + 2)
            for place, entry in enumerate(network.symbols)}


@cache
def _claims(analysis: Analysis) -> tuple[Claim, ...]:
    """Return the barrier bounds of one probability for every transition."""
    network = analysis.network
    return tuple(
        claim for t in network.transitions
        for claim in claims_for(
            read_quantity(f"d {PROBABILITY} / d barrier[{t.name}]", network), analysis, "barrier"))


def our_point(analysis: Analysis) -> Callable[[], object]:
    """Return both sides of all barrier bounds at one exact point."""
    claims = _claims(analysis)

    def work() -> None:
        values = {name: number(value) for name, value in _values(analysis.network).items()}
        place = ClaimPoint(analysis, Point(analysis.network, values))
        for claim in claims:
            assert place.evaluate(claim).holds

    return work


def sympy_point(analysis: Analysis) -> Callable[[], object]:
    """Return the same sides by substitution into the same closed forms."""
    network = analysis.network
    symbols = {name: sympy.Symbol(name, positive=True) for name in _values(network)}
    p = closed_form(read_quantity(PROBABILITY, network), analysis).to_sympy()
    sides = []
    for claim in _claims(analysis):
        (term,) = claim.right
        assert isinstance(term.force, CycleMaximum)
        left = closed_form(claim.left, analysis).to_sympy()
        ratios = []
        for cycle in analysis.cycles:
            if term.force.transition in cycle.transitions:
                ratio = sympy.Integer(1)
                for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
                    t = network.transitions[e]
                    step = symbols[t.forward.name] / symbols[t.backward.name]
                    ratio *= step if ahead else 1 / step
                ratios.append(ratio)
        sides.append((left, p * (1 - p), ratios))

    def work() -> None:
        at = {symbols[name]: sympy.Rational(value.numerator, value.denominator)
              for name, value in _values(network).items()}
        for left, factor, ratios in sides:
            x, y = abs(left.subs(at)), factor.subs(at)
            g = max(max(r, 1 / r) for r in (ratio.subs(at) for ratio in ratios))
            assert y >= x and (y + x) ** 2 <= g * (y - x) ** 2

    return work


def row() -> Row:
    """Compare one exact point of all barrier bounds on the cube."""
    analysis = Analysis(cube())
    return compare("barrier bounds of all transitions of the cube at a point", our_point(analysis),
                   "SymPy subs", sympy_point(analysis), 100)


def thousand_points() -> str:
    """Return the time to make and to check a certificate of 1,000 points, on one core."""
    lines = []
    for title, network, text, only in (
        ("square with chord, barrier", square_with_chord(),
         "d ln(p[s1]/p[s2]) / d barrier[e1_2]", "barrier"),
        ("tide lamp, all bounds", read_network(str(TIDE)),
         "d mean[brightness] / d barrier[fade]", None),
    ):
        analysis = Analysis(network)
        start = time.perf_counter()
        made = certify(analysis, text, only=only, method="points", count=1000, workers=1)
        generated = time.perf_counter() - start
        with tempfile.TemporaryDirectory() as folder:
            file = Path(folder) / "record.json"
            write_certificate(made, analysis, file)
            start = time.perf_counter()
            verdict = check_file(str(file))
            checked = time.perf_counter() - start
            size = file.stat().st_size / 1e6
        lines.append(f"1,000 points, {title}: made in {generated:.1f} s, checked in {checked:.1f} s"
                     f" ({verdict.status}), {size:.2f} MB")
    return "\n".join(lines)


def tightness() -> str:
    """Return the largest ratios that the search reaches, with its time."""
    lines = []
    for network in (square_with_chord(), cube()):
        for text in ("d ln(p[s1]/p[s2]) / d barrier[e1_2]", "d p[s1] / d barrier[e1_2]"):
            analysis = Analysis(network)
            for claim in claims_for(read_quantity(text, network), analysis):
                start = time.perf_counter()
                found = search(claim, analysis, Sampler(analysis, "0"))
                seconds = time.perf_counter() - start
                ratio = Fraction(0) if found.place is None else found.place.ratio or Fraction(0)
                lines.append(f"search, {network.title}, {text}, {claim.name}:"
                             f" {ratio_text(ratio)} in {seconds:.2f} s")
    return "\n".join(lines)
