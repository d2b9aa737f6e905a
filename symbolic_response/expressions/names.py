"""Names: what a name may look like, which words are taken, near misses, default LaTeX."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable

NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*", re.ASCII)

RESERVED = frozenset((
    "d", "p", "mean", "variance", "cov", "current", "traffic", "forward", "backward", "force",
    "energy", "barrier", "drive", "entropy_production", "force_max", "max_cov", "exp", "ln", "log",
    "sqrt", "tanh", "abs", "max", "min",
))
"""Words with a meaning in quantities and expressions; no symbol may have one as its name."""

_GREEK = frozenset((
    "alpha", "beta", "gamma", "delta", "epsilon", "zeta", "eta", "theta", "iota", "kappa",
    "lambda", "mu", "nu", "xi", "pi", "rho", "sigma", "tau", "upsilon", "phi", "chi", "psi",
    "omega", "Gamma", "Delta", "Theta", "Lambda", "Xi", "Pi", "Sigma", "Upsilon", "Phi", "Psi",
    "Omega",
))


def nearest(name: str, known: Iterable[str]) -> str:
    """Return ``"; did you mean 'bind'?"`` for the known name closest to ``name``, or ``""``.

    >>> nearest("bimd", ["flip", "bind"])
    "; did you mean 'bind'?"
    >>> nearest("xyz", ["flip", "bind"])
    ''
    """
    if len(name) > 100:
        return ""
    candidates = list(known)
    lowered = {candidate.lower(): candidate for candidate in reversed(candidates)}
    found = difflib.get_close_matches(name.lower(), list(lowered), n=1)
    return f"; did you mean {lowered[found[0]]!r}?" if found else ""


def default_latex(name: str) -> str:
    r"""Return the LaTeX of a name that has none of its own.

    What follows the first ``_`` is a subscript, and so are digits at the end of what comes before
    it; Greek names are Greek, other words of several letters upright outside subscripts.

    >>> [default_latex(name) for name in ("c", "k_on", "k1", "k12", "mu_x", "k1_on", "ATP")]
    ['c', 'k_{on}', 'k_1', 'k_{12}', '\\mu_{x}', 'k_{1,on}', '\\mathrm{ATP}']
    """
    head, *rest = name.split("_")
    base = head.rstrip("0123456789")
    digits = head[len(base) :]
    parts = [_greek(part) for part in rest if part]
    if digits and not parts:
        return _word(base) + (f"_{digits}" if len(digits) == 1 else f"_{{{digits}}}")
    subscript = ",".join([digits, *parts] if digits else parts)
    return _word(base) + (f"_{{{subscript}}}" if subscript else "")


def upright(name: str) -> str:
    r"""Return a name as upright letters.

    >>> print(upright("A_B"))
    \mathrm{A\_B}
    """
    return rf"\mathrm{{{name}}}".replace("_", r"\_")


def base_latex(latex: str) -> str:
    """Return what stands before the first subscript, superscript or prime."""
    return re.split(r"[_^']", latex)[0]


def same_latex(latex: str) -> str:
    """Return a key that is equal for two texts that print alike: ``k_1`` and ``k_{1}``."""
    unbraced = re.sub(r"\{([^\\{}]|\\[A-Za-z]+)\}", r"\1", latex)
    return re.sub(r"\s+", " ", unbraced).strip()


def _greek(word: str) -> str:
    return "\\" + word if word in _GREEK else word


def _word(word: str) -> str:
    return _greek(word) if len(word) == 1 or word in _GREEK else f"\\mathrm{{{word}}}"
