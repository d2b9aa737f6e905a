"""Certificates by points alone, for the tests about sampling and search."""

from __future__ import annotations

from typing import Any

from symbolic_response.certificates.certify import certify
from symbolic_response.certificates.points import PointCertificate
from symbolic_response.network import Network
from symbolic_response.response.analysis import Analysis


def certify_points(subject: Network | Analysis, text: str, **options: Any) -> PointCertificate:
    made = certify(subject, text, method="points", **options)
    assert made.points is not None and not made.proved.claims
    return made.points
