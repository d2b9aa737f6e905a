"""The record of a certificate: version 1 of the format in DEVELOPERS.md."""

from __future__ import annotations

import json
import os
from collections.abc import Sequence
from fractions import Fraction
from pathlib import Path

from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.parameter import Decomposition, decompose
from symbolic_response.bounds.registry import PATH
from symbolic_response.bounds.target import Absolute, Extreme, target_of
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.certify import Certificate
from symbolic_response.certificates.points import Certified, PointCertificate
from symbolic_response.certificates.proofs.prove import Proved, innermost
from symbolic_response.certificates.proofs.record import proof_data, trees_data
from symbolic_response.certificates.sampling import RULE
from symbolic_response.errors import QuantityError
from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.expressions.tree import (
    ZERO,
    Expression,
    add,
    multiply,
    negate,
    number,
    power,
    rebuild,
)
from symbolic_response.files import check_output, write_files
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import (
    BarrierOf,
    BarriersOf,
    BySymbol,
    Change,
    DriveOf,
    EnergyOf,
    Response,
)
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.closed_trees import rate_changes

FORMAT = {"format": "symbolic-response-certificate", "version": 1}
ADMISSIBLE = "all admissible values of the symbols"
ALL_RATES = "all positive rates"

Data = dict[str, object]


def record_of(certificate: Certificate, analysis: Analysis) -> Data:
    """Return the record as plain data: of proofs, of points, or of both.

    QuantityError for a certificate that was refuted or holds nothing.
    """
    records: list[Data] = []
    if certificate.proved.claims:
        records.append(proof_record(certificate, certificate.proved, analysis))
    if certificate.points is not None:
        records.append(point_record(certificate.points, analysis))
    if not records:
        raise QuantityError("nothing was certified: " + certificate.without[0][1])
    return records[0] if len(records) == 1 else {**FORMAT, "kind": "several", "records": records}


def proof_record(certificate: Certificate, proved: Proved, analysis: Analysis) -> Data:
    """Return the record of proofs."""
    network, quantity = certificate.network, certificate.quantity
    return {
        **_head("proof", network, certificate.response, ALL_RATES),
        **_subject(network, quantity, proved.claims),
        "trees": trees_data(proved.proofs, analysis),
        "proofs": [proof_data(proof, analysis) for proof in proved.proofs],
        "claims": [{"name": claim.name, "parts": _parts(claim, quantity, analysis)}
                   for claim in proved.claims],
    }


def point_record(certificate: PointCertificate, analysis: Analysis) -> Data:
    """Return the record of points; QuantityError for a certificate that was refuted."""
    if certificate.refuted is not None:
        raise QuantityError("a refuted inequality has no certificate: "
                            + certificate.refuted.message())
    network, quantity = certificate.network, certificate.quantity
    return {
        **_head("points", network, certificate.response, ADMISSIBLE),
        **_subject(network, quantity, [entry.claim for entry in certificate.claims]),
        "sampling": {"rule": RULE, "seed": certificate.seed, "count": certificate.count},
        "points": [{name: value_text(value) for name, value in values.items()}
                   for values in certificate.points],
        "claims": [_claim(entry, quantity, analysis) for entry in certificate.claims],
    }


def _head(kind: str, network: Network, response: str, domain: str) -> Data:
    return {**FORMAT, "kind": kind, "network": _network(network), "response": response,
            "domain": domain}


def _subject(network: Network, quantity: Expression, claims: Sequence[Claim]) -> Data:
    """Return what the claims are about."""
    if claims[0].name == PATH:
        data = claims[0].data
        return {"target": None, "perturbation": None,
                "path": {"from": data["from"], "to": data["to"]}}
    return {"target": _target(quantity, network), "perturbation": _perturbation(quantity, network),
            "path": None}


def _network(network: Network) -> Data:
    states = [state.name for state in network.states]
    return {
        "title": network.title,
        "symbols": [
            {"name": entry.name, "sign": "positive" if entry.positive else "real",
             "range": [fraction_text(entry.low), fraction_text(entry.high)]}
            for entry in network.symbols
        ],
        "states": states,
        "transitions": [
            {"name": t.name, "between": [states[t.first], states[t.second]],
             "forward": expression_text(t.forward),
             "backward": None if t.backward is None else expression_text(t.backward)}
            for t in network.transitions
        ],
    }


def _target(quantity: Expression, network: Network) -> Data:
    target = target_of(innermost(quantity), network)
    assert target is not None
    if target.asked.transition is not None:
        return {"kind": "current", "transition": network.transitions[target.asked.transition].name}
    names = [state.name for state in network.states]
    above, below = target.asked.above, target.asked.below
    return {
        "kind": target.asked.kind,
        "above": dict(zip(names, map(expression_text, above), strict=True)),
        "below": None if below is None
        else dict(zip(names, map(expression_text, below), strict=True)),
    }


def _perturbation(quantity: Expression, network: Network) -> Data:
    names = [transition.name for transition in network.transitions]
    if isinstance(quantity, Change):
        return {"kind": "finite-barrier", "transition": names[quantity.transition],
                "amount": expression_text(quantity.amount)}
    assert isinstance(quantity, Response)
    match quantity.perturbation:
        case EnergyOf(state):
            return {"kind": "energy", "state": network.states[state].name}
        case BarrierOf(e):
            twice = isinstance(quantity.quantity, Response)
            return {"kind": "second-barrier" if twice else "barrier", "transition": names[e]}
        case BarriersOf(transitions):
            return {"kind": "bundle", "transitions": [names[e] for e in transitions]}
        case DriveOf(e):
            return {"kind": "drive", "transition": names[e]}
        case BySymbol(name, logarithmic):
            return {"kind": "symbol", "symbol": name, "logarithmic": logarithmic}


def _claim(entry: Certified, quantity: Expression, analysis: Analysis) -> Data:
    worst = entry.worst
    assert worst.ratio is not None
    return {
        "name": entry.claim.name,
        "parts": _parts(entry.claim, quantity, analysis),
        "holds": entry.holds,
        "worst": {
            "point": worst.point,
            "left": fraction_text(worst.left),
            "right": [{"factor": fraction_text(term.factor),
                       "g": None if term.g is None else fraction_text(term.g)}
                      for term in worst.right],
            "ratio": fraction_text(worst.ratio),
        },
    }


def _parts(claim: Claim, quantity: Expression, analysis: Analysis) -> Data | None:
    if claim.name != "parameter" or not isinstance(quantity, Response):
        return None
    pieces: Decomposition = decompose(rate_changes(quantity.perturbation, analysis), analysis)
    states = [state.name for state in analysis.network.states]
    names = [t.name for t in analysis.network.transitions]
    return {
        "energies": {name: _text(piece) for name, piece in zip(states, pieces.energies, strict=True)
                     if piece != ZERO},
        "barriers": {names[e]: _text(piece) for e, piece in pieces.barriers.items()},
        "singles": {names[e]: _text(piece) for e, piece in pieces.singles.items()},
    }


def _text(piece: Expression) -> str:
    """Return a piece in the syntax of the file: absolute values as square roots of squares."""
    return expression_text(rebuild(piece, _plain))


def _plain(leaf: Expression) -> Expression:
    match leaf:
        case Absolute(inner):
            return power(power(rebuild(inner, _plain), 2), Fraction(1, 2))
        case Extreme(name, parts):
            first, *rest = (rebuild(part, _plain) for part in parts)
            for other in rest:
                gap = power(power(add([first, negate(other)]), 2), Fraction(1, 2))
                both = add([first, other, gap if name == "max" else negate(gap)])
                first = multiply([number(Fraction(1, 2)), both])
            return first
    return leaf


def record_text(record: Data) -> str:
    """Return a record as JSON, one point and one claim a line."""
    lines = []
    for key, value in record.items():
        if isinstance(value, list):
            inner = ",\n".join(_json(item) for item in value)
            lines.append(f"{_json(key)}: [\n{inner}\n]")
        else:
            lines.append(f"{_json(key)}: {_json(value)}")
    return "{\n" + ",\n".join(lines) + "\n}\n"


def _json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False)


def write_certificate(
    certificate: Certificate, analysis: Analysis, path: str | os.PathLike[str]
) -> None:
    """Write the record to a file, whole or not at all; OutputError where that cannot be done."""
    check_output(path, certificate.network.path)
    write_files({Path(path): record_text(record_of(certificate, analysis))})
