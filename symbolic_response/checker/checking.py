"""The check of a whole record, from its entries to one verdict."""

from __future__ import annotations

import os
from collections.abc import Callable
from fractions import Fraction
from random import SystemRandom

from .algebra import PRIME
from .bounds import EQUALITIES, Term, decide, ratio, right_side
from .expressions import bits
from .network import Graph
from .point import solve_point
from .proof import check_proof
from .reading import (
    MAX_WORK,
    Rejected,
    Verdict,
    Work,
    choice,
    compare,
    invalid,
    items,
    members,
    read_file,
    shown,
)
from .record import HEAD, KINDS, Claim, Record, check_head, read_record
from .statement import statement

MAX_RECORDS = 1_000


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
        return _check(data, KINDS, Work(most_work), draw)
    except Rejected as error:
        return error.verdict


def _check(data: object, kinds: tuple[str, ...], work: Work, draw: Callable[[], int]) -> Verdict:
    kind = data.get("kind") if type(data) is dict else "points"
    if kind not in kinds:
        choice(kind, "kind", *kinds)
    if kind == "several":
        return _check_several(data, work, draw)
    record = read_record(data, proof=kind == "proof")
    network = record.network
    graph = Graph(len(network.states), network.ends, [back is None for _, back in network.rates],
                  work)
    if not graph.strongly_connected():
        raise invalid("network.transitions", "every state within reach of every other", "others")
    got = check_proof(record, graph, draw) if kind == "proof" else _check_points(record, graph)
    return Verdict("valid", got=got, statement=statement(record))


def _check_several(data: object, work: Work, draw: Callable[[], int]) -> Verdict:
    *head, records = members(data, "", *HEAD, "records")
    check_head(*head)
    found = []
    for k, one in enumerate(items(records, "records", MAX_RECORDS)):
        try:
            found.append(_check(one, KINDS[:-1], work, draw))
        except Rejected as error:
            wrong = error.verdict
            raise Rejected(wrong.status, f"records[{k}].{wrong.entry}", wrong.expected,
                           wrong.got) from None
    return Verdict("valid", got="; ".join(dict.fromkeys(one.got for one in found)),
                   statement="; ".join(one.statement for one in found))


def _check_points(record: Record, graph: Graph) -> str:
    """Check claims about points, and return how many there are."""
    points = len(record.points)
    for claim in record.claims:
        compare(claim.holds, points, f"{claim.entry}.holds")
    worst: dict[str, dict[str, object]] = {}
    largest: dict[str, Fraction] = {}
    for k in range(points):
        graph.work.charge(300, 0)
        at = solve_point(record, k, graph)
        for claim in record.claims:
            terms = right_side(record, claim, at, graph)
            share = _settle(claim, at.where, at.left, terms, graph.work)
            if claim.name not in worst or share > largest[claim.name]:
                largest[claim.name] = share
                right = [{"factor": factor, "g": g} for factor, g in terms]
                worst[claim.name] = {"point": k, "left": at.left, "right": right, "ratio": share}
    for claim in record.claims:
        compare(claim.worst, worst[claim.name], f"{claim.entry}.worst")
    return ", ".join(f"{number} {word}" + "s" * (number != 1) for number, word in (
        (len(record.claims), "claim"), (points, "point")))


def _settle(claim: Claim, where: str, left: Fraction, terms: list[Term], work: Work) -> Fraction:
    """Return the ratio of the sides at a point where the claim holds."""
    work.charge(100, 0)
    for factor, g in terms:
        work.charge(8, max(bits(left), bits(factor), bits(g or factor)))
    equal = claim.name in EQUALITIES
    holds = left == terms[0][0] if equal else decide(left, terms)
    share = ratio(left, terms)
    if not holds or share is None:
        right = " + ".join(shown(factor) + ("" if g is None else f"*tanh(ln({shown(g)})/4)")
                           for factor, g in terms[:4])
        raise invalid(f"{claim.entry}.holds", f"{claim.name} holds at {where}",
                      ("undecided" if holds is None else "it does not")
                      + f": {shown(left)} {'=' if equal else '<='} {right}")
    return share
