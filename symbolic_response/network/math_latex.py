r"""The LaTeX that an entry may hold: letters, signs and commands that only set mathematics.

A network file comes from anybody, and its LaTeX goes into a document that is compiled. TeX can
read and write files, so what is not listed here is refused.
"""

from __future__ import annotations

import re

_TOKEN = re.compile(r"\\[A-Za-z]+|\\.?|\^\^|.", re.DOTALL)
_CHARACTERS = frozenset(
    "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789 _^{},'.-+()[]|*/=<>:;")
_WORDS = """
alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi pi rho sigma tau upsilon
phi chi psi omega varepsilon vartheta varpi varrho varsigma varphi varkappa digamma
Gamma Delta Theta Lambda Xi Pi Sigma Upsilon Phi Psi Omega
varGamma varDelta varTheta varLambda varXi varPi varSigma varUpsilon varPhi varPsi varOmega
mathrm mathbf mathit mathsf mathtt mathcal mathbb mathfrak mathnormal boldsymbol
text textrm textbf textit textsf texttt textup textnormal operatorname
bar hat tilde vec dot ddot acute grave breve check mathring widehat widetilde
overline underline overrightarrow overleftarrow overset underset stackrel
prime backprime varnothing emptyset infty star ast dagger ddagger dag ddag circ bullet ell hbar
hslash Re Im imath jmath wp aleph partial nabla sharp flat natural square triangle diamond Box
bigcirc bigstar blacksquare angle top bot
pm mp cdot times div ominus oplus otimes odot oslash wedge vee neg cap cup setminus
to gets rightarrow leftarrow leftrightarrow uparrow downarrow updownarrow mapsto
Rightarrow Leftarrow Leftrightarrow Uparrow Downarrow longrightarrow longleftarrow
nearrow searrow swarrow nwarrow rightleftharpoons leftrightharpoons
rightleftarrows circlearrowleft circlearrowright
le leq ge geq ne neq ll gg approx sim simeq equiv propto in notin subset supset mid parallel perp
langle rangle lbrace rbrace lbrack rbrack lvert rvert lVert rVert vert Vert lfloor rfloor lceil
rceil left right big Big bigl bigr Bigl Bigr
frac tfrac dfrac sqrt binom sum prod int
exp ln log sin cos tan sinh cosh tanh max min sup inf lim det dim ker deg arg
dots ldots cdots vdots colon quad mathstrut
displaystyle textstyle scriptstyle scriptscriptstyle
"""
_COMMANDS = {rf"\{name}" for name in (*_WORDS.split(), *",;:!> {}|_%&#$")}


def refused(latex: str) -> str | None:
    r"""Return the first command or character that an entry may not hold, None if there is none.

    >>> [refused(text) for text in (r"\hat{k}_{+1}", r"k\input{x}", "k^^5c", "k$", "k\\")]
    [None, '\\input', '^^', '$', '\\']
    """
    for token in _TOKEN.findall(latex):
        if token not in _CHARACTERS and token not in _COMMANDS:
            return str(token)
    return None
