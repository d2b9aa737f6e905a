"""What follows from the two ends of a transition: theorem and proof, each part where it is used."""

from __future__ import annotations

from symbolic_response.appendix.formulas import filled
from symbolic_response.appendix.paper import Paper


def theorem(paper: Paper, one_way: bool) -> str:
    """Return the identities of the two ends; ``one_way``: among the transitions are such."""
    return filled(paper, _SPLIT + (_ONE_WAY if one_way else "") + _THEOREM)


_SPLIT = r"""\subsection{The two ends of a transition}
Let $e$ be a transition from $m$ to $n$. The trees directed towards a state $k$ either do not use
$e$, or use it forward or backward, never both:
\begin{equation}
@tree sum@_k = @free@_k + @rate@^+_e @ahead@_k + @rate@^-_e @back@_k ,
\label{eq:split}
\end{equation}
where $@free@_k$, $@ahead@_k$ and $@back@_k$ contain neither $@rate@^+_e$ nor $@rate@^-_e$. Let
$@pair@$ be the sum of the weights of all spanning forests of two trees, one directed towards $m$
and one towards $n$."""

_ONE_WAY = r""" For a one-way transition $@rate@^-_e$ is kept as a variable and set to zero at the
end."""

_THEOREM = r"""
\begin{theorem}\label{th:ends}
$@ahead@_m = @back@_n = 0$ and $@ahead@_n = @back@_m = @pair@ > 0$, and for every state $k$
\begin{align}
@pair@ \, @free@_k &= @free@_m @back@_k + @free@_n @ahead@_k , \label{eq:free}\\*
@pair@ \, @tree sum@_k &= @ahead@_k @tree sum@_n + @back@_k @tree sum@_m . \label{eq:ends}
\end{align}
\end{theorem}
\begin{proof}
A tree directed towards $m$ holds no transition out of $m$, so that $@ahead@_m = 0$; likewise
$@back@_n = 0$. A tree directed towards $n$ that uses $e$ consists of $e$ and of a forest of two
trees directed towards $m$ and $n$, so that $@ahead@_n = @pair@$; likewise $@back@_m = @pair@$. From
every state some path leads to $n$; up to the first of $m$ and $n$ on it, it does not use $e$.
Hence such forests exist, and $@pair@ > 0$.

Let $@generator@'$ be the generator without the rates of $e$, and $\delta^k$ the vector that is one
at $k$ and zero elsewhere. By the tree theorem $@generator@ @tree sum@ = 0$ identically in
$@rate@^\pm_e$. The parts of this that are free of both rates, and proportional to $@rate@^+_e$ or
$@rate@^-_e$ alone, are
\begin{align*}
@generator@' @free@ &= 0 , \\*
@generator@' @ahead@ &= @free@_m (\delta^m - \delta^n) , \\*
@generator@' @back@ &= @free@_n (\delta^n - \delta^m) ,
\end{align*}
so that $@generator@' (@free@_m @back@ + @free@_n @ahead@) = 0$. If $@free@ = 0$,
Eq.~\eqref{eq:free} is trivial. Else some state is within reach of all others without $e$, and the
kernel of $@generator@'$ is spanned by $@free@$: $@free@_m @back@ + @free@_n @ahead@ = @one@ @free@$
with a number $@one@$. As every state reaches $m$ or $n$ without $e$, $@free@_m$ and $@free@_n$ do
not both vanish; where one does not, the component at that state reads
$@free@_m @pair@ = @one@ @free@_m$ or $@free@_n @pair@ = @one@ @free@_n$. Hence $@one@ = @pair@$,
which is Eq.~\eqref{eq:free}. Adding $@pair@ (@rate@^+_e @ahead@_k + @rate@^-_e @back@_k)$ to both
sides, with $@tree sum@_m = @free@_m + @rate@^-_e @pair@$ and
$@tree sum@_n = @free@_n + @rate@^+_e @pair@$, gives Eq.~\eqref{eq:ends}.
\end{proof}"""


def mixtures(paper: Paper) -> str:
    """Return how all probabilities follow from those of the two ends."""
    return filled(paper, r"""Let $@end ratio@ = @tree sum@_n / @tree sum@_m$. Dividing
Eq.~\eqref{eq:ends} by $@pair@ @tree sum@_m$ gives
\begin{equation}
\frac{@probability@_k}{@probability@_m}
 = \frac{@back@_k + @end ratio@ @ahead@_k}{@pair@} , \quad
@end ratio@ = \frac{@free@_n + @rate@^+_e @pair@}{@free@_m + @rate@^-_e @pair@} ,
\label{eq:ratio}
\end{equation}
and the rates of $e$ enter in $@end ratio@$ alone. With
$@mixture@_k = @ahead@_k @tree sum@_n / (@pair@ @tree sum@_k)$, any change of the rates of $e$ alone
gives
\begin{equation}
@response@_k = (@mixture@_k - \langle @mixture@ \rangle)
 \frac{\partial \ln @end ratio@}{\partial @parameter@} , \qquad 0 \le @mixture@_k \le 1 ,
\label{eq:mixture}
\end{equation}
where $@mixture@_m = 0$ and $@mixture@_n = 1$: no $\ln (@probability@_i / @probability@_j)$ responds
more than that of the two ends.""")


def shares(paper: Paper) -> str:
    """Return the response of the two ends by the shares of trees that use the transition."""
    return filled(paper, r"""Let $@share ahead@ = @rate@^+_e @pair@ / @tree sum@_n$ and
$@share back@ = @rate@^-_e @pair@ / @tree sum@_m$ be the shares of the trees directed towards $n$
and towards $m$ that use $e$. Then
\begin{equation}
\frac{\partial \ln @end ratio@}{\partial @parameter@}
 = @change@^+ @share ahead@ - @change@^- @share back@ , \qquad
@change@^\pm = \frac{\partial \ln @rate@^\pm_e}{\partial @parameter@} ,
\label{eq:shares}
\end{equation}
and the odds of the two shares have the ratio
\begin{equation}
\frac{@share ahead@ (1 - @share back@)}{(1 - @share ahead@) @share back@} = @cross ratio@_e ,
\qquad
@cross ratio@_e = \frac{@rate@^+_e @free@_m}{@rate@^-_e @free@_n} .
\label{eq:odds}
\end{equation}""")


def barrier(paper: Paper) -> str:
    """Return the bound on the response to a barrier."""
    return filled(paper, r"""For the barrier, $@change@^\pm = -1$. Let $@one@$ and $@two@$ be the
logarithms of the odds of $@share ahead@$ and $@share back@$, so that
$@one@ - @two@ = \ln @cross ratio@_e$. Then
\begin{align}
|@share ahead@ - @share back@|
 &= \frac{\sinh \frac{|@one@ - @two@|}{2}}
 {\cosh \frac{@one@ - @two@}{2} + \cosh \frac{@one@ + @two@}{2}}
\notag\\*  &\le \tanh \frac{|\ln @cross ratio@_e|}{4} ,
\label{eq:tanh}
\end{align}
with equality at $@share ahead@ = 1 - @share back@$; for a one-way transition $@share back@ = 0$ and
the limit is one.""")


def local(paper: Paper) -> str:
    """Return the bound on the response to any other change of the rates of one transition."""
    return filled(paper, r"""For a parameter that changes the rates of $e$ alone, let
$@one@ \ge @two@ \ge 0$ be $|@change@^+|$ and $|@change@^-|$ in order of size. For opposite signs
Eq.~\eqref{eq:shares} is at most $@one@ + @two@$ in size. For equal signs let
$@largest@ = \max(@cross ratio@_e, 1/@cross ratio@_e)$; by Eq.~\eqref{eq:odds} the larger share is
$@largest@ @share back@ / (1 + (@largest@ - 1) @share back@)$ if $@share back@$ is the smaller one,
and the largest value of
\begin{equation*}
\frac{@one@ @largest@ @share back@}{1 + (@largest@ - 1) @share back@} - @two@ @share back@ ,
\qquad 0 \le @share back@ \le 1 ,
\end{equation*}
is, where $@two@ @largest@ \ge @one@$ and $@largest@ > 1$, taken at
$1 + (@largest@ - 1) @share back@ = \sqrt{@one@ @largest@ / @two@}$,
\begin{equation}
\frac{(\sqrt{@one@ @largest@} - \sqrt{@two@})^2}{@largest@ - 1} ,
\label{eq:local}
\end{equation}
and else, at $@share back@ = 1$, $@one@ - @two@$; with $@one@$ and $@two@$ exchanged, or with the
larger share in the other term, it is no larger. It grows with $@largest@$, towards $@one@$.""")


def finite(paper: Paper) -> str:
    """Return the bound on the change with a barrier raised by a finite amount."""
    return filled(paper, r"""As the barrier is raised, $(@one@ + @two@)/2$ falls by as much, since
$e^{@one@} = @rate@^+_e @pair@ / @free@_n$ and $e^{@two@} = @rate@^-_e @pair@ / @free@_m$. The first
line of Eq.~\eqref{eq:tanh}, integrated over an interval of $(@one@ + @two@)/2$ of length $\ell$, is
largest for the one centred at zero, so that raising the barrier by an amount of size $\ell$ changes
$\ln @end ratio@$, and with it every $\ln (\langle q \rangle / \langle q' \rangle)$, by at most
\begin{equation}
2 \ln \frac{\cosh \bigl((|\ln @cross ratio@_e| + \ell)/4\bigr)}
{\cosh \bigl((|\ln @cross ratio@_e| - \ell)/4\bigr)} ,
\label{eq:finite}
\end{equation}
which grows towards $\ell$ with $|\ln @cross ratio@_e|$.""")


def second(paper: Paper) -> str:
    """Return the bound on the second derivative by a barrier."""
    return filled(paper, r"""Let $@scale@$ multiply both rates of $e$. By Eq.~\eqref{eq:split},
$\langle q \rangle / \langle q' \rangle = (@one@ + @scale@ @two@) / (@one@' + @scale@ @two@')$ with
numbers that do not depend on $@scale@$ and are not negative. With
$@odds share@ = @scale@ @two@ / (@one@ + @scale@ @two@)$, and $@odds share@'$ likewise,
\begin{equation}
\frac{\partial^2}{(\partial \ln @scale@)^2} \ln \frac{\langle q \rangle}{\langle q' \rangle}
 = @odds share@ (1 - @odds share@) - @odds share@' (1 - @odds share@') ,
\label{eq:second}
\end{equation}
a difference of two numbers from $0$ to $1/4$.""")


def cycles(paper: Paper) -> str:
    """Return the two sums of the cross ratio as sums over cycles."""
    return filled(paper, r"""\subsection{Cycles through a transition}
For a cycle $c$ let $@into@_c$ be the sum of the weights of the spanning forests in which every
state outside of $c$ is directed into $c$, and for $c$ through $e$ let $@rate@_c^+$ and $@rate@_c^-$
be the products of the rates along $c$ and against it, run so that $e$ is used forward. Then
\begin{equation}
@rate@^+_e @free@_m = \sum_{c \ni e} @rate@_c^+ @into@_c , \quad
@rate@^-_e @free@_n = \sum_{c \ni e} @rate@_c^- @into@_c .
\label{eq:cycles}
\end{equation}
Indeed, a tree directed towards $m$ that does not use $e$ holds one path from $n$ to $m$, which $e$
closes to a cycle; its other transitions are a forest directed into that cycle, and every such
forest occurs. With the path reversed the tree is directed towards $n$. Hence $@cross ratio@_e$ is a
mediant of the ratios $@rate@_c^+ / @rate@_c^- = e^{\pm @force@_c}$,
\begin{equation}
|\ln @cross ratio@_e| \le \max_{c \ni e} |@force@_c| = @force@_{\max}(e) ,
\label{eq:mediant}
\end{equation}
and every bound that grows with $|\ln @cross ratio@_e|$ holds with $@force@_{\max}(e)$ in its place.
Without a cycle through $e$, $@free@_m = @free@_n = 0$, $@end ratio@ = @rate@^+_e / @rate@^-_e$, and
nothing responds to the barrier.""")


def splittings(paper: Paper) -> str:
    """Return a local response as a combination of splittings."""
    return filled(paper, r"""\subsection{Splittings of a transition}
The component of $@generator@' @ahead@ = @free@_m (\delta^m - \delta^n)$ at a state $k$ other than
$m$ and $n$, divided by $@tree sum@_k$, says that $@mixture@$ is harmonic there for the reversed
network, whose rate from $k$ to $l$ is $@generator@_{kl} @tree sum@_l / @tree sum@_k$. As
$@mixture@_m = 0$ and $@mixture@_n = 1$, $1 - @mixture@_k$ is the probability to meet $m$ before $n$
from $k$ in that network. Let $@cut@_S$ be the sum of the weights, in the reversed rates, of the
pairs of a spanning tree of $S$ directed towards $m$ and one of the other states directed towards
$n$; it is zero unless $S$ is a splitting of $e$. By the all-minors theorem~\cite{chaiken}
\begin{equation}
1 - @mixture@_k = \sum_{S \ni k} @cut@_S \Big/ \sum_S @cut@_S ,
\label{eq:harmonic}
\end{equation}
so that with Eq.~\eqref{eq:mixture}, for every change of the rates of $e$ alone,
\begin{equation}
\frac{\partial \langle q \rangle}{\partial @parameter@}
 = \sum_S @coefficient@_S \, \mathrm{Cov}(q, 1_S) , \quad
@coefficient@_S = - \frac{@cut@_S}{\sum_{S'} @cut@_{S'}}
 \frac{\partial \ln @end ratio@}{\partial @parameter@} .
\label{eq:covariance}
\end{equation}
All $@coefficient@_S$ have one sign, and their sizes add up to
$|\partial \ln @end ratio@ / \partial @parameter@|$, which is limited as before; the largest
covariance in front of it gives the bounds by splittings.""")
