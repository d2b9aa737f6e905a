"""From inequalities of the catalogue to the proofs they follow from."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.parameter import decompose
from symbolic_response.bounds.registry import applicable
from symbolic_response.bounds.target import target_of
from symbolic_response.certificates.proofs.changes import (
    logarithmic_change,
    shown_sign,
    shows_real,
    shows_sign,
)
from symbolic_response.certificates.proofs.coefficients import (
    CoefficientsProof,
    coefficients_proof,
)
from symbolic_response.certificates.proofs.edge import EdgeProof, edge_proof
from symbolic_response.certificates.proofs.rows import PathsProof, paths_proof
from symbolic_response.certificates.proofs.splitting import SplittingProof, splitting_proof
from symbolic_response.certificates.proofs.transport import (
    TransportProof,
    mixed_cycles,
    runs_both_ways,
    transport_proof,
)
from symbolic_response.errors import SizeLimitError
from symbolic_response.expressions.tree import Expression, Number
from symbolic_response.network.quantities import BySymbol, Change, Perturbation, Response
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes

Proof = EdgeProof | SplittingProof | CoefficientsProof | TransportProof | PathsProof
Key = tuple[str, int]
Changes = dict[tuple[int, bool], Fraction]


class NoProofError(Exception):
    """Why a claim has no proof for all rates; never leaves this folder."""


@dataclass(frozen=True, slots=True)
class Proved:
    """Claims that hold for all positive rates, with the proofs they follow from.

    ``needs``: for each claim the proofs it follows from; ``proofs``: each of them once.
    ``without``: the claims that have no proof, each with the reason.
    """

    claims: tuple[Claim, ...]
    needs: tuple[tuple[Proof, ...], ...]
    proofs: tuple[Proof, ...]
    without: tuple[tuple[Claim, str], ...]


def prove(
    analysis: Analysis,
    quantity: Expression,
    claims: Sequence[Claim],
    step: Callable[[int, int], None] = lambda done, total: None,
) -> Proved:
    """Return proofs for those of the claims about a quantity that have one.

    A claim is proved only if it is the one of the catalogue, word for word. Raises nothing: a claim
    beyond a limit, or with a rate that need not be positive, is listed with the reason.
    """
    work = _Work(analysis, quantity)
    proved: list[Claim] = []
    needs: list[tuple[Proof, ...]] = []
    without: list[tuple[Claim, str]] = []
    for done, claim in enumerate(claims):
        step(done, len(claims))
        try:
            needs.append(work.prove(claim))
            proved.append(claim)
        except (NoProofError, SizeLimitError) as error:
            without.append((claim, str(error)))
    proofs = tuple(dict.fromkeys(proof for each in needs for proof in each))
    return Proved(tuple(proved), tuple(needs), proofs, tuple(without))


def innermost(quantity: Expression) -> Expression:
    """Return what a response, a response of one or a change is of."""
    while isinstance(quantity, Response | Change):
        quantity = quantity.quantity
    return quantity


class _Work:
    """The proofs about one quantity; each is made once."""

    def __init__(self, analysis: Analysis, quantity: Expression) -> None:
        self.analysis = analysis
        self.quantity = quantity
        self.known = applicable(quantity, analysis)
        self.made: dict[Key, Proof] = {}

    def prove(self, claim: Claim) -> tuple[Proof, ...]:
        """Return the proofs that a claim needs; NoProofError says why there are none."""
        if claim not in self.known:
            raise NoProofError("it is not an inequality of the catalogue for this quantity")
        self._require_positive_rates()
        self._require_signs()
        return tuple(self._needed(claim))

    def _require_positive_rates(self) -> None:
        network = self.analysis.network
        for transition in network.transitions:
            for rate in (transition.forward, transition.backward):
                if rate is not None and shown_sign(rate, network.positive_symbols) != 1:
                    raise NoProofError(f"a rate of transition {transition.name!r} need not be"
                                       " positive for all values of the symbols")
        if isinstance(self.quantity, Change) and not shows_real(
                self.quantity.amount, network.positive_symbols):
            raise NoProofError("the form of the amount does not show that it is a real number")

    def _require_signs(self) -> None:
        target = target_of(innermost(self.quantity), self.analysis.network)
        if target is None or target.asked.below is None:
            return
        for values in (target.asked.above, target.asked.below):
            if not shows_sign(values, self.analysis.network.positive_symbols):
                raise NoProofError("the form of an observable does not show that it is not negative"
                                   " for all values of the symbols")

    def _needed(self, claim: Claim) -> list[Proof]:
        if claim.name == "path":
            return [self._paths(claim)]
        if claim.name in BY_COEFFICIENTS:
            return [self._coefficients()]
        if claim.name == "parameter":
            return [self._edge(e) for e in self._barriers()]
        if claim.name == "bundle":
            return [self._bundle(claim)]
        e = self._transition()
        if claim.name == "splitting-drive":
            return [self._splitting(e), self._coefficients()]
        if claim.name.startswith("splitting"):
            return [self._edge(e), self._splitting(e)]
        return [self._edge(e)]

    def _keep(self, key: Key, make: Callable[[], Proof]) -> Proof:
        if key not in self.made:
            self.made[key] = make()
        return self.made[key]

    def _edge(self, e: int) -> Proof:
        return self._keep(("edge", e), lambda: edge_proof(self.analysis, e))

    def _splitting(self, e: int) -> Proof:
        return self._keep(("splitting", e), lambda: splitting_proof(self.analysis, e))

    def _coefficients(self) -> Proof:
        return self._keep(("coefficients", -1),
                          lambda: coefficients_proof(self.analysis, self._changes()))

    def _paths(self, claim: Claim) -> Proof:
        names = [state.name for state in self.analysis.network.states]
        start, goal = names.index(str(claim.data["from"])), names.index(str(claim.data["to"]))
        return self._keep(("paths", -1),
                          lambda: paths_proof(self.analysis.graph, start, goal))

    def _bundle(self, claim: Claim) -> Proof:
        transitions = tuple(sorted({e for e, _ in self._changes()}))
        cycles = mixed_cycles(self.analysis, transitions)
        if claim.right[0].force is None or not all(
                runs_both_ways(self.analysis, cycle) for cycle in cycles):
            return self._coefficients()
        return self._keep(("transport", -1),
                          lambda: transport_proof(self.analysis, transitions))

    def _perturbation(self) -> Perturbation:
        assert isinstance(self.quantity, Response)
        return self.quantity.perturbation

    def _changes(self) -> Changes:
        """Return v = d ln w/d theta of the directed rates that change."""
        by, rates = self._perturbation(), self.analysis.rates
        found: Changes = {}
        if not isinstance(by, BySymbol):
            for place, change in rate_changes(by, self.analysis).items():
                assert isinstance(change, Number)
                found[rates.directions()[place]] = change.value
            return found
        for e, backward in rates.directions():
            v = logarithmic_change(self.analysis.rate_expression(e, backward), by)
            if v is None:
                name = self.analysis.network.transitions[e].name
                raise NoProofError(f"a rate of transition {name!r} does not change by a constant"
                                   f" factor with {by.name}")
            if v:
                found[e, backward] = v
        return found

    def _transition(self) -> int:
        """Return the one transition whose rates change."""
        if isinstance(self.quantity, Change):
            return self.quantity.transition
        (e,) = {e for e, _ in self._changes()}
        return e

    def _barriers(self) -> list[int]:
        self._changes()
        parts = decompose(rate_changes(self._perturbation(), self.analysis), self.analysis)
        sizes = (*parts.energies, *parts.barriers.values(), *parts.singles.values())
        if not all(isinstance(size, Number) for size in sizes):
            raise NoProofError("its pieces are not plain numbers")
        return list(parts.barriers)


BY_COEFFICIENTS = ("energy-covariance", "energy-range", "drive", "support", "directed-bundle")
