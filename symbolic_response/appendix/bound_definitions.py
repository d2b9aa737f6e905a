"""The notions that the inequalities of a document use, each explained where it occurs."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper
from symbolic_response.bounds.claim import Claim, CycleMaximum, EndPair, MixedCycles
from symbolic_response.bounds.curves import FiniteChange, LocalChange

Occurs = Callable[[Claim], bool]


def definitions(paper: Paper, claims: Sequence[Claim]) -> str:
    """Return the notions that the inequalities use, and only those."""
    text = ["The inequalities below hold for all admissible values of the symbols."]
    text += [words for occurs, words in NOTIONS if any(map(occurs, claims))]
    if _has_single_cycle(paper) and any(map(_has_force(EndPair), claims)):
        text.append(r"For the transitions of the only cycle $|\ln @cross ratio@_e| = "
                    r"|@force@_1|$, and both bounds agree.")
    return filled(paper, "\n".join(text))


def _has_single_cycle(paper: Paper) -> bool:
    return len(paper.analysis.fundamental_cycles) == 1


def _has_force(kind: type) -> Occurs:
    return lambda claim: any(isinstance(term.force, kind) for term in claim.right)


def _has_curve(kind: type) -> Occurs:
    return lambda claim: any(isinstance(term.curve, kind) for term in claim.right)


def _is_named(*names: str) -> Occurs:
    return lambda claim: claim.name in names


NOTIONS: list[tuple[Occurs, str]] = [
    (_has_force(CycleMaximum),
     r"$@force@_{\max}(e)$ is the largest $|@force@_c|$ of the cycles $c$ that contain the "
     r"transition $e$: zero if there are none, infinite if one of them has a one-way step, "
     r"$\tanh$ then being one."),
    (_has_curve(FiniteChange),
     r"Square brackets with two values of a barrier are the difference of a quantity between them; "
     r"for an infinite force $2 \ln(\cosh \ldots / \cosh \ldots)$ is the size of the change of the "
     r"barrier."),
    (_has_force(EndPair),
     r"$@cross ratio@_e = @rate@^+_e @free@_m / (@rate@^-_e @free@_n)$, for $e$ from $m$ to $n$, "
     r"with $@free@_k$ the part of $@tree sum@_k$ from trees that do not use $e$; it is a "
     r"weighted mean of the ratios of the "
     r"products of rates along and against the cycles through $e$, so that "
     r"$|\ln @cross ratio@_e| \le @force@_{\max}(e)$. The responses of all $\ln @probability@_k$ "
     r"to the barrier lie between "
     r"those of $m$ and $n$, which gives the bounds by the ends of the transition."),
    (_is_named("current-exact"),
     r"In the exact response of the current of a transition to its own barrier or drive, "
     r"$@free@_k$ is the part of $@tree sum@_k$ from trees that do not use the transition."),
    (_has_force(MixedCycles),
     r"$@force@_{\max}(\{\ldots\})$, of a set of transitions such that all spanning trees use "
     r"$@one@$ "
     r"or $@one@ + 1$ of them, is the largest $|@force@_c|$ of the cycles with transitions both "
     r"inside "
     r"and outside the set: all $@tree sum@_k$ are $@scale@^{@one@} (@free@_k + @scale@ @back@_k)$ "
     r"in a common factor $@scale@$ of their rates."),
    (_has_curve(LocalChange),
     r"For rates of one transition that change by powers $u \ge v \ge 0$ of one sign, "
     r"$\psi_{u,v}(x) = (\sqrt{u\,e^{x}} - \sqrt{v})^2/(e^{x} - 1)$ where $v\,e^{x} \ge u$ and "
     r"$x > 0$, else $u - v$; it is $u$ for an infinite $x$."),
    (_is_named("directed-bundle"),
     r"Where a parameter $z$ is a factor of some of the rates, the responses of all "
     r"$\ln @tree sum@_k$ to $\ln z$ lie between the least and the largest number of these rates "
     r"in a directed spanning tree."),
    (lambda claim: "splitting" in claim.name,
     r"A splitting $S$ of a transition is a set of states that contains its first state and not "
     r"its second, $S$ and the other states each being connected; $\mathrm{Cov}(q, 1_S) = "
     r"\langle q 1_S \rangle - \langle q \rangle @probability@_S$."),
    (lambda claim: "range" in claim.data,
     "Where the range of an observable limits its response, its values are rescaled affinely to "
     "$[0, 1]$."),
    (_is_named("parameter", "support"),
     "A parameter is resolved into energies, which change all rates out of a state alike, "
     "barriers, and single rates."),
]
