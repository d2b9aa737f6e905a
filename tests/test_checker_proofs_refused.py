"""What is wrong with a record of proofs is found by the check that is there for it."""

from __future__ import annotations

import itertools
import sys
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from checker_examples import BRIDGE, ONE_WAY, RING, SQUARE, parts
from checker_proofs import CHANNELS, MEANS, PAIRS, Json, examples, of, proof
from checker_records import barrier, drive, energy, network, symbol, target
from test_checker_records import changed, get

from symbolic_response.checker import check_record
from symbolic_response.checker import proof as proofs_of

SQUARE_EDGE, COMPACT = (f"square with chord-ac-barrier-{form}" for form in ("expanded", "compact"))
TRANSPORT = "four in a ring-ab-cd"
CYCLES, SIDES = ("proofs", 0, "cycles"), ("proofs", 1, "splittings")


def edited(name: str, *keys: Any) -> Json:
    """Return an example with one value changed: by a function of the old one, or replaced."""
    *where, new = keys
    record = examples()[name]
    old = get(record, tuple(where))
    return changed(record, tuple(where), new(old) if callable(new) else new)


def refused(record: Json, status: str, entry: str, expected: str) -> None:
    verdict = check_record(record)
    assert (verdict.status, verdict.entry) == (status, entry), verdict
    assert expected in verdict.expected, verdict


def reverse(steps: list[int]) -> list[int]:
    return [i ^ 1 for i in reversed(steps)]


@pytest.mark.parametrize(("keys", "entry", "expected"), [
    ((*CYCLES, lambda rows: rows[1:]), "cycles", "weights that add up to"),
    ((*CYCLES, lambda rows: []), "cycles", "weights that add up to 4"),
    ((*CYCLES, lambda rows: [*rows, rows[0]]), "cycles[2].steps", "each once"),
    ((*CYCLES, 0, "weight", lambda w: w + 1), "cycles[0].weight", "2"),
    ((*CYCLES, 0, "steps", reverse), "cycles[0].steps", "a simple path between the right"),
    ((*CYCLES, 0, "steps", [9]), "cycles[0].steps", "a simple path between the right"),
    ((*CYCLES, 0, "steps", lambda s: [*s, s[-1] ^ 1]), "cycles[0].steps", "a simple path"),
    ((*CYCLES, 0, "steps", lambda s: [*s, 0, 1]), "cycles[0].steps", "a simple path"),
    ((*CYCLES, 0, "steps", lambda s: [s[1], s[0]]), "cycles[0].steps", "a simple path"),
])
@pytest.mark.parametrize("name", [SQUARE_EDGE, COMPACT])
def test_rows_of_an_edge(name: str, keys: Any, entry: str, expected: str) -> None:
    refused(edited(name, *keys), "invalid", f"proofs[0].{entry}", expected)


@pytest.mark.parametrize(("keys", "status", "entry", "expected"), [
    ((*SIDES, lambda rows: rows[1:]), "invalid", "", "weights that add up to 4"),
    ((*SIDES, lambda rows: [*rows, rows[0]]), "invalid", "[4].side", "each once"),
    ((*SIDES, 0, "weight", 3), "invalid", "[0].weight", "1"),
    ((*SIDES, 0, "side", lambda s: 15 ^ s), "invalid", "[0].side", "states with the second end"),
    ((*SIDES, 0, "side", 5), "invalid", "[0].side", "states with the second end"),
    ((*SIDES, 0, "side", 4 + 16), "invalid", "[0].side", "states with the second end"),
    ((*SIDES, []), "malformed", "", "a list of 1 or more"),
])
@pytest.mark.parametrize("name", [SQUARE_EDGE, COMPACT])
def test_rows_of_splittings(name: str, keys: Any, status: str, entry: str, expected: str) -> None:
    refused(edited(name, *keys), status, f"proofs[1].splittings{entry}", expected)


def test_a_set_that_is_not_connected() -> None:
    record = edited("bridge-ab-barrier-compact", *SIDES, 0, "side", 2 + 8)
    refused(record, "invalid", "proofs[1].splittings[0].side", "a connected set")


@pytest.mark.parametrize(("new", "entry", "expected"), [
    (lambda trees: trees[1:], "trees", "8 spanning trees"),
    (lambda trees: [*trees, trees[-1]], "trees[8]", "more than"),
    (lambda trees: trees[::-1], "trees[1]", "more than"),
    (lambda trees: [19, *trees[1:]], "trees[0]", "a spanning tree"),  # a triangle
    (lambda trees: [*trees[:-1], 31], "trees[7]", "a spanning tree"),
    (lambda trees: [*trees[:-1], 32 + 1 + 2], "trees[7]", "a spanning tree"),
    (lambda trees: [1, *trees[1:]], "trees[0]", "a spanning tree")])
def test_trees(new: Any, entry: str, expected: str) -> None:
    refused(edited(SQUARE_EDGE, "trees", new), "invalid", entry, expected)


def test_forms() -> None:
    refused(edited(SQUARE_EDGE, "trees", None), "malformed", "trees", "proofs[0] is expanded")
    refused(edited(COMPACT, "proofs", 0, "form", "expanded"), "malformed", "trees", "proofs[0]")
    refused(edited(TRANSPORT, "trees", None), "malformed", "trees", "proofs[0] is expanded")
    other = check_record(edited(SQUARE_EDGE, "proofs", 0, "form", "compact"))
    assert other.status == "valid" and "edge ac: compact" in other.got
    refused(edited(SQUARE_EDGE, "proofs", 0, "form", "short"), "malformed", "proofs[0].form",
            "expanded or compact")
    refused(edited(SQUARE_EDGE, "proofs", 1, lambda one: {"kind": "edge"}), "malformed",
            "proofs[1].transition", "a value")
    refused(edited(SQUARE_EDGE, "proofs", lambda both: [both[0], both[0]]), "malformed",
            "proofs[1]", "each proof once")


PAIR = ("proofs", 0, "pairs", 0)
MOVE = (*PAIR, "moves", 0)


@pytest.mark.parametrize(("keys", "status", "entry", "expected"), [
    ((*MOVE, "times", 0), "malformed", ".pairs[0].moves[0].times", "an integer from 1"),
    ((*MOVE, "times", 2), "invalid", ".pairs[0].moves[0]", "no more than"),
    ((*MOVE, "rest", lambda r: r[::-1]), "malformed", ".pairs[0].moves[0].rest", "a sorted list"),
    ((*MOVE, "rest", lambda r: r[1:]), "invalid", ".pairs[0].moves[0].rest", "as many rates"),
    ((*MOVE, "rest", lambda r: [r[0], r[0]]), "invalid", ".pairs[0].moves[0]", "no more than"),
    ((*MOVE, "rest", [0, 8]), "malformed", ".pairs[0].moves[0].rest[1]", "from 0 below 8"),
    ((*MOVE, "cycle", lambda c: 1 - c), "invalid", ".pairs[0].moves[0]", "no more than"),
    ((*MOVE, "cycle", 2), "malformed", ".pairs[0].moves[0].cycle", "an integer from 0 below 2"),
    ((*PAIR, "moves", lambda m: m[1:]), "invalid", ".pairs[0].moves", "the same rest"),
    ((*PAIR, "moves", lambda m: [*m, m[0]]), "invalid", ".pairs[0].moves[{}]", "no more than"),
    ((*PAIR, "states", ["B", "A"]), "malformed", ".pairs[0].states", "in the order of"),
    ((*PAIR, "states", ["A", "A"]), "malformed", ".pairs[0].states", "in the order of"),
    ((*PAIR, "states", ["A"]), "malformed", ".pairs[0].states", "a list of 2"),
    ((*PAIR[:3], 1, "states", ["A", "B"]), "invalid", ".pairs[1].states", "each pair once"),
    ((*PAIR[:3], lambda p: p[1:]), "invalid", ".pairs", "every pair"),
    (("proofs", 0, "cycles", 0, [0, 1]), "invalid", ".cycles[0]", "inside and outside"),
    (("proofs", 0, "cycles", 0, [0, 2, 4]), "invalid", ".cycles[0]", "a cycle with"),
    (("proofs", 0, "cycles", 0, [0, 2, 4, 6, 0, 2, 4, 6]), "invalid", ".cycles[0]", "a cycle"),
    (("proofs", 0, "cycles", 0, [0]), "malformed", ".cycles[0]", "a list of 2 or more"),
    (("proofs", 0, "transitions", ["ab", "bc", "cd", "da"]), "invalid", ".cycles[0]", "outside"),
    (("proofs", 0, "transitions", ["cd", "ab"]), "malformed", ".transitions", "in the order of")])
def test_transport(keys: Any, status: str, entry: str, expected: str) -> None:
    moves = get(examples()[TRANSPORT], (*PAIR, "moves"))
    refused(edited(TRANSPORT, *keys), status, "proofs[0]" + entry.format(len(moves)), expected)


def test_transport_of_what_is_no_bundle() -> None:
    record = proof(SQUARE, ["bundle"], [{"kind": "transport", "transitions": ["ab", "cd"],
                                         "cycles": [], "pairs": []}], MEANS[4],
                   {"kind": "bundle", "transitions": ["ab", "cd"]})
    refused(record, "invalid", "proofs[0].transitions", "r or r + 1")
    record["proofs"] = [of(SQUARE).coefficients({0: Fraction(-1)} | {k: Fraction(-1) for k in
                                                                     (1, 4, 5)})]
    refused(record, "invalid", "claims[0].name", "r or r + 1")
    record["claims"][0]["name"] = "directed-bundle"
    assert check_record(record).status == "valid"


def test_transport_of_other_transitions() -> None:
    record = edited(TRANSPORT, "perturbation", "transitions", ["ab", "bc"])
    refused(record, "invalid", "claims[0].name", "a proof by transport")
    record = edited("block", "proofs", [of(BRIDGE).edge("cd", "compact")])
    refused(record, "invalid", "claims[0].name", "a proof by coefficients")


@pytest.mark.parametrize("key", ["low", "high"])
def test_coefficients(key: str) -> None:
    refused(edited("support", "proofs", 0, key, "5/7"), "invalid", f"proofs[0].{key}",
            {"low": "0", "high": "3"}[key])
    path = examples()["ring-path-compact"]
    extra = {**path, "proofs": [*path["proofs"], examples()["support"]["proofs"][0]]}
    refused(extra, "invalid", "proofs[1].kind", "a perturbation")


@pytest.mark.parametrize(("name", "expected"), [
    (SQUARE_EDGE, "a proof by edge for ac"), ("ring-turn-drive", "a proof by coefficients"),
    ("parameter", "a proof by edge for bc"), ("support", "a proof by coefficients"),
    ("local", "a proof by edge for one"), ("finite", "a proof by edge for ac"),
    ("ring-turn-second", "a proof by edge for turn"), ("one-way ring-energy", "coefficients"),
    ("complete-bd-current-drive", "a proof by edge for bd"), ("bundle-symbol", "by transport"),
    ("ring-path-compact", "a proof by paths"), ("one-way-bundle", "a proof by coefficients")])
def test_claims_without_their_proofs(name: str, expected: str) -> None:
    record = examples()[name]
    net = record["network"]
    last = net["transitions"][0]["name"]
    other = of(net).edge(last if last not in ("one",) else "two", "compact")
    verdict = check_record({**record, "proofs": [other]})
    assert verdict.status == "invalid" and verdict.entry.startswith("claims[0]"), verdict
    assert expected in verdict.expected


def test_each_of_two_proofs_is_needed() -> None:
    record = examples()[SQUARE_EDGE]
    edge, splitting = record["proofs"]
    refused({**record, "proofs": [edge]}, "invalid", "claims[2].name", "splitting for ac")
    refused({**record, "proofs": [splitting]}, "invalid", "claims[0].name", "edge for ac")
    record = examples()["ring-turn-drive"]
    refused({**record, "proofs": record["proofs"][1:]}, "invalid", "claims[1].name", "splitting")
    record = examples()["parameter"]
    refused({**record, "proofs": record["proofs"][:1]}, "invalid", "claims[0].parts", "edge for da")


def test_a_proof_for_other_ends_of_a_path() -> None:
    record = edited("ring-path-compact", "path", "to", "B")
    refused(record, "invalid", "claims[0].name", "for the ends of the path")
    refused(edited("ring-path-compact", "proofs", 0, "to", "A"), "malformed", "proofs[0].to",
            "another state")
    one_way = proof(ONE_WAY, ["path"], [of(ONE_WAY).paths("C", "A", "compact")],
                    path={"from": "C", "to": "A"}, trees=False)
    refused(one_way, "invalid", "claims[0].name", "only paths that can be run both ways")


def test_what_the_target_must_be() -> None:
    record = edited("ring-turn-second", "target", MEANS[3])
    refused(record, "invalid", "target.kind", "log-ratio for second-barrier")
    record = edited("complete-bd-current-barrier", "target", "transition", "ab")
    refused(record, "invalid", "perturbation", "of the transition of the current")
    record = edited("complete-bd-current-barrier", "perturbation", energy("A"))
    refused(record, "invalid", "perturbation", "of the transition of the current")
    record = edited("complete-bd-current-barrier", "claims", 0, "name", "barrier")
    refused(record, "invalid", "claims[0].name", "one of current-exact, current-range")
    record = edited("local", "target", MEANS[3] | {"above": {"A": "E", "B": "0", "C": "1"}})
    refused(record, "invalid", "target.above.A", "no symbol that is the perturbation")
    above, below = ({"A": "x", "B": "1", "C": "0"}, {"A": "1", "B": "x", "C": "0"})
    record = proof(CHANNELS, ["energy-range"], [of(CHANNELS).coefficients(
        {0: Fraction(1), 2: Fraction(1), 7: Fraction(1)})], target("ratio", above, below),
        energy("A"), trees=False)
    assert check_record(record).status == "valid"
    record["claims"][0]["name"] = "energy-covariance"
    refused(record, "invalid", "claims[0].name", "above or below the same")


@pytest.mark.parametrize(("text", "entry", "expected"), [
    ("x - y", "target.above.A", "no negative value"), ("E", "target.above.A", "no negative value"),
    ("-1", "target.above.A", "no negative value"), ("0", "target.above", "a value other than 0")])
def test_signs_of_ratios(text: str, entry: str, expected: str) -> None:
    record = proof(CHANNELS, ["end-pair"], [of(CHANNELS).edge("one", "compact")],
                   target("ratio", {"A": text, "B": "0", "C": "0"},
                          {"A": "0", "B": "2", "C": "exp(E)"}), barrier("one"), trees=False)
    refused(record, "invalid", entry, expected)
    record["target"]["above"]["A"] = "exp(E)*x**(1/2)/(y + 1/3) + (2 - 1)*0"
    assert check_record(record).status == "valid"


def test_changes_of_rates() -> None:
    edge = [of(CHANNELS).edge("one", "compact")]

    def local(name: str, logarithmic: bool = True) -> Json:
        return proof(CHANNELS, ["local-change"], edge, PAIRS[3], symbol(name, logarithmic),
                     trees=False)

    refused(local("x"), "invalid", "network.transitions[3].backward", "a form that shows")
    refused(local("y"), "invalid", "claims[0].name", "one transition whose rates change")
    refused(local("z"), "invalid", "claims[0].name", "one transition whose rates change")
    refused(local("z", False), "invalid", "network.transitions[2].forward", "a form that shows")
    assert check_record(local("E", False)).status == "valid"
    still = edited("local", "network", "symbols", lambda s: [*s, {**s[0], "name": "free"}])
    refused({**still, "perturbation": symbol("free")}, "invalid", "claims[0].name",
            "one transition whose rates change")
    record = proof(RING, ["support"], [of(RING).edge("bind", "compact")], PAIRS[3], symbol("c"))
    refused(record, "invalid", "claims[0].name", "rates that change alike")
    record = {**local("y"), "claims": [{"name": "bundle", "parts": None}]}
    refused(record, "invalid", "claims[0].name", "rates that all change alike")
    record = edited("parameter", "perturbation", symbol("y")) | {"target": PAIRS[4]}
    record["claims"] = [{"name": "bundle", "parts": None}]
    refused(record, "invalid", "claims[0].name", "both of whose rates change")


@pytest.mark.parametrize(("own", "entry", "expected"), [
    (parts({}, {"bc": "y"}, {}), "claims[0].parts.barriers", "numbers"),
    (parts({}, {"bc": "sqrt(2)"}, {}), "claims[0].parts.barriers.bc", "a fraction"),
    (parts({}, {"bc": "3/2", "da": "1"}, {"bc": "-1"}), "claims[0].parts.singles.bc",
     "no negative"),
    (parts({}, {"bc": "3/2", "da": "1"}, {"bc": "1"}), "claims[0].parts", "the changes of ab"),
    (parts({"A": "1"}, {"bc": "3/2", "da": "1"}, {"bc": "1", "ab": "1"}), "claims[0].parts",
     "the changes of da"),
    (parts({}, {"bc": "3/2", "da": "1", "cd": "0"}, {"bc": "1", "ab": "1"}), "claims[0].parts",
     "a proof by edge for cd")])
def test_parts(own: Json, entry: str, expected: str) -> None:
    refused(edited("parameter", "claims", 0, "parts", own), "invalid", entry, expected)


def test_support_and_the_range_of_coefficients() -> None:
    star = network("fan", "A B C", [("ab", "A", "B", "x", "1"), ("bc", "B", "C", "2", "x"),
                                    ("ca", "C", "A", "1", "x")], "x")
    record = proof(star, ["support", "directed-bundle"],
                   [of(star).coefficients({0: Fraction(1), 3: Fraction(1), 5: Fraction(1)})],
                   MEANS[3], symbol("x"), trees=False)
    assert check_record(record).status == "valid"


def test_wrong_spans() -> None:
    double = network("twice", "A B C", [("ab", "A", "B", "x", "1/x"), ("bc", "B", "C", "2", "1"),
                                        ("ca", "C", "A", "1", "5")], "x")
    record = proof(double, ["drive"], [of(double).coefficients({0: Fraction(1, 2),
                                                                1: Fraction(-1, 2)})],
                   MEANS[3], drive("ab"), trees=False)
    assert check_record(record).status == "valid"


def test_a_range_of_coefficients_above_what_the_claim_says(
        monkeypatch: pytest.MonkeyPatch) -> None:
    for name, most in (("one-way ring-energy", "1"), ("ring-turn-drive", "1"),
                       ("one-way ring-burn-drive", "1/2"), ("support", "3"), ("block", "0")):
        record = examples()[name]
        place = [one["kind"] for one in record["proofs"]].index("coefficients")
        monkeypatch.setattr(proofs_of, "extremes", lambda *_: (Fraction(0), Fraction(7)))
        for key, value in (("low", "0"), ("high", "7")):
            record = changed(record, ("proofs", place, key), value)
        refused(record, "invalid", "claims[0].name", f"differ by at most {most}")


@pytest.mark.parametrize(("new", "entry"), [
    (lambda one: {**one, "kind": "some"}, "kind"), (lambda one: {**one, "records": []}, "records"),
    (lambda one: {**one, "records": one["records"][:1] * 1001}, "records"),
    (lambda one: {**one, "records": [one]}, "records[0].kind"),
    (lambda one: {**one, "records": [{}]}, "records[0].kind"),
    (lambda one: {**one, "records": [3]}, "records[0].file"),
    (lambda one: {**one, "version": 2}, "version"), (lambda one: {**one, "more": 2}, "file")])
def test_several(new: Any, entry: str) -> None:
    verdict = check_record(new(examples()["several"]))
    assert verdict.status == ("incomplete" if entry == "records" and verdict.got == "1001" else
                              "malformed") and verdict.entry == entry, verdict


def test_several_is_invalid_if_one_is() -> None:
    record = edited("several", "records", 1, "claims", 0, "holds", 2)
    refused(record, "invalid", "records[1].claims[0].holds", "3")


@pytest.mark.parametrize("name", [SQUARE_EDGE, COMPACT, "ring-path-expanded", "ring-path-compact"])
def test_another_direction_of_a_transition(name: str) -> None:
    record = examples()[name]
    for e, step in enumerate(record["network"]["transitions"]):
        other = changed(record, ("network", "transitions", e, "between"), step["between"][::-1])
        verdict = check_record(other)
        assert verdict.status == "invalid" and verdict.entry.startswith("proofs[0]"), verdict


@pytest.mark.parametrize(("name", "one", "two"), [*itertools.product(
    (SQUARE_EDGE, COMPACT), (0, 2, 4), ([0, 1], [0, 3], [1, 3]))])
def test_another_network(name: str, one: int, two: list[int]) -> None:
    record = examples()[name]
    states = record["network"]["states"]
    old = record["network"]["transitions"][one]["between"]
    new = [states[k] for k in two]
    if {*old} != {*new}:
        verdict = check_record(changed(record, ("network", "transitions", one, "between"), new))
        assert verdict.status == "invalid", verdict
        assert verdict.entry.startswith(("trees", "proofs")), verdict



@pytest.mark.parametrize("rate", ["x - y", "-x", "0", "ln(x)"])
def test_rates_that_need_not_be_positive(rate: str) -> None:
    refused(edited(SQUARE_EDGE, "network", "transitions", 0, "forward", rate), "invalid",
            "network.transitions[0].forward", "a form that shows a positive rate")


@pytest.mark.parametrize("amount", ["ln(x - y)", "sqrt(x - y)", "1/0", "ln(-1)"])
def test_amounts_that_need_not_be_real(amount: str) -> None:
    name = next(key for key, record in examples().items()
                if (record.get("perturbation") or {}).get("kind") == "finite-barrier")
    refused(edited(name, "perturbation", "amount", amount), "invalid", "perturbation.amount",
            "a form that shows a real number")
