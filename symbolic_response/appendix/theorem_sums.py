"""What follows from sums over trees and over paths, each part where it is used."""

from __future__ import annotations

from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper


def observables(paper: Paper) -> str:
    """Return how bounds on the responses of probabilities carry over to observables."""
    return filled(paper, r"""\subsection{From probabilities to observables}
Let $@response@_k = \partial \ln @probability@_k / \partial @parameter@$. For functions $q$ and $q'$
of the state that do not depend on $@parameter@$, have no negative value and are not zero,
\begin{equation}
\frac{\partial}{\partial @parameter@} \ln \frac{\langle q \rangle}{\langle q' \rangle}
 = \frac{\langle q \, @response@ \rangle}{\langle q \rangle}
 - \frac{\langle q' @response@ \rangle}{\langle q' \rangle}
\label{eq:observable}
\end{equation}
is a difference of two weighted means of the $@response@_k$. Its size is at most
$\max_k @response@_k - \min_k @response@_k$, the largest response of a
$\ln (@probability@_i / @probability@_j)$, which is what is limited below. The mean of a function
$q$ with values from $0$ to $1$ follows with $q' = 1 - q$,
\begin{equation}
\frac{\partial \langle q \rangle}{\partial @parameter@}
 = \langle q \rangle \bigl(1 - \langle q \rangle\bigr)
 \frac{\partial}{\partial @parameter@} \ln \frac{\langle q \rangle}{1 - \langle q \rangle} ,
\label{eq:mean}
\end{equation}
that of other functions by rescaling, and $\ln \langle q \rangle$ by division.""")


def currents(paper: Paper) -> str:
    """Return the exact responses of the current of a transition to its barrier and drive."""
    return filled(paper, r"""\subsection{The current of a transition}
Put into $@current numerator@_e = @rate@^+_e @tree sum@_m - @rate@^-_e @tree sum@_n$,
Eq.~\eqref{eq:split} gives
\begin{equation}
@current numerator@_e = @rate@^+_e @free@_m - @rate@^-_e @free@_n .
\label{eq:current}
\end{equation}
Raising the barrier takes both $@rate@^\pm_e$ down alike, and of
$@normalisation@ = \sum_k @tree sum@_k$ all but $\sum_k @free@_k$, so that
$\partial \ln |@current@_e| / \partial @barrier@_e = - \sum_k @free@_k / @normalisation@$. The
response to the drive is
\begin{equation}
\frac{\partial @current@_e}{\partial @drive@_e}
 = \frac{@traffic@_e}{2} \frac{\sum_k @free@_k}{@normalisation@} ,
\label{eq:drive}
\end{equation}
as seen by differentiating $@current numerator@_e / @normalisation@$ with the sum of
Eq.~\eqref{eq:free} over $k$ and
$@traffic@_e @normalisation@ = @rate@^+_e @free@_m + @rate@^-_e @free@_n
+ 2 @rate@^+_e @rate@^-_e @pair@$. Both shares $\sum_k @free@_k / @normalisation@$ are at most
one.""")


def sums_over_trees(paper: Paper) -> str:
    """Return the bound by the range of sums over the rates of a tree, for energies the identity."""
    return filled(paper, r"""\subsection{Sums over trees}
Let the logarithm of each directed rate $@one@$ change by a number,
$@change@_{@one@} = \partial \ln @one@ / \partial @parameter@$. Then
$\partial \ln @tree sum@_k / \partial @parameter@$ is the weighted mean, over the trees directed
towards $k$, of the sum of $@change@_{@one@}$ over the rates of the tree. If these sums lie between
$@change@_{\min}$ and $@change@_{\max}$ for the trees towards all states, then
\begin{equation}
\Bigl| \frac{\partial}{\partial @parameter@} \ln \frac{@probability@_i}{@probability@_j} \Bigr|
 \le @change@_{\max} - @change@_{\min} .
\label{eq:trees}
\end{equation}""")


def energies(paper: Paper) -> str:
    """Return the identity for a change of an energy."""
    return filled(paper, r"""For the energy $@energy@_j$ the sum counts the transitions out of $j$:
one in every tree not directed towards $j$, none in the others. Hence
$\partial \ln @tree sum@_k / \partial @energy@_j = 1 - \delta_{jk}$ exactly, and
\begin{equation}
\frac{\partial \langle q \rangle}{\partial @energy@_j}
 = @probability@_j \bigl(\langle q \rangle - q_j\bigr) .
\label{eq:energy}
\end{equation}""")


def drives(paper: Paper) -> str:
    """Return the sums over trees for a drive."""
    return filled(paper, r"""For a drive the sums are $1/2$, $-1/2$ or zero, since a tree uses a
transition once at most.""")


def bundles(paper: Paper) -> str:
    """Return the bound for a set of transitions whose rates change alike."""
    return filled(paper, r"""\subsection{Transitions changed together}
Let $@scale@$ multiply all rates of a set $\mathcal{B}$ of transitions of which every spanning tree
uses $@one@$ or $@one@ + 1$. Then $@tree sum@_k = @scale@^{@one@} (@free@_k + @scale@ @back@_k)$
with sums $@free@_k$ and $@back@_k$ over the trees that use $@one@$ and $@one@ + 1$ of them, and
\begin{equation}
\frac{\partial}{\partial \ln @scale@} \ln \frac{@probability@_i}{@probability@_j}
 = \frac{@scale@ @back@_i}{@free@_i + @scale@ @back@_i}
 - \frac{@scale@ @back@_j}{@free@_j + @scale@ @back@_j} .
\label{eq:bundle}
\end{equation}
The odds of the two terms have the ratio $@back@_i @free@_j / (@free@_i @back@_j)$. If
$@back@_i @free@_j \le @largest@ \, @free@_i @back@_j$ for all $i$ and $j$, the difference is at
most $\tanh (\ln(@largest@)/4)$: for odds $e^{@one@}$ and $e^{@two@}$ it is
$\sinh ((@one@ - @two@)/2) / [\cosh ((@one@ - @two@)/2) + \cosh ((@one@ + @two@)/2)]$. A matching of
the terms of $@back@_i @free@_j$ with those of $@free@_i @back@_j$ shows this for $\ln @largest@$
the largest $|@force@_c|$ of the cycles with transitions inside and outside of $\mathcal{B}$: the
two terms of each pair are equal or differ by the reversal of one such cycle. The matchings for this
network, one for each pair of states, stand in the record.""")


def parameters(paper: Paper, barriers: bool) -> str:
    """Return the bound for a parameter resolved into energies, single rates and maybe barriers."""
    return filled(paper, r"""\subsection{Parameters}
A parameter whose action on the logarithms of the rates is a sum of changes $@one@_k$ of the
energies, $@two@_e$ of barriers and $@scale@_e$ of single rates has the sum of the responses to
each. Every tree directed towards $k$ holds one transition out of each other state, so that the
energies change $\ln (@probability@_i / @probability@_j)$ by $@one@_j - @one@_i$; a barrier obeys
Eq.~\eqref{eq:tanh}, and a single rate, which a tree uses once at most, Eq.~\eqref{eq:trees}.
Altogether the response is at most
\begin{equation}
\max_k @one@_k - \min_k @one@_k + \sum_e |@two@_e| \tanh \frac{@force@_{\max}(e)}{4} + \sum_e
|@scale@_e| .
\label{eq:parameter}
\end{equation}""" if barriers else r"""\subsection{Parameters}
A parameter whose action on the logarithms of the rates is a sum of changes $@one@_k$ of the
energies and $@scale@_e$ of single rates has the sum of the responses to each. Every tree directed
towards $k$ holds one transition out of each other state, so that the energies change
$\ln (@probability@_i / @probability@_j)$ by $@one@_j - @one@_i$; a single rate is used once at most
by a tree, so that Eq.~\eqref{eq:trees} limits its part. Altogether the response is at most
\begin{equation}
\max_k @one@_k - \min_k @one@_k + \sum_e |@scale@_e| .
\label{eq:parameter}
\end{equation}""")


def paths(paper: Paper) -> str:
    """Return the bound on the ratio of two probabilities by the paths between them."""
    return filled(paper, r"""\subsection{Paths between two states}
For a simple path $P$ from $i$ to $j$ let $@rate@_P^+$ and $@rate@_P^-$ be the products of the rates
along it and against it, and $@into@_P$ the sum of the weights of the spanning forests in which
every state outside of $P$ is directed into $P$. Every tree directed towards $j$ holds one path from
$i$, and its other transitions are such a forest; with the path reversed the tree is directed
towards $i$. Hence
\begin{equation}
@tree sum@_j = \sum_P @rate@_P^+ @into@_P , \qquad @tree sum@_i = \sum_P @rate@_P^- @into@_P ,
\label{eq:paths}
\end{equation}
and $@probability@_j / @probability@_i$, their mediant, is at most
$\max_P @rate@_P^+ / @rate@_P^-$.""")
