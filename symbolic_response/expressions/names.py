"""Names: what a name may look like, which words are taken, near misses, default LaTeX."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable

NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*", re.ASCII)

RESERVED = frozenset(
    "d p mean variance cov current traffic forward backward force energy barrier drive "
    "entropy_production force_max max_cov exp ln log sqrt tanh abs max min".split()
)
"""Words with a meaning in quantities and expressions; no symbol may have one as its name."""

_GREEK = frozenset(
    "alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi pi rho sigma tau "
    "upsilon phi chi psi omega "
    "Gamma Delta Theta Lambda Xi Pi Sigma Upsilon Phi Psi Omega".split()
)


def nearest(name: str, known: Iterable[str]) -> str:
    """Return ``"; did you mean 'bind'?"`` for the known name closest to ``name``, or ``""``.

    >>> nearest("bimd", ["flip", "bind"])
    "; did you mean 'bind'?"
    >>> nearest("xyz", ["flip", "bind"])
    ''
    """
    candidates = list(known)
    lowered = {candidate.lower(): candidate for candidate in reversed(candidates)}
    found = difflib.get_close_matches(name.lower(), list(lowered), n=1)
    return f"; did you mean {lowered[found[0]]!r}?" if found else ""
