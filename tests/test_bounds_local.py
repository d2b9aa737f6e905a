"""Changes local to one transition, and second derivatives by a barrier: derived here.

The oracle: W p' = -W' p on fractions, differences at 60 digits; psi from its statement by mpmath.
"""

import random
from fractions import Fraction

import flint
import mpmath
import pytest
from random_networks import Numbers, random_numbers

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.curves import LocalChange, curve_ball, weighted
from symbolic_response.bounds.decide import right_bounds
from symbolic_response.bounds.enclose import enclose
from symbolic_response.bounds.evaluate import ClaimPoint, Evaluated
from symbolic_response.bounds.registry import applicable
from symbolic_response.bounds.report import bound, report_data
from symbolic_response.bounds.sides import right_text
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network import Barrier, Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.values import Point

RATIO = "d ln(p[A]/p[B]) / d ln x"
POWERS = ("-2", "-1", "-1/2", "0", "1/3", "1/2", "1", "3/2", "2")


def psi(ahead: Fraction, behind: Fraction, g: Fraction | None) -> mpmath.mpf:
    """Return psi from its statement in DEVELOPERS.md."""
    u, v = (mpmath.mpf(x.numerator) / x.denominator
            for x in sorted((abs(ahead), abs(behind)), reverse=True))
    if ahead * behind <= 0:
        return u + v
    if g is None:
        return u
    r = mpmath.mpf(g.numerator) / g.denominator
    if r > 1 and v * r >= u:
        return (mpmath.sqrt(u * r) - mpmath.sqrt(v)) ** 2 / (r - 1)
    return u - v


def with_powers(numbers: Numbers, e: int, ahead: str, behind: str) -> Network:
    """Return the network with the rates of e times powers of a symbol x, to be taken at 1."""
    names = "ABCD"[: numbers.size]
    rates = []
    for place, (a, b, w, v) in enumerate(numbers.transitions):
        factors = (f"x**({ahead})*", f"x**({behind})*") if place == e else ("", "")
        rates.append(Rates(names[a], names[b], f"{factors[0]}{w}",
                           f"{factors[1]}{v}" if v else None, name=f"t{place}"))
    return build_network("local", states=list(names), transitions=rates,
                         symbols={"x": "positive"})


def cross_ratio(numbers: Numbers, e: int) -> Fraction | None:
    a, b, w, v = numbers.transitions[e]
    free = {root: sum((t for k, rates, t in numbers.trees()
                       if k == root and not rates & {2 * e, 2 * e + 1}), Fraction(0))
            for root in (a, b)}
    above, below = w * free[a], v * free[b]
    if above == below:
        return Fraction(1)
    return max(above / below, below / above) if above and below else None


def claims_at(network: Network, text: str) -> tuple[dict[str, Claim], dict[str, Evaluated]]:
    analysis = Analysis(network)
    claims = {claim.name: claim for claim in applicable(read_quantity(text, network), analysis)}
    place = ClaimPoint(analysis, Point(network, {"x": read_expression("1")}))
    return claims, {name: place.evaluate(claim) for name, claim in claims.items()}


@pytest.mark.parametrize("seed", range(6))
def test_random_powers_on_random_networks(seed: int) -> None:
    rng = random.Random(f"local {seed}")
    tightest, compared = 0.0, 0
    for _ in range(40):
        numbers = random_numbers(rng)
        e = rng.randrange(len(numbers.transitions))
        ahead, behind = rng.choice(POWERS), rng.choice(POWERS)
        one_way = not numbers.transitions[e][3]
        powers = Fraction(ahead), Fraction(0) if one_way else Fraction(behind)
        if powers == (0, 0) or (one_way and not powers[0]):
            continue
        claims, found = claims_at(with_powers(numbers, e, ahead, behind), RATIO)
        moves = [(Fraction(0), Fraction(0))] * len(numbers.transitions)
        moves[e] = powers
        p, dp = numbers.change(moves)
        left = abs(dp[0] / p[0] - dp[1] / p[1])
        forces = {"local-change": numbers.force(lambda cycle, e=e: e in cycle),
                  "local-end-pair": cross_ratio(numbers, e)}
        assert ("local-end-pair" in claims) == (powers[0] * powers[1] > 0)
        for name in set(forces) & set(claims):
            assert not claims[name].has_points
            assert found[name].left == left and found[name].holds is True
            with mpmath.workdps(60):
                right = psi(*powers, forces[name])
                low, high = (mpmath.mpf(x.numerator) / x.denominator
                             for x in right_bounds(found[name].right))
                assert low - mpmath.mpf(10) ** -30 <= right <= high + mpmath.mpf(10) ** -30
                if right:
                    tightest = max(tightest, float(left.numerator / right / left.denominator))
            compared += 1
    assert compared > 20 and 0.5 < tightest <= 1


def test_where_psi_is_reached() -> None:
    """Two parallel transitions, powers 2 and 1, R = 64: sqrt(2*64)/sqrt(1) sets the best rates."""
    u, v = Fraction(2), Fraction(1)
    best = 0.0
    for k in range(-60, 61):
        scale = Fraction(2) ** (k // 8) * (8 + k % 8) / 8
        numbers = Numbers(2, ((0, 1, 8 * scale, scale), (0, 1, Fraction(1), Fraction(8))))
        _, found = claims_at(with_powers(numbers, 0, "2", "1"), "d ln(p[A]/p[B]) / d ln x")
        assert found["local-change"].holds is True
        best = max(best, float(found["local-change"].ratio()))
    assert 0.999 < best <= 1 and u > v


def test_special_cases_of_psi() -> None:
    """u = v: u tanh(F/4) (the barrier bound); 1/2 and -1/2: 1 (the drive bound)."""
    for g in (Fraction(1), Fraction(16), Fraction(7, 3)):
        equal = weighted(LocalChange(Fraction(2), Fraction(2)), Fraction(3), g)
        with mpmath.workdps(40):
            expected = 6 * mpmath.tanh(mpmath.log(mpmath.mpf(g.numerator) / g.denominator) / 4)
            low, high = (mpmath.mpf(x.numerator) / x.denominator for x in right_bounds(equal))
            assert low - 1e-30 <= expected <= high + 1e-30
    pair = Numbers(2, ((0, 1, Fraction(4), Fraction(1)), (0, 1, Fraction(1), Fraction(4))))
    claims, found = claims_at(with_powers(pair, 0, "1/2", "-1/2"), "d ln(p[A]/p[B]) / d ln x")
    assert found["local-change"].right_value() == 1 and "local-end-pair" not in claims
    _, found = claims_at(with_powers(pair, 0, "1", "1"), "d ln(p[A]/p[B]) / d ln x")
    assert found["local-change"].right_value() == found["local-change"].left == Fraction(3, 5)
    infinite = weighted(LocalChange(Fraction(2), Fraction(1)), Fraction(1), None)
    assert right_bounds(infinite) == (2, 2)
    below = weighted(LocalChange(Fraction(4), Fraction(1)), Fraction(1), Fraction(3))
    assert right_bounds(below) == (3, 3)


@pytest.mark.parametrize(("u", "v"), [("2", "1"), ("1", "1"), ("3", "1/5"), ("1", "0")])
def test_balls_contain_psi(u: str, v: str) -> None:
    curve = LocalChange(Fraction(u), Fraction(v))
    for top in (1, 2, 3, 17, 400):
        with flint.ctx.workprec(128), mpmath.workdps(60):
            found = curve_ball(curve, flint.arb(flint.fmpq(top, 3)).log().max(flint.arb(0)))
            expected = psi(curve.larger, curve.smaller, max(Fraction(top, 3), Fraction(1)))
            assert abs(mpmath.mpf(found.mid().str(40, radius=False)) - expected) < 1e-30
            assert found.rad() < 1e-30
    assert curve_ball(curve, None) == flint.arb(flint.fmpq(curve.larger.numerator))


def test_irrational_points_and_data() -> None:
    network = build_network("energy form", states={"A": "E", "B": "0", "C": "0"}, transitions=[
        Barrier("A", "B", "-2*x", "x", name="e"), Barrier("B", "C", "1", name="f"),
        Barrier("C", "A", "0", "F", name="g")], symbols={"E": "real", "x": "real", "F": "real"})
    text = "d ln(p[A]/p[B]) / d x"
    at = {"E": "1/2", "x": "1/3", "F": "3"}
    report = bound(network, text, at)
    rows = {row.claim.name: row for row in report.rows}
    for name in ("local-end-pair", "local-change"):
        assert rows[name].evaluated is not None and rows[name].evaluated.holds is True
        assert rows[name].right.startswith("psi(5/2, 3/2, abs(")
    data = {row["name"]: row["data"] for row in report_data(report)["bounds"]}  # type: ignore
    assert data["local-change"]["changes"] == ["5/2", "3/2"]
    assert "(sqrt(u*R) - sqrt(v))**2/(R - 1)" in data["local-change"]["psi"]
    found = rows["local-change"].evaluated
    force = Fraction(1, 3) + 3
    with mpmath.workdps(40):
        r = mpmath.exp(mpmath.mpf(force.numerator) / force.denominator)
        expected = (mpmath.sqrt(mpmath.mpf(5) / 2 * r) - mpmath.sqrt(1.5)) ** 2 / (r - 1)
        assert abs(mpmath.mpf(found.right[0]) - expected) < 1e-20  # type: ignore


def test_texts() -> None:
    ring = build_network("ring", states="A B C", transitions=[
        Rates("A", "B", "c**2*a", "b", name="e"), Rates("B", "C", "k", "1", name="f"),
        Rates("C", "A", "1", name="g")])
    (claim,) = (c for c in applicable(read_quantity("d ln(p[A]/p[B]) / d ln c", ring),
                                      Analysis(ring)) if c.name == "local-change")
    assert right_text(claim, Analysis(ring)) == "2" and "psi" not in claim.data
    two = build_network("two", states="A B", transitions=[
        Rates("A", "B", "c", "b", name="e"), Rates("A", "B", "c", "1", name="f")])
    assert "local-change" not in {claim.name for claim in applicable(
        read_quantity("d ln(p[A]/p[B]) / d ln c", two), Analysis(two))}
    assert claim.source == "derived here; see DEVELOPERS.md, The end-pair theorem"


@pytest.mark.parametrize("seed", range(3))
def test_second_order_on_random_networks(seed: int) -> None:
    """|d^2 ln(<Q>/<R>)/d barrier^2| <= 1/4, against third-point differences at 60 digits."""
    rng = random.Random(f"second {seed}")
    tightest = Fraction(0)
    for _ in range(25):
        numbers = random_numbers(rng)
        network, e = numbers.network(), rng.randrange(len(numbers.transitions))
        analysis = Analysis(network)
        (claim,) = applicable(read_quantity(
            f"d (d ln(p[A]/p[B]) / d barrier[t{e}]) / d barrier[t{e}]", network), analysis)
        assert (claim.name, claim.has_points) == ("second-order", False)
        found = ClaimPoint(analysis, Point(network, {})).evaluate(claim)
        assert found.holds is True and found.right_value() == Fraction(1, 4)

        def at(z: Fraction) -> mpmath.mpf:
            p = numbers.steady([(z, z) if k == e else (Fraction(1),) * 2  # noqa: B023
                                for k in range(len(numbers.transitions))])  # noqa: B023
            return mpmath.log(mpmath.mpf((p[0] / p[1]).numerator) / (p[0] / p[1]).denominator)

        with mpmath.workdps(60):
            step = Fraction(1, 10**10)
            size = mpmath.log1p(mpmath.mpf(1) / 10**10)
            second = (at(1 + step) - 2 * at(Fraction(1)) + at(1 / (1 + step))) / size**2
            assert abs(abs(second) - float(found.left)) < 1e-9
        tightest = max(tightest, found.ratio())
    assert Fraction(1, 2) < tightest <= 1


def test_second_order_encloses_irrational_points() -> None:
    network = build_network("energy form", states={"A": "E", "B": "0"}, transitions=[
        Barrier("A", "B", "0", "F", name="e"), Barrier("A", "B", "1", name="f")])
    analysis = Analysis(network)
    (claim,) = applicable(read_quantity(
        "d (d ln p[A] / d barrier[e]) / d barrier[e]", network), analysis)
    found = enclose(claim, analysis, {"E": read_expression("1/2"), "F": read_expression("3")})

    def log_p(barrier: mpmath.mpf) -> mpmath.mpf:
        out = mpmath.exp(mpmath.mpf(2) - barrier) + mpmath.exp(mpmath.mpf(-0.5))
        back = mpmath.exp(mpmath.mpf(-1.5) - barrier) + mpmath.exp(-1)
        return mpmath.log(back / (out + back))

    with mpmath.workdps(50):
        expected = abs(mpmath.diff(log_p, 0, 2))
        assert found.holds is True and found.left is not None
        assert abs(mpmath.mpf(found.left[0]) - expected) < 1e-15
