"""What ``certify`` says about a certificate, for people and as data."""

from __future__ import annotations

from fractions import Fraction

from symbolic_response.bounds.decide import Weighted
from symbolic_response.certificates.axes import value_text
from symbolic_response.certificates.certify import Certificate, Certified, values_text
from symbolic_response.certificates.sampling import Values
from symbolic_response.expressions.text import fraction_text

DIGITS = 8


def ratio_text(ratio: Fraction) -> str:
    """Return a ratio as a decimal rounded down.

    >>> ratio_text(Fraction(2, 3))
    '0.66666666'
    """
    whole, rest = divmod(ratio.numerator * 10**DIGITS // ratio.denominator, 10**DIGITS)
    return f"{whole}.{rest:0{DIGITS}d}"


def certificate_text(certificate: Certificate, file: str | None) -> str:
    """Return the table of a certificate: bound, points, largest ratio, where it is."""
    rows = [("bound", "points", "largest ratio", "where")]
    shown: dict[int, str] = {}
    for entry in certificate.claims:
        place, at = entry.worst.point, certificate.points[entry.worst.point]
        where = shown.get(place) or values_text(at) or "the only point"
        shown.setdefault(place, f"as {entry.claim.name}")
        rows.append((entry.claim.name, str(entry.holds), _ratio(entry), where))
    widths = [max(len(row[column]) for row in rows) for column in range(3)]
    lines = ["  ".join([*(cell.ljust(width) for cell, width in zip(row, widths, strict=False)),
                        row[3]]) for row in rows]
    lines.append(f"every verdict exact; {certificate.count} points sampled with seed"
                 f" {certificate.seed!r}, {len(certificate.points) - certificate.count} from the"
                 " search")
    if file is not None:
        lines.append(f"written: {file}")
    return "\n".join(lines)


def _ratio(entry: Certified) -> str:
    return ratio_text(entry.worst.ratio or Fraction(0))


def certificate_data(certificate: Certificate, file: str | None) -> dict[str, object]:
    """Return a certificate, or its refutation, as plain data for JSON."""
    refuted = certificate.refuted
    return {
        "network": certificate.network.title,
        "response": certificate.response,
        "seed": certificate.seed,
        "count": certificate.count,
        "points": len(certificate.points),
        "bounds": [
            {"name": entry.claim.name, "holds": entry.holds, "ratio": _ratio(entry),
             "left": fraction_text(entry.worst.left), "right": _terms(entry.worst.right),
             "at": _values(certificate.points[entry.worst.point]),
             "search": entry.skipped}
            for entry in certificate.claims
        ],
        "refuted": None if refuted is None else {
            "name": refuted.claim.name, "at": _values(refuted.values),
            "left": fraction_text(refuted.place.left), "right": _terms(refuted.place.right)},
        "file": file,
    }


def _values(values: Values) -> dict[str, str]:
    return {name: value_text(value) for name, value in values.items()}


def _terms(right: tuple[Weighted, ...]) -> list[dict[str, str | None]]:
    return [{"factor": fraction_text(term.factor),
             "g": None if term.g is None else fraction_text(term.g)} for term in right]
