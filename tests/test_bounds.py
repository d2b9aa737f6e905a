"""The catalogue as it is shown: which bounds apply, their texts, data, exits and LaTeX."""

import json
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest

from symbolic_response.bounds.curves import Tanh
from symbolic_response.bounds.decide import Weighted, holds, tanh_bounds
from symbolic_response.bounds.registry import NAMES, claims_for
from symbolic_response.bounds.report import bound
from symbolic_response.bounds.sides import left_text, right_text
from symbolic_response.cli import run
from symbolic_response.errors import QuantityError
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis

RING = build_network("ring", states="A B C", transitions=[
    Rates("A", "B", "a*c", "b", name="bind"), Rates("B", "C", "e", "f", name="flip"),
    Rates("C", "A", "g", "h", name="reset")],
    observables={"q": {"B": 2, "C": -1}, "moving": {"A": "c"}})
PAIR = build_network("pair", states="A B", transitions=[
    Rates("A", "B", 4, 1, name="one"), Rates("A", "B", 1, 4, name="two")])
TREE = build_network("tree", states="A B C", transitions=[
    Rates("A", "B", "a", "b", name="ab"), Rates("B", "C", "e", "f", name="bc")])


def names(network: Network, text: str) -> list[str]:
    return [c.name for c in claims_for(read_quantity(text, network), Analysis(network))]


@pytest.mark.parametrize(("text", "expected"), [
    ("d p[A] / d energy[B]", ["energy-covariance", "energy-range"]),
    ("d ln(p[A]/p[B]) / d energy[B]", ["energy-range"]),
    ("d p[A] / d barrier[bind]",
     ["splitting-end-pair", "end-pair", "splitting-barrier", "barrier"]),
    ("d (p[A] + p[B]) / d drive[bind]", ["splitting-drive", "drive"]),
    ("d p[A]/p[B] / d barrier[bind]", ["end-pair", "barrier"]),
    ("d mean[q] / d ln c", ["local-change", "parameter", "directed-bundle", "support"]),
    ("d ln p[A] / d c", ["parameter", "directed-bundle", "support"]),
    ("d ln p[A] / d barrier[bind, flip]", ["bundle", "parameter", "directed-bundle"]),
    ("ln(p[A]/p[B])", ["path", "path"]),
    ("p[A]/p[B]", ["path", "path"]),
    ("d (d ln(p[A]/p[B]) / d barrier[bind]) / d barrier[bind]", ["second-order"]),
    ("d current[bind] / d barrier[bind]", ["current-exact", "current-range"]),
    ("d current[flip] / d drive[flip]", ["current-exact", "current-range"]),
])
def test_which_bounds_apply(text: str, expected: list[str]) -> None:
    assert names(RING, text) == expected


@pytest.mark.parametrize("text", [
    "p[A]", "current[bind]", "d current[bind] / d barrier[flip]", "d mean[moving] / d c",
    "d (d p[A] / d barrier[bind]) / d barrier[bind]",
    "d (d ln p[A] / d barrier[bind]) / d barrier[flip]",
    "d current[bind] / d ln c", "d current[bind] / d energy[A]",
    "d 2*current[bind] / d drive[bind]",
    "d (d p[A] / d c) / d c", "d p[A]*p[B] / d c", "d ln mean[q] / d barrier[bind]",
])
def test_what_the_catalogue_does_not_speak_of(text: str) -> None:
    """A mean of both signs has no logarithm; an observable must not move with the parameter."""
    with pytest.raises(QuantityError, match="no bound of the catalogue applies"):
        names(RING, text)


def test_an_unknown_bound_names_the_nearest() -> None:
    with pytest.raises(QuantityError, match="did you mean 'barrier'"):
        claims_for(read_quantity("d p[A] / d c", RING), Analysis(RING), "barier")
    with pytest.raises(QuantityError, match="'barrier' does not apply"):
        claims_for(read_quantity("d p[A] / d c", RING), Analysis(RING), "barrier")


def test_texts() -> None:
    analysis = Analysis(RING)
    (claim,) = claims_for(read_quantity("d ln(p[A]/p[B]) / d barrier[flip]", RING), analysis,
                          "barrier")
    assert left_text(claim, RING) == "abs(d ln(p[A]/p[B]) / d barrier[flip])"
    assert right_text(claim, analysis) == "tanh(abs(ln(a*c*e*g/(b*f*h)))/4)"
    (claim,) = claims_for(read_quantity("d mean[q] / d barrier[flip]", RING), analysis, "barrier")
    assert right_text(claim, analysis) == (
        "(mean[q] + 1)*(2 - mean[q])*tanh(abs(ln(a*c*e*g/(b*f*h)))/4)/3")
    assert claim.data["range"] == ["-1", "2"] and "rescaled affinely" in claim.hypotheses


def test_a_bridge_is_bounded_by_zero() -> None:
    """F_max = 0 for a bridge (Owen, Gingrich & Horowitz 2020)."""
    analysis = Analysis(TREE)
    for claim in claims_for(read_quantity("d p[A] / d barrier[ab]", TREE), analysis):
        assert right_text(claim, analysis) == "0"


def test_the_pair_saturates_three_fifths() -> None:
    """|d ln(p_A/p_B)/dB| = 3/5 = tanh(ln 16/4): both conditions of the squared comparison."""
    report = bound(Analysis(PAIR), "d ln(p[A]/p[B]) / d barrier[one]")
    row = {r.claim.name: r.evaluated for r in report.rows}["barrier"]
    assert row is not None and row.holds and row.left == row.right_value() == Fraction(3, 5)


@pytest.mark.parametrize(("left", "factor", "g", "expected"), [
    (2, 1, 9, False),  # (Y + |X|)^2 <= g (Y - |X|)^2 alone would pass
    (Fraction(3, 5), 1, 16, True),
    (Fraction(3, 5) + Fraction(1, 10**30), 1, 16, False),
    (Fraction(3, 5), 1, 16 - Fraction(1, 10**30), False),
    (0, 0, 1, True), (1, 0, 16, False), (0, 1, 1, True), (Fraction(1, 10**9), 1, 1, False),
])
def test_exact_verdicts(
    left: Fraction, factor: Fraction, g: Fraction, expected: bool
) -> None:
    assert holds(Fraction(left), [Weighted(Fraction(factor), Fraction(g))]) is expected


def test_verdicts_with_several_forces_agree_with_high_precision() -> None:
    """Oracle: mpmath at 60 digits, for sums close to equality from both sides."""
    import mpmath

    terms = [Weighted(Fraction(1, 3), Fraction(5)), Weighted(Fraction(2), Fraction(7, 3)),
             Weighted(Fraction(1, 7))]
    with mpmath.workdps(60):
        total = sum(
            mpmath.mpf(t.factor.numerator) / t.factor.denominator
            * (1 if t.g is None else mpmath.tanh(mpmath.log(mpmath.mpf(t.g.numerator)
                                                            / t.g.denominator) / 4))
            for t in terms)
        near = Fraction(int(total * 10**40), 10**40)
    step = Fraction(1, 10**39)
    assert holds(near - step, terms) is True
    assert holds(near + step, terms) is False
    low, high = tanh_bounds(Fraction(5), 4, 128)
    assert low < high < low + Fraction(1, 2**120)


def test_json_and_exit_status(tmp_path: object, capsys: pytest.CaptureFixture[str]) -> None:
    path = Path(str(tmp_path)) / "pair.toml"
    path.write_text(
        'title = "pair"\n[symbols.x]\n[states.A]\n[states.B]\n[[transitions]]\nname = "one"\n'
        'between = ["A", "B"]\nrates = ["4*x", "1"]\n[[transitions]]\nname = "two"\n'
        'between = ["A", "B"]\nrates = ["1", "4"]\n', encoding="utf-8")
    ask = ["bound", str(path), "d ln(p[A]/p[B]) / d barrier[one]", "--json"]
    assert run(ask) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["value"] is None
    assert all(row["holds"] is None and row["left_value"] is None for row in data["bounds"])
    assert run([*ask, "--at", "x=1"]) == 0
    data = json.loads(capsys.readouterr().out)
    row = next(r for r in data["bounds"] if r["name"] == "barrier")
    assert (row["left_value"], row["right_value"], row["holds"]) == ("3/5", "3/5", True)
    assert row["data"]["in_force"] == {"one": "A -[one]-> B -[two]-> A"}
    assert run([*ask, "--at", "x=2"]) == 0
    row = json.loads(capsys.readouterr().out)["bounds"][1]
    low, high = map(Fraction, row["right_enclosure"])
    x = Fraction(row["left_value"])
    assert low <= high and x <= high
    assert run([*ask, "--at", "y=2"]) == 2


def test_every_name_of_the_catalogue_has_words_and_a_source() -> None:
    from symbolic_response.appendix.bounds_section import WORDS

    assert set(NAMES) == set(WORDS)


FERRY = Path(__file__).parent.parent / "worked_cases" / "twin_ferry" / "network.toml"
REST = ["E_w=0", "E_i=1/2", "B_b=0", "B_f=0", "B_1=0", "B_2=0"]


def ferry_rows(
    text: str, at: list[str], capsys: pytest.CaptureFixture[str]
) -> tuple[int, dict[str, dict[str, object]]]:
    put = [part for value in [*REST, *at] for part in ("--at", value)]
    status = run(["bound", str(FERRY), text, "--json", "--quiet", *put])
    rows = json.loads(capsys.readouterr().out)["bounds"]
    return status, {row["name"]: row for row in rows}


def test_a_point_with_irrational_rates(capsys: pytest.CaptureFixture[str]) -> None:
    """Against floats: rates exp(E - B +- F/2), W p = 0, and a difference quotient."""
    import math

    import numpy as np

    def log_ratio(barrier: float) -> float:
        w, e, i = 1.0, math.e, math.exp(0.5)
        up, down = w * math.exp(2 - barrier), e * math.exp(-2 - barrier)
        generator = np.array([[-w - up - w, e + down, i], [w + up, -e - down - e, i], [1, 1, 1]])
        p = np.linalg.solve(generator, [0, 0, 1])
        return math.log(p[1] / p[0])

    status, rows = ferry_rows(
        "d ln(p[east]/p[west]) / d barrier[ferry]", ["F=4", "E_e=1"], capsys)
    assert status == 0 and set(rows) == {"end-pair", "barrier"}
    expected = abs(log_ratio(1e-5) - log_ratio(-1e-5)) / 2e-5
    for row in rows.values():
        (low, high), (below, above) = (
            [Fraction(x) for x in row[f"{side}_enclosure"]]  # type: ignore[attr-defined]
            for side in ("left", "right")
        )
        assert row["holds"] is True and 0 < high - low < Fraction(1, 10**20)
        assert abs(float(low) - expected) < 1e-7
        assert abs(float(below) - math.tanh(1)) < 1e-14 and below <= above


def test_identities_and_zeros_at_an_irrational_point(capsys: pytest.CaptureFixture[str]) -> None:
    status, rows = ferry_rows("d p[east] / d energy[island]", ["F=4", "E_e=1"], capsys)
    assert status == 0 and rows["energy-covariance"]["holds"] is True
    status, rows = ferry_rows(
        "d p[east] / d barrier[ferry]", ["F=0", "E_e=1"], capsys)  # equilibrium: 0 <= 0
    assert status == 0 and all(row["holds"] is True for row in rows.values())
    assert rows["barrier"]["left_value"] == "0"
    assert ferry_rows("p[east]/p[west]", ["F=0", "E_e=1"], capsys)[0] == 3  # equal, not told apart


def test_a_false_claim_fails_at_an_irrational_point() -> None:
    from symbolic_response.bounds.enclose import enclose
    from symbolic_response.expressions.reader import read_expression
    from symbolic_response.network import read_network

    analysis = Analysis(read_network(FERRY))
    (claim,) = claims_for(read_quantity("d ln(p[east]/p[west]) / d barrier[ferry]",
                                        analysis.network), analysis, "barrier")
    false = replace(claim, right=(replace(claim.right[0], curve=Tanh(5)),))
    at = {name: read_expression(value)
          for name, value in (text.split("=") for text in [*REST, "F=4", "E_e=1"])}
    assert enclose(claim, analysis, at).holds is True
    assert enclose(false, analysis, at).holds is False
    (identity, _) = claims_for(read_quantity("d p[east] / d energy[island]", analysis.network),
                               analysis)
    doubled = replace(identity, right=identity.right * 2)
    assert enclose(doubled, analysis, at).holds is False


def test_messages_say_what_the_catalogue_speaks_of() -> None:
    analysis = Analysis(RING)
    for text, words in [
        ("d current[bind] / d barrier[flip]", "the catalogue speaks of responses"),
        ("d mean[moving] / d c", "depends on c"),
        ("d ln mean[q] / d barrier[bind]", "may be negative"),
        ("d (d ln mean[q] / d barrier[bind]) / d barrier[bind]", "may be negative"),
        ("change(ln(mean[q]), barrier[bind], 1)", "may be negative"),
        ("change(p[A], barrier[bind], 1)", "the catalogue speaks of responses"),
    ]:
        with pytest.raises(QuantityError, match=words):
            claims_for(read_quantity(text, RING), analysis)
    with pytest.raises(QuantityError, match="those that apply: parameter, directed-bundle"):
        claims_for(read_quantity("d p[A] / d c", RING), analysis, "barrier")


def test_help_lists_every_name(capsys: pytest.CaptureFixture[str]) -> None:
    for verb in ("bound", "certify"):
        assert run([verb, "--help"]) == 0
        shown = capsys.readouterr().out.replace(",", " ").split()
        assert set(NAMES) <= set(shown)


def test_text_names_the_limiting_cycle(capsys: pytest.CaptureFixture[str]) -> None:
    put = [x for value in [*REST, "F=2*ln(3)", "E_e=2*ln(2)", "E_i=0"][1:] if value != "E_i=1/2"
           for x in ("--at", value)]
    ask = ["bound", str(FERRY), "d p[east] / d barrier[ferry]", "--quiet", "--bound", "barrier"]
    assert run([*ask, "--at", "E_w=0", *put]) == 0
    out = capsys.readouterr().out
    assert "cycles through ferry (2), each with its force:" in out
    assert "limiting cycle for ferry: west -[bridge]-> east -[ferry]-> west, force ln(1/9)" in out
