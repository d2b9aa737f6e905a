"""Finite changes of a barrier: read, derived, evaluated, bounded, written.

The bound is derived here, from the response bound by integration over the barrier.
"""

import random
from fractions import Fraction

import flint
import mpmath
import pytest
from random_networks import Numbers, random_numbers

from symbolic_response.appendix.document import appendix_text
from symbolic_response.bounds.balls import BallPoint
from symbolic_response.bounds.decide import change_holds
from symbolic_response.bounds.registry import applicable
from symbolic_response.bounds.report import bound
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.network import Barrier, Rates, build_network
from symbolic_response.network.quantities import Change, Probability
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.deriving import derive

NET = build_network("net", states="A B C", transitions=[
    Rates("A", "B", "a", "b", name="e"), Rates("B", "C", "c", "2", name="f"),
    Rates("C", "A", "1", name="g"), Rates("A", "C", "h", "3", name="i")],
    symbols={"a": "positive", "b": "positive", "c": "positive", "h": "real"},
    observables={"q": {"A": 1, "B": "c"}})
AT = {"a": 2, "b": 3, "c": "5/7", "h": "1/4"}
PAIR = Numbers(2, ((0, 1, Fraction(8), Fraction(2)), (0, 1, Fraction(1), Fraction(4))))


def read(text: str) -> object:
    return read_quantity(text, NET)


def test_reading() -> None:
    found = read("change(p[A, B], barrier[f], 2*ln(3/2) - h)")
    assert found == Change(Probability((0, 1)), 1, read_expression("2*ln(3/2) - h"))
    text = "2*change(ln(p[A]/p[B]), barrier[e], -h)/c"
    assert quantity_text(read_quantity(text, NET), NET) == text
    named = build_network("n", states="A B", transitions=[Rates("A", "B", "change", "1")])
    assert derive(named, "change*p[A]").expression == "change/(change + 1)"


@pytest.mark.parametrize(("text", "message"), [
    ("change(p[A], barrier[e])", r"write change\(QUANTITY, barrier\[transition\], AMOUNT\)"),
    ("change(p[A], barrier[e], 1, 2)", r"write change\(QUANTITY"),
    ("change()", r"write change\(QUANTITY"),
    ("change(p[A], , 1)", "a perturbation is"),
    ("change(p[A], barrier[e, f], 1)", "is one barrier"),
    ("change(p[A], drive[e], 1)", "is one barrier"),
    ("change(p[A], barrier[e], p[A])", "\\["),
    ("change(p[A], barrier[e], z)", "unknown symbol 'z'"),
    ("change(, barrier[e], 1)", "a value is expected"),
    ("change(d p[A] / d c, barrier[e], 1)", "without responses or changes"),
    ("change((d p[A] / d c), barrier[e], 1)", "without responses or changes"),
    ("change(change(p[A], barrier[e], 1), barrier[e], 1)", "without responses or changes"),
    ("d change(p[A], barrier[e], 1) / d c", "change.* has no responses"),
    ("change(p[A], barrier[e], 1", "never closed"),
    ("change(" * 20_000 + "p[A]" + ", barrier[e], 1)" * 20_000, "characters long|without"),
    ("change(" * 2_000 + "p[A]" + ", barrier[e], 1)" * 2_000, "characters long|without"),
], ids=lambda text: text[:40])
def test_refusals(text: str, message: str) -> None:
    with pytest.raises(QuantityError, match=message) as caught:
        read(text)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("quantity", [
    "p[B]", "mean[q]", "ln(p[A]/p[C])", "current[f]", "traffic[e]/p[C]", "forward[e]*p[A]", "c"])
@pytest.mark.parametrize("amount", ["2*ln(3/2)", "-ln(7)", "h", "1/2", "ln(c) + h"])
def test_the_closed_form_is_that_of_the_network_with_other_rates(
    quantity: str, amount: str
) -> None:
    """Against the same quantity of a network written with rates times exp(-amount)."""
    other = build_network("other", states="A B C", transitions=[
        Rates("A", "B", f"a*exp(-({amount}))", f"b*exp(-({amount}))", name="e"),
        *[Rates("ABC"[t.first], "ABC"[t.second], t.forward, t.backward, name=t.name)
          for t in NET.transitions[1:]]],
        symbols={"a": "positive", "b": "positive", "c": "positive", "h": "real"},
        observables={"q": {"A": 1, "B": "c"}})
    with mpmath.workdps(30):
        found, after, before = (
            evaluate(derive(network, text).expression) for network, text in (
                (NET, f"change({quantity}, barrier[e], {amount})"), (other, quantity),
                (NET, quantity)))
        assert abs(found - (after - before)) < 1e-25


def evaluate(text: str) -> mpmath.mpf:
    import re

    names = {name: mpmath.mpf(Fraction(value).numerator) / Fraction(value).denominator
             for name, value in AT.items()}
    wrapped = re.sub(r"(?<![\w.])(\d+)", r"mpf(\1)", text)
    return eval(wrapped, {"__builtins__": {}}, {
        **names, "mpf": mpmath.mpf, "exp": mpmath.exp, "ln": mpmath.log, "sqrt": mpmath.sqrt})


@pytest.mark.parametrize("seed", range(4))
def test_values_and_bounds_on_random_networks(seed: int) -> None:
    """Exact values against elimination on fractions, verdicts and sides against 60 digits."""
    rng = random.Random(f"finite {seed}")
    tightest = mpmath.mpf(0)
    for _ in range(20):
        numbers = random_numbers(rng)
        network, e = numbers.network(), rng.randrange(len(numbers.transitions))
        factor = Fraction(rng.randint(1, 40), rng.randint(1, 40))
        before, after = numbers.steady(), numbers.steady(
            [(1 / factor,) * 2 if k == e else (Fraction(1),) * 2
             for k in range(len(numbers.transitions))])
        amount = f"barrier[t{e}], ln({factor})"
        found = derive(network, f"change(p[A], {amount})").value
        assert found is not None and found.exact == after[0] - before[0]
        report = bound(network, f"change(ln(p[A]/p[B]), {amount})")
        assert [row.claim.name for row in report.rows] == ["finite-end-pair", "finite-change"]
        forces = cross_ratio(numbers, e), numbers.force(lambda cycle, e=e: e in cycle)
        with mpmath.workdps(60):
            left = abs(mpmath.log(decimal(after[0] / after[1] * before[1] / before[0])))
            for row, g in zip(report.rows, forces, strict=True):
                right = finite(factor, g)
                assert row.evaluated is not None and row.evaluated.holds is True
                assert not row.claim.has_points
                assert left <= right + mpmath.mpf(10) ** -50
                for shown, value in ((row.evaluated.left, left), (row.evaluated.right, right)):
                    assert shown is not None
                    assert abs(mpmath.mpf(shown[0]) - value) < 1e-18 * (1 + value)
                if right > 0:
                    tightest = max(tightest, left / right)
    assert 0.5 < tightest <= 1 + mpmath.mpf(10) ** -40


def decimal(value: Fraction) -> mpmath.mpf:
    return mpmath.mpf(value.numerator) / value.denominator


def finite(factor: Fraction, g: Fraction | None) -> mpmath.mpf:
    """Return the right side from its statement in DEVELOPERS.md."""
    h = abs(mpmath.log(decimal(factor)))
    if g is None:
        return h
    force = mpmath.log(decimal(g))
    return 2 * mpmath.log(mpmath.cosh((force + h) / 4) / mpmath.cosh((force - h) / 4))


def cross_ratio(numbers: Numbers, e: int) -> Fraction | None:
    a, b, w, v = numbers.transitions[e]
    free = {root: sum((t for k, rates, t in numbers.trees()
                       if k == root and not rates & {2 * e, 2 * e + 1}), Fraction(0))
            for root in (a, b)}
    above, below = w * free[a], v * free[b]
    if above == below:
        return Fraction(1)
    return max(above / below, below / above) if above and below else None


def test_equality_is_decided_exactly() -> None:
    """Rates 8, 2 (after: 2, 1/2) and 1, 4: from 9/6 to 3/(9/2), 2 ln(3/2) on both sides."""
    report = bound(PAIR.network(), "change(ln(p[A]/p[B]), barrier[t0], 2*ln(2))")
    assert derive(PAIR.network(), "change(ln(p[A]/p[B]), barrier[t0], 2*ln(2))"
                  ).expression in ("ln(9/4)", "2*ln(3/2)")
    for row in report.rows:
        assert row.evaluated is not None and row.evaluated.holds is True
        assert row.evaluated.left is not None and row.evaluated.right is not None
        gap = Fraction(row.evaluated.left[0]) / Fraction(row.evaluated.right[0]) - 1
        assert abs(gap) < Fraction(1, 10**20)


@pytest.mark.parametrize(("ratio", "factor", "g", "expected"), [
    (Fraction(9, 4), 4, 16, True), (Fraction(9, 4) + Fraction(1, 10**30), 4, 16, False),
    (Fraction(4, 9), Fraction(1, 4), 16, True), (1, 4, 1, True),
    (1 + Fraction(1, 10**30), 4, 1, False), (4, 4, None, True), (5, 4, None, False),
    (Fraction(401, 100), 4, 10**30, False), (Fraction(399, 100), 4, 10**30, True),
    (2, 1, 16, False), (1, 1, 16, True),
])
def test_exact_verdicts(
    ratio: Fraction, factor: Fraction, g: Fraction | None, expected: bool
) -> None:
    assert change_holds(Fraction(ratio), Fraction(factor),
                        None if g is None else Fraction(g)) is expected


def test_verdicts_agree_with_high_precision() -> None:
    rng = random.Random("verdicts")
    seen = set()
    for _ in range(300):
        factor = Fraction(rng.randint(1, 60), rng.randint(1, 60))
        g = Fraction(rng.randint(9, 90), 9)
        with mpmath.workdps(50):
            limit = mpmath.exp(finite(factor, g))
            ratio = Fraction(int(limit * 10**12), 10**12) + Fraction(rng.choice((-1, 2)), 10**12)
            expected = bool(decimal(max(ratio, 1 / ratio)) <= limit)
        assert change_holds(ratio, factor, g) is expected
        seen.add(expected)
    assert seen == {True, False}


def test_irrational_points_are_enclosed() -> None:
    network = build_network("energy form", states={"A": "E", "B": "0"}, transitions=[
        Barrier("A", "B", "0", "F", name="e"), Barrier("A", "B", "1", name="f")])

    def log_ratio(barrier: mpmath.mpf) -> mpmath.mpf:
        out = mpmath.exp(mpmath.mpf(2) - barrier) + mpmath.exp(mpmath.mpf(-0.5))
        return mpmath.log((mpmath.exp(mpmath.mpf(-1.5) - barrier) + mpmath.exp(-1)) / out)

    text = "change(ln(p[A]/p[B]), barrier[e], 1/3)"
    report = bound(network, text, {"E": "1/2", "F": "3"})
    with mpmath.workdps(40), flint.ctx.workprec(200):
        expected = log_ratio(mpmath.mpf(1) / 3) - log_ratio(mpmath.mpf(0))
        place = BallPoint(Analysis(network),
                          {"E": read_expression("1/2"), "F": read_expression("3")})
        value = place.value(read_quantity(text, network))
        assert abs(mpmath.mpf(value.mid().str(35, radius=False)) - expected) < 1e-30
    for row in report.rows:
        assert row.evaluated is not None and row.evaluated.holds is True


def test_texts_latex_and_the_appendix() -> None:
    text = "change(ln(p[A]/p[B]), barrier[e], 2*ln(3/2))"
    assert [c.name for c in applicable(read_quantity(text, NET), Analysis(NET))] == [
        "finite-end-pair", "finite-change"]
    assert applicable(read_quantity("change(p[A], barrier[e], 1)", NET), Analysis(NET)) == []
    rows = bound(NET, text).rows
    assert rows[1].right == "2*ln(3/2)"  # a cycle through e has a one-way step
    pair = build_network("pair", states="A B", transitions=[
        Rates("A", "B", "a", "1", name="e"), Rates("A", "B", "1", "b", name="f")])
    rows = bound(pair, "change(ln(p[A]/p[B]), barrier[e], -ln(3))").rows
    force = "abs(ln(a*b))"
    assert rows[1].right == f"2*ln(cosh(({force} + ln(3))/4)/cosh(({force} - ln(3))/4))"
    document = appendix_text(NET, quantities=[text, "change(p[C], barrier[i], 1)"])
    assert r"\Bigl[\pi_{C}\Bigr]_{B_{\mathrm{i}}}^{B_{\mathrm{i}} + 1}" in document
    assert "The change of $" in document


def test_substitutions_reach_into_a_change() -> None:
    text = "change(c*p[A], barrier[e], ln(h))"
    found = derive(NET, text, put={"c": "2*a", "h": "a"}, at={"a": 3, "b": 2}).value
    other = derive(NET, text, at={"a": 3, "b": 2, "c": 6, "h": 3}).value
    assert found is not None and other is not None and found.exact == other.exact
    assert found.exact is not None and found.exact != 0
