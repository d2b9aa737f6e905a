r"""Labels of drawings: their size in pt, and which formula stands at a rate.

Labels are set at fixed sizes, whatever the size of the document's text.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from symbolic_response.expressions.latex import expression_latex
from symbolic_response.expressions.tree import Expression
from symbolic_response.expressions.widths import TEXT, formula_width
from symbolic_response.figures.diagrams.geometry import Box
from symbolic_response.network.model import Network
from symbolic_response.response.notation import Notation

RATIOS = {10: (1.0, 1.0), 8: (0.87, 0.93), 7: (0.82, 0.87)}
"""For each size of labels the widths over those at 10 pt, at the most: letters, and scripts.

Small letters are cut wider.
"""
_SCRIPT = re.compile(r"[_^](\{[^{}]*(\{[^{}]*\}[^{}]*)*\}|\\[A-Za-z]+|.)")
LONGEST = 44.0
"""The widest expression in pt that is written at a rate."""
TALL = r"[A-Zbdfhijklt0-9()\[\]|/+-]|\\(beta|delta|lambda|theta|zeta|xi|[A-Z][a-z]+|var[A-Za-z]+)"
DEEP = r"[fgjpqyQ()\[\]|/,]|\\(beta|gamma|eta|zeta|xi|mu|rho|phi|chi|psi|varrho|varphi)"


@dataclass(frozen=True, slots=True)
class Label:
    """A formula, centred at x on a baseline; ``size`` in pt; extents in pt."""

    latex: str
    x: float
    baseline: float
    size: int
    width: float
    height: float
    depth: float

    @property
    def box(self) -> Box:
        """The rectangle it covers."""
        half = self.width / 2
        return Box(self.x - half, self.baseline - self.depth,
                   self.x + half, self.baseline + self.height)

    def centred(self, place: complex) -> Label:
        """Return it with its middle at a point."""
        baseline = place.imag - (self.height - self.depth) / 2
        return Label(self.latex, place.real, baseline, self.size, self.width, self.height,
                     self.depth)


def label(latex: str, size: int) -> Label:
    r"""Return a label around the point 0.

    >>> made = label("W_{21}", 8)
    >>> round(made.width, 1), round(made.height, 1), round(made.depth, 1)
    (16.0, 5.5, 1.7)
    """
    measured = latex.replace(r"\varnothing", r"\mathrm{O}")  # as wide, and in the table
    width = formula_width(measured, style=TEXT)
    letters = 0.0 if "frac" in latex else formula_width(_SCRIPT.sub("", measured), style=TEXT)
    large, script = RATIOS[size]
    if not letters or any(re.search(r"[_^]", found[1]) for found in _SCRIPT.finditer(latex)):
        script = 1.0  # scripts of scripts are as small at every size
    width = large * letters + script * (width - letters)
    height, depth = _extent(latex)
    scale = size / 10
    return Label(latex, 0.0, 0.0, size, width, height * scale, depth * scale).centred(0j)


def _extent(latex: str) -> tuple[float, float]:
    """Return height and depth at 10 pt, of what is usual on one line; fractions are taller."""
    if fractions := latex.count("frac"):
        scripts = re.search(r"[_^']|\\(hat|bar|tilde|vec|d?dot)", latex)
        return (13.5 if scripts else 9.5) + 5 * (fractions - 1), 3.0 + 4 * fractions
    plain = re.sub(r"\\(mathrm|text|mathbf|mathcal|mathit|boldsymbol|operatorname)\b", "", latex)
    base = _SCRIPT.sub("", plain)
    height = 6.9 if re.search(TALL, base) else 4.4
    depth = 1.95 if re.search(DEEP, base) else 0.0
    if re.search(r"\\(hat|bar|tilde|vec|dot|ddot|widehat|overline)", latex):
        height += 2.7
    if "_" in plain.replace(r"\_", ""):
        low = re.search(DEEP, "".join(found[0] for found in _SCRIPT.finditer(plain)))
        both = "^" in plain
        depth = max(depth, (4.9 if both else 3.4) if low else 3.1 if both else 2.15)
    if "^" in plain or "'" in plain:
        height = max(height, 9.3)
    return height, depth


# -- rates -----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class RateLabels:
    """The LaTeX at each directed rate, by transition and whether it is the backward one.

    ``letters`` are the transitions that show letters, not expressions.
    """

    texts: Mapping[tuple[int, bool], str]
    letters: tuple[int, ...]


def rate_labels(
    network: Network, notation: Notation, letters: str | None, expressions: bool
) -> RateLabels:
    """Return what stands at the rates.

    A transition whose expressions are long, or whose rates follow from energies, shows letters
    for both: see :func:`rate_letter`.
    """
    kind = letters or _shorter(network, notation)
    made: dict[tuple[int, bool], str] = {}
    lettered = []
    for e, transition in enumerate(network.transitions):
        rates: list[tuple[bool, Expression]] = [(False, transition.forward)]
        if transition.backward is not None:
            rates.append((True, transition.backward))
        shown = {back: expression_latex(rate, notation.symbols) for back, rate in rates}
        short = all(label(latex, 8).width <= LONGEST for latex in shown.values())
        if not (expressions and short and transition.barrier is None):
            shown = {back: rate_letter(network, notation, e, back, kind) for back, _ in rates}
            lettered.append(e)
        made.update({(e, back): latex for back, latex in shown.items()})
    return RateLabels(made, tuple(lettered))


def rate_letter(
    network: Network, notation: Notation, transition: int, backward: bool, kind: str
) -> str:
    r"""Return the letter of a rate: ``"generator"`` W_{ij}, from j to i, or ``"rate"`` w^+_e."""
    if kind == "rate":
        return notation.rate(transition, backward)
    entry = network.transitions[transition]
    source, target = notation.states[entry.first], notation.states[entry.second]
    if backward:
        source, target = target, source
    short = all(re.fullmatch(r"[A-Za-z0-9]|\\[A-Za-z]+", name) for name in (source, target))
    comma = "" if short else ","
    between = " " if not comma and target.startswith("\\") and source[0].isalpha() else comma
    return notation.indexed("generator", f"{target}{between}{source}")


def _shorter(network: Network, notation: Notation) -> str:
    """Return the kind of letters: W_{ij} only where no two transitions join the same states."""
    joined = [frozenset((t.first, t.second)) for t in network.transitions]
    if len(set(joined)) < len(joined):
        return "rate"
    widest = {
        kind: max(label(rate_letter(network, notation, e, False, kind), 8).width
                  for e in range(len(joined)))
        for kind in ("generator", "rate")
    }
    return "generator" if widest["generator"] <= widest["rate"] + 2 else "rate"
