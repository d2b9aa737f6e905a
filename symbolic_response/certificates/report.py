"""What ``certify`` says about a certificate, for people and as data."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from symbolic_response.bounds.decide import Weighted
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.certify import NO_POINTS, Certificate
from symbolic_response.certificates.points import Certified, PointCertificate, values_text
from symbolic_response.certificates.proofs.prove import Proof, Proved
from symbolic_response.certificates.proofs.record import form_of, kind_of
from symbolic_response.certificates.sampling import Values
from symbolic_response.expressions.text import fraction_text
from symbolic_response.network.model import Network

DIGITS = 8


def ratio_text(ratio: Fraction) -> str:
    """Return a ratio as a decimal rounded down.

    >>> ratio_text(Fraction(2, 3))
    '0.66666666'
    """
    whole, rest = divmod(ratio.numerator * 10**DIGITS // ratio.denominator, 10**DIGITS)
    return f"{whole}.{rest:0{DIGITS}d}"


def certificate_text(certificate: Certificate, file: str | None) -> str:
    """Return what is proved and by what, then the table of points, then what has neither."""
    lines: list[str] = []
    if certificate.proved.claims:
        lines += _proof_lines(certificate.proved, certificate.network)
    if certificate.points is not None:
        lines += [""] * bool(lines) + _point_lines(certificate.points)
        lines += [f"no proof of {claim.name}: {why}" for claim, why in certificate.proved.without
                  if claim.has_points and why != NO_POINTS]
    lines += [f"not certified: {claim.name}: {why}" for claim, why in certificate.without]
    if file is not None:
        lines.append(f"written: {file}")
    return "\n".join(lines)


def _proof_lines(proved: Proved, network: Network) -> list[str]:
    rows = [("bound", "proved by")]
    rows += [(claim.name, ", ".join(proof_text(proof, network) for proof in proofs)
              or "its pieces")
             for claim, proofs in zip(proved.claims, proved.needs, strict=True)]
    lines = _columns(rows)
    lines.append("each holds for all positive rates of the network")
    if any(form_of(proof) == "compact" for proof in proved.proofs):
        lines.append("compact: the identities of trees and forests are cited as theorems; a check"
                     " tries them at a random point")
    return lines


def proof_text(proof: Proof, network: Network) -> str:
    """Return a proof in a few words: its kind, what it is about, its form."""
    subject = proof.subject(network)
    form = form_of(proof)
    return kind_of(proof) + (f" {subject}" if subject else "") + (f" ({form})" if form else "")


def _columns(rows: Sequence[tuple[str, ...]]) -> list[str]:
    """Return rows with all columns but the last padded to one width."""
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]) - 1)]
    return ["  ".join([*(cell.ljust(width) for cell, width in zip(row, widths, strict=False)),
                       row[-1]]) for row in rows]


def _point_lines(certificate: PointCertificate) -> list[str]:
    """Return the table of points: bound, points, largest ratio, where it is."""
    rows = [("bound", "points", "largest ratio", "where")]
    shown: dict[int, str] = {}
    for entry in certificate.claims:
        place, at = entry.worst.point, certificate.points[entry.worst.point]
        where = shown.get(place) or values_text(at) or "the only point"
        shown.setdefault(place, f"as {entry.claim.name}")
        rows.append((entry.claim.name, str(entry.holds), _ratio(entry), where))
    lines = _columns(rows)
    lines.append(f"every verdict exact; {certificate.count} points sampled with seed"
                 f" {certificate.seed!r}, {len(certificate.points) - certificate.count} from the"
                 " search")
    return lines


def _ratio(entry: Certified) -> str:
    return ratio_text(entry.worst.ratio or Fraction(0))


def certificate_data(certificate: Certificate, file: str | None) -> dict[str, object]:
    """Return a certificate, or its refutation, as plain data for JSON."""
    refuted, points, proved = certificate.refuted, certificate.points, certificate.proved
    return {
        "network": certificate.network.title,
        "response": certificate.response,
        "proved": [
            {"name": claim.name, "domain": "all positive rates",
             "proofs": [{"kind": kind_of(proof), "form": form_of(proof),
                         "subject": proof.subject(certificate.network)} for proof in proofs]}
            for claim, proofs in zip(proved.claims, proved.needs, strict=True)
        ],
        "seed": None if points is None else points.seed,
        "count": None if points is None else points.count,
        "points": None if points is None else len(points.points),
        "bounds": [] if points is None else [
            {"name": entry.claim.name, "holds": entry.holds, "ratio": _ratio(entry),
             "left": fraction_text(entry.worst.left), "right": _terms(entry.worst.right),
             "at": _values(points.points[entry.worst.point]),
             "search": entry.skipped}
            for entry in points.claims
        ],
        "refuted": None if refuted is None else {
            "name": refuted.claim.name, "at": _values(refuted.values),
            "left": fraction_text(refuted.place.left), "right": _terms(refuted.place.right)},
        "not_certified": [{"name": claim.name, "reason": why}
                          for claim, why in certificate.without],
        "file": file,
    }


def _values(values: Values) -> dict[str, str]:
    return {name: value_text(value) for name, value in values.items()}


def _terms(right: tuple[Weighted, ...]) -> list[dict[str, str | None]]:
    return [{"factor": fraction_text(term.factor),
             "g": None if term.g is None else fraction_text(term.g)} for term in right]
