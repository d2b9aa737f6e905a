"""The table of point certificates: domain, points, largest ratio, digests if asked for."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from fractions import Fraction

from symbolic_response.appendix.bounded import Bounded, shown
from symbolic_response.appendix.bounds_section import WORDS
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.tables import Column, digest_latex, table
from symbolic_response.certificates.points import PointCertificate, certify_claims
from symbolic_response.certificates.record import point_record, record_text
from symbolic_response.certificates.report import ratio_text
from symbolic_response.errors import RefutedError, UndecidedError

SEED = "0"


def certificates_section(
    paper: Paper, entries: Sequence[Bounded], count: int, digests: bool
) -> str:
    """Return the table for all responses that are bounded; empty if ``count`` is 0.

    Raises RefutedError, with the point, if an inequality fails.
    """
    if count == 0:
        return ""
    rows: list[list[str]] = []
    hashes: list[list[str]] = []
    left_out: list[str] = []
    for entry in entries:
        claims = [claim for claim in entry.claims if claim.has_points]
        if not claims:
            continue
        name = shown(paper, entry)
        try:
            found = certify_claims(paper.analysis, entry.quantity, claims, count=count, seed=SEED)
        except UndecidedError:
            left_out.append(name)
            continue
        if found.refuted is not None:
            raise RefutedError(found.refuted.message())
        rows += _rows(name, found)
        if digests:
            text = record_text(point_record(found, paper.analysis))
            digest = hashlib.sha256(text.encode()).hexdigest()
            hashes.append([name, digest_latex(digest)])
    if not rows and not left_out:
        return ""
    return "\n\n".join(part for part in [
        rf"\section{{Certificates}}{chr(10)}" + _words(count),
        table(paper.page, _COLUMNS, rows) if rows else "", _left_out(left_out),
        table(paper.page, _DIGESTS, hashes) if hashes else ""] if part)


def _words(count: int) -> str:
    return (f"Each inequality was decided in exact rational arithmetic at {count} sampled points, "
            "a fixed number of which bring the force of one cycle near zero, to moderate and to "
            "large values, and at the points of a search for large ratios. The domain is that of "
            "all admissible values of the symbols; samples are drawn from the ranges of the "
            "network file. "
            "None was violated. The largest ratio of the left to the right side is rounded down: "
            "the closer to one, the tighter.")


_COLUMNS = (Column("Quantity"), Column("Limited", "wrap", "limited "),
            Column("Points", "r", "points "), Column("Largest ratio", "r", "largest ratio "))
_DIGESTS = (Column("Quantity"), Column("SHA-256 of the certificate record", "wrap"))


def _rows(name: str, found: PointCertificate) -> list[list[str]]:
    rows = []
    for place, entry in enumerate(found.claims):
        words = WORDS[entry.claim.name]
        ratio = ratio_text(entry.worst.ratio or Fraction(0))
        rows.append([name if place == 0 else "", words, f"{entry.holds}", ratio])
    return rows


def _left_out(names: Sequence[str]) -> str:
    if not names:
        return ""
    return ("No points at which all rates are rational exist for a symbol that stands both inside "
            f"and outside of exponentials; left out: {', '.join(names)}.")

