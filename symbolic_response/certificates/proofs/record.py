"""The record of a proof: the format in DEVELOPERS.md."""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.certificates.proofs.coefficients import CoefficientsProof
from symbolic_response.certificates.proofs.edge import EdgeProof
from symbolic_response.certificates.proofs.prove import Proof
from symbolic_response.certificates.proofs.rows import PathsProof, Row
from symbolic_response.certificates.proofs.splitting import SplittingProof
from symbolic_response.certificates.proofs.transport import TransportProof
from symbolic_response.expressions.text import fraction_text
from symbolic_response.response.analysis import Analysis

Data = dict[str, object]


def trees_data(proofs: Sequence[Proof], analysis: Analysis) -> list[int] | None:
    """Return all spanning trees as masks if a proof needs them, else None."""
    if any(isinstance(proof, TransportProof) or form_of(proof) == "expanded" for proof in proofs):
        return [int(mask) for mask in analysis.trees.masks]
    return None


def form_of(proof: Proof) -> str | None:
    """Return whether a proof is expanded or compact, None for a kind that has one form only."""
    match proof:
        case EdgeProof() | SplittingProof() | PathsProof():
            return "expanded" if proof.expanded else "compact"
    return None


def kind_of(proof: Proof) -> str:
    """Return the kind of a proof."""
    return KINDS[type(proof)]


KINDS: dict[type, str] = {
    EdgeProof: "edge",
    SplittingProof: "splitting",
    CoefficientsProof: "coefficients",
    TransportProof: "transport",
    PathsProof: "paths",
}


def proof_data(proof: Proof, analysis: Analysis) -> Data:
    """Return a proof as plain data."""
    states = [state.name for state in analysis.network.states]
    names = [transition.name for transition in analysis.network.transitions]
    kind: Data = {"kind": kind_of(proof)}
    match proof:
        case EdgeProof(e, _, rows):
            return {**kind, "transition": names[e], "form": form_of(proof), "cycles": _rows(rows)}
        case SplittingProof(e, _, sides):
            return {**kind, "transition": names[e], "form": form_of(proof),
                    "splittings": [{"side": one.mask, "weight": one.weight} for one in sides]}
        case CoefficientsProof(low, high):
            return {**kind, "low": fraction_text(low), "high": fraction_text(high)}
        case PathsProof(start, goal, _, rows):
            return {**kind, "from": states[start], "to": states[goal], "form": form_of(proof),
                    "paths": _rows(rows)}
    return {
        **kind,
        "transitions": [names[e] for e in proof.transitions],
        "cycles": [list(cycle) for cycle in proof.cycles],
        "pairs": [
            {"states": [states[i], states[j]],
             "moves": [{"cycle": move.cycle, "rest": list(move.rest), "times": move.times}
                       for move in moves]}
            for i, j, moves in proof.pairs
        ],
    }


def _rows(rows: Sequence[Row]) -> list[Data]:
    return [{"steps": list(row.steps), "weight": row.weight} for row in rows]
