"""Letters of the proofs and of the section on control parameters.

None of them is a symbol of the file or a letter of the notation.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from symbolic_response.expressions.names import base_latex, same_latex
from symbolic_response.response.notation import Notation

PROOF_LETTERS = {
    "free": ("a", r"\alpha", r"\mathbf{a}"),
    "ahead": ("f", r"\eta", r"\mathbf{f}"),
    "back": ("b", r"\beta", r"\mathbf{b}"),
    "pair": (r"\varphi", r"\chi", r"\phi"),
    "cross ratio": ("r", r"\varrho", r"\mathbf{r}"),
    "mixture": ("h", r"\mu", r"\mathbf{h}"),
    "share ahead": ("s", r"\xi", r"\mathbf{s}"),
    "share back": ("t", r"\zeta", r"\mathbf{t}"),
    "into": (r"\Sigma", r"\Gamma", r"\Lambda"),
    "cut": ("V", "L", r"\mathbf{V}"),
    "coefficient": (r"\lambda", r"\kappa", r"\mathbf{l}"),
    "end ratio": (r"\rho", r"\upsilon", r"\mathbf{q}"),
    "response": ("u", r"\nu", r"\mathbf{u}"),
    "parameter": (r"\theta", r"\vartheta", r"\mathbf{p}"),
    "change": ("v", r"\iota", r"\mathbf{v}"),
    "scale": ("z", r"\zeta", r"\mathbf{z}"),
    "odds share": ("g", r"\gamma", r"\mathbf{g}"),
    "one": ("x", r"\mathcal{X}", r"\mathbf{x}"),
    "two": ("y", r"\mathcal{Y}", r"\mathbf{y}"),
    "largest": ("G", "K", r"\mathbf{G}"),
}
"""For each role in a proof the letters it may take, the first that is free being taken."""

CONTROL_LETTERS = {
    "steepness": ("H", r"\mathcal{H}", r"\mathbf{H}"),
    "tanh": ("t", r"\zeta", r"\mathbf{t}"),
    "amount": (r"\alpha", r"\kappa", r"\mathbf{a}"),
    "polynomial": ("P", r"\mathcal{P}", r"\mathbf{P}"),
}
"""The same for control parameters; t of the proofs is explained where it occurs, and local."""

ELIMINATION_LETTERS = {
    "exit": ("S", r"\mathcal{S}", r"\mathbf{S}"),
    "effective": (r"\tilde{w}", r"\tilde{W}", r"\mathbf{w}"),
    "shared": ("K", r"\mathcal{K}", r"\mathbf{K}"),
}
"""The same for tree sums by elimination."""


ENERGIES = ("energy", "barrier", "drive")
"""Roles that are written times the inverse temperature where the notation asks for it."""


def proof_letters(notation: Notation) -> dict[str, str]:
    """Return a letter for each role in the proofs."""
    return _chosen(PROOF_LETTERS, notation)


def _chosen(roles: Mapping[str, Sequence[str]], notation: Notation) -> dict[str, str]:
    """Return a letter for each role; where all of one are taken it is written as its name."""
    taken = {same_latex(base_latex(text.removeprefix(notation.beta).strip()))
             for text in notation.symbols.values()}
    taken |= {same_latex(letter) for letter in (*notation.letters.values(), notation.beta)}
    chosen: dict[str, str] = {}
    for role, letters in roles.items():
        free = [letter for letter in letters if same_latex(letter) not in taken]
        chosen[role] = free[0] if free else rf"\mathrm{{{role.split()[0]}}}"
        taken.add(same_latex(chosen[role]))
    return chosen


def letters_of(notation: Notation) -> Mapping[str, str]:
    """Return the letters of the notation, of the proofs and of control parameters by role."""
    letters = (dict(notation.letters) | proof_letters(notation)
               | _chosen(CONTROL_LETTERS, notation) | _chosen(ELIMINATION_LETTERS, notation))
    if notation.beta:
        letters |= {role: f"{notation.beta} {letters[role]}" for role in ENERGIES}
    return letters
