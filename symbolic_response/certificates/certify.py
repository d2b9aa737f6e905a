"""Certificates of the strongest kind there is: a proof for all rates, else exact points."""

from __future__ import annotations

from concurrent.futures import Executor
from dataclasses import dataclass

from symbolic_response.bounds.claim import Claim
from symbolic_response.certificates.points import (
    COUNT,
    PointCertificate,
    Refutation,
    Step,
    asked_claims,
    certify_claims,
    check_seed,
)
from symbolic_response.certificates.proofs.prove import Proved, prove
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.tree import Expression
from symbolic_response.network.model import Network
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.response.analysis import Analysis, as_analysis

METHODS = ("strongest", "proof", "points")


@dataclass(frozen=True, slots=True)
class Certificate:
    """What is known of the inequalities about one response of one network.

    ``proved``: those that hold for all positive rates; ``points``: the others at exact points, None
    where all are proved or no points were asked for. ``without``: claims that have neither, each
    with the reason.
    """

    network: Network
    response: str
    quantity: Expression
    proved: Proved
    points: PointCertificate | None

    @property
    def refuted(self) -> Refutation | None:
        """The exact point at which a claim fails, None if there is none."""
        return None if self.points is None else self.points.refuted

    @property
    def without(self) -> tuple[tuple[Claim, str], ...]:
        """The claims that are neither proved nor tried at points."""
        return tuple((claim, why) for claim, why in self.proved.without
                     if self.points is None or not claim.has_points)


def certify(
    subject: Network | Analysis,
    text: str,
    *,
    only: str | None = None,
    method: str = "strongest",
    count: int = COUNT,
    seed: str = "0",
    workers: int | None = None,
    executor: Executor | None = None,
    progress: Step | None = None,
) -> Certificate:
    """Certify every inequality that applies to a response: prove it for all positive rates, else
    try it at ``count`` exact points and where it is tight.

    ``only``: the name of one. ``method``: ``strongest``, ``proof`` (no points) or ``points`` (no
    proofs). The outcome does not depend on ``workers`` (processes; all cores by default) or
    ``executor`` (from concurrent.futures, left running). Raises QuantityError, EvaluationError (no
    point within the ranges), UndecidedError, SizeLimitError.
    """
    if method not in METHODS:
        raise QuantityError(f"there is no method {method!r}; there are {', '.join(METHODS)}")
    check_seed(seed)
    analysis = as_analysis(subject)
    quantity = read_quantity(text, analysis.network)
    claims = asked_claims(quantity, analysis, only)
    if method == "points":
        proved = Proved((), (), (), tuple((claim, NO_POINTS) for claim in claims))
    else:
        proved = prove(analysis, quantity, claims, progress or _silent)
    rest = tuple(claim for claim, _ in proved.without if claim.has_points)
    if method == "points" and not rest:
        raise QuantityError("the inequalities that apply here have proofs only, no exact points")
    points = None
    if rest and method != "proof":
        points = certify_claims(analysis, quantity, rest, text=text, count=count, seed=seed,
                                workers=workers, executor=executor, progress=progress)
    return Certificate(analysis.network, text, quantity, proved, points)


NO_POINTS = "it has a proof only, no exact points"


def _silent(done: int, total: int) -> None:
    pass
