"""The pieces of a change of the rates, what each can do, and the statement that follows."""

from __future__ import annotations

from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.control.family import Family


def theory(paper: Paper, family: Family, printed: str) -> str:
    """Return the statement with its hypotheses, family and sources.

    ``printed``: the section of proofs; what it holds is referred to, the rest is shown here.
    """
    one_way = any(paper.analysis.graph.one_way)
    texts = [_OPENING, _pieces(family, one_way), _statement(printed), _family(family)]
    if family.bundles and r"\label{eq:bundle}" not in printed and _several(family):
        texts.append(_BUNDLES)
    return filled(paper, "\n\n".join(texts))


_OPENING = r"""Let $@parameter@$ be a parameter of the rates or its logarithm. How strongly the mean
of a function of the state responds to it is limited by taking the changes
$\partial \ln @rate@ / \partial @parameter@$ of all rates apart into pieces. For positive rates the
pieces have these effects on $\ln (@probability@_i / @probability@_j)$:"""


def _several(family: Family) -> bool:
    return any(len(part) > 1 for part in family.bundles)


def _pieces(family: Family, one_way: bool) -> str:
    items = [r"energies, $@amount@_k$ on all rates out of state $k$: together at most "
             r"$\max_k @amount@_k - \min_k @amount@_k$~\cite{owen};"]
    if family.bundles:
        bundle = (r"bundles, $@amount@$ on all rates of a set $\mathcal{B}$ of transitions of which"
                  r" every spanning tree uses $@one@$ or $@one@ + 1$: at most "
                  r"$|@amount@| \tanh (@force@_{\max}(\mathcal{B})/4)$, with "
                  r"$@force@_{\max}(\mathcal{B})$ the largest $|@force@_c|$ of the cycles $c$ with "
                  r"transitions both inside and outside of $\mathcal{B}$ (for a single transition"
                  r"~\cite{owen}" + ("; for several derived here);" if _several(family) else ");"))
        items.append(bundle)
    items.append(r"blocks, $@amount@$ on all rates of a set of transitions that the rest of the "
                 "network meets in single states only: no effect, as every spanning tree uses "
                 "equally many of them;")
    drive = (r"drives, $@amount@/2$ on the forward and $-@amount@/2$ on the backward rate of a "
             r"transition: at most $|@amount@|$")
    items.append(drive + (r", for a one-way step $|@amount@|/2$" if one_way else "")
                 + r"~\cite{owen};")
    items.append(r"sets of rates out of one state, $@amount@$ on each: at most $|@amount@|$, "
                 "since a spanning tree, directed towards any state, uses one of them at most; of "
                 "other sets of rates $|@amount@|$ times the range of how many of them a spanning "
                 "tree uses (derived here).")
    return ("\\begin{itemize}\n" + "\n".join(rf"\item {item}" for item in items)
            + "\n\\end{itemize}")


def _statement(printed: str) -> str:
    why = (r"by Eq.~\eqref{eq:mean}" if r"\label{eq:mean}" in printed else
           "since the logarithms of $\\langle q \\rangle$ and $1 - \\langle q \\rangle$ respond by "
           "two weighted means of the responses of the $\\ln @probability@_k$")
    bundle = r" (for bundles see Eq.~\eqref{eq:bundle})" if r"\label{eq:bundle}" in printed else ""
    return rf"""A parameter does no more than its pieces together{bundle}. Let $@steepness@$ be the
sum of their limits. Then, {why}, for every function $0 \le q \le 1$ of the state that does not
itself depend on $@parameter@$,
\begin{{equation}}
\Bigl| \frac{{\partial \langle q \rangle}}{{\partial @parameter@}} \Bigr|
 \le @steepness@ \, \langle q \rangle \bigl(1 - \langle q \rangle\bigr) .
\label{{eq:control}}
\end{{equation}}
In other words, the local exponent
$\partial \ln [\langle q \rangle / (1 - \langle q \rangle)] / \partial @parameter@$ is at most
$@steepness@$ in size: where $@steepness@$ is constant the curve is nowhere steeper than a Hill
curve with this exponent."""


def _family(family: Family) -> str:
    count = len(family.bundles)
    if family.complete:
        bundles = "all bundles"
    else:
        bundles = (f"the first {count:,} bundles, up to complements in their blocks, in the order "
                   "of their number of transitions, then of these in the file")
    return ("Below, $@steepness@$ is the smallest such sum over one family of pieces, found by a "
            "linear program in exact arithmetic: all energies, all unions of blocks, "
            f"{bundles}, all drives, and all sets of rates out of one state. The family is part of "
            "the statement; other pieces may limit the response further.")


_BUNDLES = r"""For a bundle of several transitions, let $@scale@$ multiply all its rates. Then
$@tree sum@_k = @scale@^{@one@} (@free@_k + @scale@ @back@_k)$ with sums over the trees that use
$@one@$ and $@one@ + 1$ of its transitions, and the response of
$\ln (@probability@_i / @probability@_j)$ to $\ln @scale@$ is the difference of
$@scale@ @back@_i / (@free@_i + @scale@ @back@_i)$ and the same for $j$. The odds of these two
numbers have the ratio $@back@_i @free@_j / (@free@_i @back@_j)$, and two numbers whose odds have a
ratio of at most $e^{@one@}$ differ by $\tanh (@one@/4)$ at the most. A matching of the terms of
$@back@_i @free@_j$ with those of $@free@_i @back@_j$, each pair equal or differing by the reversal
of one cycle with transitions both inside and outside of the bundle, shows that the ratio is at most
$\exp @force@_{\max}(\mathcal{B})$."""
