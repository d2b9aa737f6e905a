"""The arithmetic in floats that chooses candidates, against the exact sides, and what it finds."""

from fractions import Fraction

import numpy as np
import pytest

from symbolic_response.bounds.evaluate import ClaimPoint
from symbolic_response.bounds.registry import applicable, claims_for
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.numeric import CycleSteps, NumericPoints
from symbolic_response.certificates.sampling import Sampler
from symbolic_response.certificates.search import search
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point

RING = build_network("ring", states="A B C D", transitions=[
    Rates("A", "B", "a1*x", "b1*x", name="e"), Rates("B", "C", "a2*x", "b2*x", name="f"),
    Rates("C", "D", "a3", "b3", name="g"), Rates("D", "A", "a4", "b4", name="h")])
CHORD = build_network("chord", states="A B C", transitions=[
    Rates("A", "B", "a1*y**2", "b1*y", name="e"), Rates("B", "C", "a2", "b2", name="f"),
    Rates("C", "A", "a3", "b3", name="g"), Rates("A", "C", "a4", name="h")])


@pytest.mark.parametrize(("network", "text"), [
    (RING, "d ln(p[A]/p[B]) / d ln x"), (RING, "d p[A] / d barrier[e, g]"),
    (RING, "d current[e] / d barrier[e]"), (RING, "d current[e] / d drive[e]"),
    (CHORD, "d ln(p[A]/p[B]) / d ln y"), (CHORD, "d p[C] / d ln y"),
    (CHORD, "d current[h] / d drive[h]")])
def test_ratios_agree_with_exact_ones(network: Network, text: str) -> None:
    analysis = Analysis(network)
    sampler = Sampler(analysis, "numeric")
    points = [sampler.point(index) for index in range(24)]
    values = {axis.name: np.array([float(Fraction(value_text(p[axis.name]))) for p in points])
              for axis in sampler.axes}
    numeric = NumericPoints(CycleSteps(analysis), values, len(points))
    for claim in applicable(read_quantity(text, network), analysis):
        if claim.equality:
            continue  # has no ratio to push up
        found = numeric.ratio(claim)
        compared = 0
        for index, point in enumerate(points):
            exact = ClaimPoint(analysis, Point(network, point)).evaluate(claim)
            if found[index]:  # 0: not trusted
                compared += 1
                assert abs(found[index] - float(exact.ratio())) < 1e-6, claim.name
        assert compared >= 12, claim.name


def test_bundles_are_nearly_reached_on_a_ring() -> None:
    """Derived here: a part of a ring is a bundle, and its bound is tight."""
    analysis = Analysis(RING)
    (claim,) = claims_for(read_quantity("d ln(p[A]/p[C]) / d ln x", RING), analysis, "bundle")
    found = search(claim, analysis, Sampler(analysis, "0"))
    assert found.failing is None and found.place is not None and found.place.ratio is not None
    assert Fraction(99, 100) < found.place.ratio <= 1
