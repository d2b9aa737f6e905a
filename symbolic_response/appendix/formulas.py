"""General formulas and their words, and the definitions of named sums."""

from __future__ import annotations

from collections.abc import Sequence, Set

from symbolic_response.appendix import relations
from symbolic_response.appendix.named_sums import NamedSum
from symbolic_response.appendix.paper import Paper
from symbolic_response.expressions.breaking import (
    NUMBER_ROOM,
    RELATION_WIDTH,
    SIGN_WIDTH,
    Equation,
    Piece,
    continued,
    line_limit,
)
from symbolic_response.expressions.tree import (
    Expression,
    Symbol,
    add,
    multiply,
    negate,
    symbols_of,
)
from symbolic_response.expressions.widths import formula_width

MAX_SUM_TERMS = 250


def introduction(paper: Paper, kind: str, definitions: Sequence[NamedSum]) -> str:
    """Return the general formula of a group of results, in a sentence."""
    words = _INTRODUCTIONS.get(kind)
    text = words(paper) if words is not None else ""
    if kind in ("barrier", "barriers", "drive", "symbol") and any(
        d.kind in ("forest", "mean forest") for d in definitions
    ):
        text += _mean_forests(paper, definitions)
    return text


def filled(paper: Paper, text: str) -> str:
    r"""Return a text with letters put in: ``@current@`` becomes ``J``."""
    for role, latex in paper.letters.items():
        text = text.replace(f"@{role}@", latex)
    return text


def _current(paper: Paper) -> str:
    return filled(paper, r"""The net current of a transition $e$ from state $m$ to state $n$ is
\begin{equation}
@current@_e = @rate@^+_e @probability@_m - @rate@^-_e @probability@_n
 = \frac{@current numerator@_e}{@normalisation@}, \qquad
@current numerator@_e = @rate@^+_e @tree sum@_m - @rate@^-_e @tree sum@_n .
\end{equation}""") + _one_cycle(paper)


def _one_cycle(paper: Paper) -> str:
    """Return the current of a network with a single cycle, empty for other networks."""
    if len(paper.analysis.fundamental_cycles) != 1:
        return ""
    cycle = paper.analysis.fundamental_cycles[0]
    outside = len(cycle.states) < paper.analysis.graph.size
    forests, which = "", ""
    if outside:
        forests = r" \, @into@_1"
        which = (r", $@into@_1$ being the sum of the weights of the spanning forests in which "
                 "every state outside of the cycle is directed into it" + divided(paper))
    elif not is_one(paper):
        forests = r" \, @factor@^{-1}"
    only = " and no other current flows" if len(cycle.transitions) < len(
        paper.analysis.graph.ends) else ""
    return filled(paper, rf"""
The network has a single cycle. In its orientation listed above, one and the same current runs
through all its transitions,{only and only + ','} with
\begin{{equation}}
@current numerator@ = \Bigl( \prod_{{c}} @rate@ \ \text{{along}}
 - \prod_{{c}} @rate@ \ \text{{against}} \Bigr){forests}
\label{{eq:cycle}}
\end{{equation}}
in the place of $@current numerator@_e${which}.""")


def divided(paper: Paper) -> str:
    """Return that a sum is divided by the common factor, empty where that is one."""
    return "" if is_one(paper) else ", divided by the factor $@factor@$ like the $@tree sum@_k$"


def _traffic(paper: Paper) -> str:
    return filled(paper, r"""The traffic of a transition $e$ from $m$ to $n$, the sum of its two
flows, is
\begin{equation}
@traffic@_e = @rate@^+_e @probability@_m + @rate@^-_e @probability@_n
 = \frac{@traffic numerator@_e}{@normalisation@}, \qquad
@traffic numerator@_e = @rate@^+_e @tree sum@_m + @rate@^-_e @tree sum@_n .
\end{equation}""")


def _entropy(paper: Paper) -> str:
    return filled(paper, r"""The entropy production rate, in units of $k_{\mathrm B}$ per time, is
\begin{equation}
@entropy@ = \sum_e @current@_e
 \ln \frac{@rate@^+_e @probability@_m}{@rate@^-_e @probability@_n}
 = \sum_{c} @current@_{c} @force@_{c} ,
\end{equation}
where each parallel transition counts by itself and the second sum runs over fundamental cycles,
$@current@_c$ being the current through the one transition that belongs to no other of
them~\cite{schnakenberg}.""")


def _energy(paper: Paper) -> str:
    return filled(paper, r"""For a function $q$ of the state that does not itself depend on the
energies,
\begin{equation}
\frac{\partial \langle q \rangle}{\partial @energy@_j}
 = @probability@_j \bigl(\langle q \rangle - q_j\bigr), \qquad
\frac{\partial @probability@_k}{\partial @energy@_j}
 = @probability@_j \bigl(@probability@_k - \delta_{jk}\bigr),
\end{equation}
however far from equilibrium~\cite{owen}.""")


_FOREST = r"""Here $@forest@_{k,e}$, for $e$ between $m$ and $n$, is a difference of sums over
spanning forests of two trees, each tree directed towards its root: the forests with roots $k$ and
$m$ and with $n$ in the tree of $k$, minus those with roots $k$ and $n$ and with $m$ in the tree of
$k$ (all-minors theorem~\cite{chaiken})"""


def _forest(paper: Paper) -> str:
    if "forest" in paper.explained:
        return ""
    paper.explained.add("forest")
    return _FOREST + divided(paper) + "."


def is_one(paper: Paper) -> bool:
    """Return whether the tree sums have no common factor."""
    common = paper.sums.common
    return common.is_constant() and common.coefficient == 1


def _barrier(paper: Paper) -> str:
    return filled(paper, r"""The response of a probability to a barrier factorises,
\begin{equation}
\frac{\partial @probability@_k}{\partial @barrier@_e}
 = -\frac{@current numerator@_e @forest@_{k,e}}{@normalisation@^2}
 = -@current@_e \frac{@forest@_{k,e}}{@normalisation@} ,
\end{equation}
with $@current numerator@_e = @rate@^+_e @tree sum@_m - @rate@^-_e @tree sum@_n$ the numerator of
the current; it vanishes with the current, and thus for every barrier at detailed balance. """
                  + _forest(paper))


def _barriers(paper: Paper) -> str:
    return filled(paper, r"""The response to several barriers raised together is the sum of the
responses to each,
\begin{equation}
\frac{\partial @probability@_k}{\partial @barrier@_{\{\ldots\}}}
 = -\sum_{e \in \{\ldots\}} \frac{@current numerator@_e @forest@_{k,e}}{@normalisation@^2} .
\end{equation}
""" + _forest(paper))


def _drive(paper: Paper) -> str:
    return filled(paper, r"""The response of a probability to a drive is
\begin{equation}
\frac{\partial @probability@_k}{\partial @drive@_e}
 = \frac{@traffic numerator@_e @forest@_{k,e}}{2 @normalisation@^2} , \qquad
@traffic numerator@_e = @rate@^+_e @tree sum@_m + @rate@^-_e @tree sum@_n .
\end{equation}
""" + _forest(paper))


def _symbol(paper: Paper) -> str:
    return filled(paper, r"""A parameter $x$ acts through all rates that contain it,
\begin{equation}
\frac{\partial @probability@_k}{\partial x} = \sum_e \Bigl(
 \frac{\partial \ln @rate@^+_e}{\partial x} @rate@^+_e @tree sum@_m
 - \frac{\partial \ln @rate@^-_e}{\partial x} @rate@^-_e @tree sum@_n \Bigr)
 \frac{@forest@_{k,e}}{@normalisation@^2} ,
\end{equation}
and on a mean also through the values of its observable. """ + _forest(paper))


def _mean(paper: Paper) -> str:
    return filled(paper, r"""With the $@tree sum@_k$ and $@normalisation@$ above, means are
$\langle q \rangle = \sum_k q_k @tree sum@_k / @normalisation@$:""")


def _probability(paper: Paper) -> str:
    return "The tree theorem gives"


def _other(paper: Paper) -> str:
    return "In terms of the sums above, and of those defined here,"


_INTRODUCTIONS = {
    "probability": _probability,
    "other": _other,
    "mean": _mean,
    "current": _current,
    "traffic": _traffic,
    "entropy": _entropy,
    "energy": _energy,
    "barrier": _barrier,
    "barriers": _barriers,
    "drive": _drive,
    "symbol": _symbol,
}


def _mean_forests(paper: Paper, definitions: Sequence[NamedSum]) -> str:
    if not any(d.kind == "mean forest" for d in definitions):
        return ""
    return filled(paper, r""" For an observable $q$,
$@forest@_{q,e} = \sum_k q_k @forest@_{k,e}$.""")


# -- definitions ---------------------------------------------------------------------------------


def definitions_text(paper: Paper, definitions: Sequence[NamedSum]) -> str:
    """Return the definitions of named sums; a sum too long to print is described."""
    equations: list[Equation] = []
    described: list[NamedSum] = []
    known = paper.defined - {named.key for named in definitions}
    texts = []
    for named in definitions:
        equation = _definition(paper, named, known)
        if equation is None:
            described.append(named)
            continue
        equations.append(equation)
        known.add(named.key)
    if any(named.kind == "forest" and equation.meanings and _names_forests(equation.meanings[0])
           for named, equation in zip(_printed(definitions, described), equations, strict=True)):
        texts.append(filled(paper, relations.WORDS))
    if described:
        texts.append(filled(paper, _description(described)))
    if equations:
        texts.append(paper.align(equations))
    return "\n".join(texts)


def _printed(definitions: Sequence[NamedSum], described: Sequence[NamedSum]) -> list[NamedSum]:
    return [named for named in definitions if named not in described]


def _names_forests(form: Expression) -> bool:
    return any(name.startswith("#forest[") for name in symbols_of(form))


def _definition(paper: Paper, named: NamedSum, known: Set[str]) -> Equation | None:
    """Return the equation that defines a sum, None where it is too long."""
    limit = line_limit(named.latex, paper.width)
    first = first_form(paper, named)
    related = relations.relation(paper, named, known)
    if named.terms > MAX_SUM_TERMS and first is None and related is None:
        return None
    pieces: list[Piece] = []
    meanings: list[Expression] = []
    if named.terms <= MAX_SUM_TERMS:
        meanings.append(named.form.expression())
        pieces = list(
            paper.fitted(named.form, limit)[0] if named.kind == "remainder"
            else paper.pieces(paper.terms(named.form), limit)
        )
    if related is not None:
        shorter = paper.pieces(related, limit)
        if not pieces or _length(shorter) < _length(pieces):
            pieces, meanings = shorter, [add(related)]
    if first is not None:
        opening = paper.pieces(first, limit)
        meanings.insert(0, add(first))
        if pieces and _width([*opening, *pieces]) + RELATION_WIDTH <= limit - NUMBER_ROOM:
            pieces = [*opening, *continued(pieces)]
        else:
            pieces, meanings = opening, meanings[:1]
    if first is None and not paper.take(min(named.terms, len(pieces))):
        return None
    return Equation(named.latex, tuple(pieces), quantities=(Symbol(named.key),),
                    meanings=tuple(meanings))


def _length(pieces: Sequence[Piece]) -> int:
    return sum(len(piece.body) for piece in pieces)


def _width(pieces: Sequence[Piece]) -> float:
    return sum(formula_width(piece.body) + SIGN_WIDTH for piece in pieces)


def _description(sums: Sequence[NamedSum]) -> str:
    """Return what long sums are, how many terms they have, and how to get them."""
    forests = [s for s in sums if s.kind in ("forest", "mean forest")]
    others = [s for s in sums if s not in forests]
    texts = []
    if forests:
        texts.append(
            "Not printed, but given by the definition above as minors of $@generator@$, "
            + ("is " if len(forests) == 1 else "are ")
            + ", ".join(f"${s.latex}$ ({s.terms:,} terms)" for s in forests) + "."
        )
    texts += [
        f"We write ${s.latex}$ for a sum of {s.terms:,} terms that is not printed." for s in others
    ]
    return "\n".join(texts)


def first_form(paper: Paper, named: NamedSum) -> list[Expression] | None:
    """Return the terms w+ N_m and w- N_n of the numerator of a current or traffic."""
    if named.kind not in ("current", "traffic"):
        return None
    (e,) = named.place
    transition = paper.network.transitions[e]
    first = paper.sums.tree(transition.first)
    rate = paper.sums.analysis.rate_expression
    terms = [multiply([rate(e), Symbol(first.key)])]
    if transition.backward is not None:
        back = multiply([rate(e, True), Symbol(paper.sums.tree(transition.second).key)])
        terms.append(negate(back) if named.kind == "current" else back)
    return [add([term]) for term in terms]
