"""The check of a whole record, from its entries to one verdict."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from random import SystemRandom
from typing import Any

from .algebra import PRIME
from .bounds import Term, holds, ratio, right_side
from .claims import EQUALITIES, check_applies
from .expressions import bits
from .needs import check_proof
from .network import Graph
from .point import read_values, solve_point
from .reading import (
    MAX_WORK,
    Rejected,
    Verdict,
    Work,
    choice,
    invalid,
    items,
    members,
    read_file,
    shown,
)
from .record import HEAD, KINDS, Proof, Record, Worst, check_head, read_proof, read_record
from .statement import statement

MAX_RECORDS = 1_000


@dataclass
class Place:
    """The place of the largest ratio so far."""

    point: int
    left: Fraction
    terms: list[Term]
    ratio: Fraction


def check_file(path: str | os.PathLike[str]) -> Verdict:
    """Check the record in a file."""
    try:
        return check_record(read_file(path))
    except Rejected as error:
        return error.verdict
    except MemoryError:
        return Verdict("incomplete", "file", "a record that fits into memory", "another")


def random_residue() -> int:
    """Return a random value of a rate modulo the prime, from the operating system."""
    return 1 + SystemRandom().randrange(PRIME - 1)


def check_record(data: object, most_work: int = MAX_WORK,
                 draw: Callable[[], int] = random_residue) -> Verdict:
    """Check a record that was read from JSON; ``draw`` gives the random point of compact proofs."""
    try:
        return _check_any(data, KINDS, Work(most_work), draw)
    except Rejected as error:
        return error.verdict


def _check_any(data: object, kinds: tuple[str, ...], work: Work,
               draw: Callable[[], int]) -> Verdict:
    kind = data.get("kind") if type(data) is dict else "points"
    if kind not in kinds:
        choice(kind, "kind", *kinds)
    if kind == "several":
        return _check_several(data, work, draw)
    if kind == "proof":
        proof = read_proof(data)
        said = check_proof(proof, _graph(proof, work), draw)
        return Verdict("valid", got=said, statement=statement(proof))
    record = read_record(data)
    _check(record, work)
    claims, points = _number(record.claims, "claim"), _number(record.points, "point")
    return Verdict("valid", got=f"{claims}, {points}", statement=statement(record))


def _check_several(data: object, work: Work, draw: Callable[[], int]) -> Verdict:
    *head, records = members(data, "", *HEAD, "records")
    check_head(*head)
    found = []
    for k, one in enumerate(items(records, "records", MAX_RECORDS)):
        try:
            found.append(_check_any(one, KINDS[:-1], work, draw))
        except Rejected as error:
            wrong = error.verdict
            raise Rejected(wrong.status, f"records[{k}].{wrong.entry}", wrong.expected,
                           wrong.got) from None
    return Verdict("valid", got="; ".join(one.got for one in found),
                   statement="; ".join(one.statement for one in found))


def _graph(record: Record | Proof, work: Work) -> Graph:
    network = record.network
    one_way = [backward is None for _, backward in network.rates]
    graph = Graph(len(network.states), network.ends, one_way, work)
    if not graph.strongly_connected():
        raise invalid("network.transitions", "every state within reach of every other", "others")
    return graph


def _number(found: list[Any], word: str) -> str:
    return f"{len(found)} {word}" + "s" * (len(found) != 1)


def _check(record: Record, work: Work) -> None:
    points = len(record.points)
    for k in range(points):
        read_values(record, k, work)
    graph = _graph(record, work)
    if record.count > points:
        raise invalid("sampling.count", f"at most {points}", record.count)
    check_applies(record, record.claims)
    for i, claim in enumerate(record.claims):
        if claim.holds != points:
            raise invalid(f"claims[{i}].holds", str(points), claim.holds)
    worst: list[Place | None] = [None] * len(record.claims)
    for k in range(points):
        work.charge(300, 0)
        solved = solve_point(record, k, graph, work)
        for i, claim in enumerate(record.claims):
            terms = right_side(record, i, solved, graph, work)
            share = _settle(claim, i, k, solved.left, terms, work)
            place = worst[i]
            if place is None or share > place.ratio:
                worst[i] = Place(k, solved.left, terms, share)
    for i, (claim, place) in enumerate(zip(record.claims, worst, strict=True)):
        assert place is not None
        _compare(claim, f"claims[{i}].worst", place)


def _settle(claim: Worst, i: int, k: int, left: Fraction, terms: list[Term],
            work: Work) -> Fraction:
    """Return the ratio of the sides at a point where the claim holds."""
    work.charge(100, 0)
    for factor, g in terms:
        work.charge(8, max(bits(left), bits(factor), bits(g or factor)))
    verdict, share = holds(claim, left, terms), ratio(left, terms)
    if not verdict or share is None:
        right = " + ".join(shown(f) + ("" if g is None else f"*tanh(ln({shown(g)})/4)")
                           for f, g in terms[:4])
        status = "undecided" if verdict is not False else "it does not"
        relation = "=" if claim.name in EQUALITIES else "<="
        raise invalid(f"claims[{i}].holds", f"{claim.name} holds at points[{k}]",
                      f"{status}: {shown(left)} {relation} {right}")
    return share


def _compare(claim: Worst, entry: str, place: Place) -> None:
    """Compare the worst place of a claim with what was found."""
    pairs: list[tuple[str, object, object]] = [
        ("point", place.point, claim.point), ("left", place.left, claim.left),
        ("right", len(place.terms), len(claim.right))]
    for j, (found, given) in enumerate(zip(place.terms, claim.right, strict=False)):
        pairs += [(f"right[{j}].factor", found[0], given[0]), (f"right[{j}].g", found[1], given[1])]
    for key, wanted, stated in [*pairs, ("ratio", place.ratio, claim.ratio)]:
        if wanted != stated:
            raise invalid(f"{entry}.{key}", shown(wanted), stated)
