"""Which proofs a claim for all positive rates needs, and the check of a record of proofs."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from .bounds import paths_along
from .changes import bundle, changed, changes, check_pieces, directed, support
from .claims import check_applies
from .expressions import HALF, ONE
from .forms import sign
from .network import Graph
from .point import pieces
from .proof import Proofs
from .reading import Work, invalid
from .record import Claim, Perturbation, Proof


def check_proof(record: Proof, graph: Graph, draw: Callable[[], int]) -> str:
    """Check a record of proofs, and return what was checked."""
    check_applies(record, record.claims)
    _check_signs(record, graph.work)
    moved = record.perturbation
    moves = changes(record.network, moved, graph) if moved else None
    proofs = Proofs(record.network, graph, moves, record.trees, draw)
    for k, value in enumerate(record.proofs):
        proofs.check(value, f"proofs[{k}]")
    for i, claim in enumerate(record.claims):
        if moved is None or moves is None:
            _check_path(record, proofs, f"claims[{i}].name")
        else:
            _check_claim(record, claim, moved, moves, proofs, f"claims[{i}]")
    return proofs.said()


def _check_signs(record: Proof, work: Work) -> None:
    """Check that the observables of ratios show that they are not negative, and not all 0."""
    target = record.target
    if target is None or target.kind not in ("ratio", "log-ratio"):
        return
    for entry, side in (("above", target.above), ("below", target.below or [])):
        signs = [sign(one, record.network.positive, work) for one in side]
        for state, found, one in zip(record.network.states, signs, side, strict=True):
            if found is None:
                raise invalid(f"target.{entry}.{state}", "a form that shows no negative value",
                              one.text[:80])
        if not any(signs):
            raise invalid(f"target.{entry}", "a value other than 0", "0 for every state")


def _need(proofs: Proofs, kind: str, e: int, entry: str) -> None:
    if (kind, e) not in proofs.forms:
        where = f" for {proofs.network.transitions[e]}" if e >= 0 else ""
        raise invalid(entry, f"a proof by {kind}{where}", "none")


def _need_span(proofs: Proofs, most: Fraction, entry: str) -> None:
    _need(proofs, "coefficients", -1, entry)
    if proofs.span > most:
        raise invalid(entry, f"coefficients that differ by at most {most}", proofs.span)


def _check_path(record: Proof, proofs: Proofs, entry: str) -> None:
    assert record.path is not None
    _need(proofs, "paths", -1, entry)
    if proofs.path != record.path:
        raise invalid(entry, "a proof for the ends of the path", "one for others")
    paths_along(proofs.graph, record.path, entry)


def _check_claim(record: Proof, claim: Claim, moved: Perturbation, moves: list[Fraction],
                 proofs: Proofs, entry: str) -> None:
    """Check that a claim has the proofs it needs."""
    name, graph, e, where = claim.name, proofs.graph, moved.place, f"{entry}.name"
    if name == "parameter":
        _check_parameter(record, claim, moves, proofs, f"{entry}.parts")
    elif name == "bundle":
        _check_bundle(moves, proofs, where)
    elif name == "support":
        _need_span(proofs, support(moves, graph, where, ""), where)
    elif name == "directed-bundle":
        _need_span(proofs, directed(moves, graph, where, ""), where)
    elif name.startswith("energy"):
        _need_span(proofs, ONE, where)
    elif name in ("drive", "splitting-drive"):
        _need_span(proofs, HALF if graph.one_way[e] else ONE, where)
    else:
        if name.startswith("local"):
            e, *more = [*changed(moves), -1]
            if len(more) != 1:
                raise invalid(where, "one transition whose rates change", len(more))
        _need(proofs, "edge", e, where)
    if name.startswith("splitting"):
        _need(proofs, "splitting", e, where)


def _check_parameter(record: Proof, claim: Claim, moves: list[Fraction], proofs: Proofs,
                     entry: str) -> None:
    for key, given in zip(("energies", "barriers", "singles"), claim.parts or (), strict=True):
        for one in given.values():
            if one.symbols:
                raise invalid(f"{entry}.{key}", "numbers", one.text[:80])
    found = pieces(record, claim, entry, "any point", {}, proofs.graph.work)
    check_pieces(moves, proofs.graph, found, record.network.transitions, entry, "")
    for e in sorted(found[1]):
        _need(proofs, "edge", e, entry)


def _check_bundle(moves: list[Fraction], proofs: Proofs, entry: str) -> None:
    kappa, chosen = bundle(moves, proofs.graph, entry, "")
    if ("transport", -1) in proofs.forms and list(proofs.bundle) == chosen:
        return
    if kappa and all(proofs.graph.can_run(cycle) == proofs.graph.can_run(i ^ 1 for i in cycle)
                     for cycle in proofs.graph.mixed_cycles(chosen)):
        raise invalid(entry, "a proof by transport of the transitions that change", "none")
    _need_span(proofs, kappa, entry)
