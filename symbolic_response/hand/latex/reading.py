r"""Reading a formula in LaTeX: strictly, with the names of one network.

A text has one reading or is refused with its place and what to write; nothing is dropped and
nothing guessed.
"""

from __future__ import annotations

from collections.abc import Sequence

from symbolic_response.errors import FormulaError, SizeLimitError
from symbolic_response.expressions.tree import Expression
from symbolic_response.hand.latex.grammar import Refusal, parse
from symbolic_response.hand.latex.items import items_of
from symbolic_response.hand.latex.lexer import pieces_of
from symbolic_response.hand.latex.macros import expand, take_definitions
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.tokens import Token, formula_error, tokenize

MAX_TOKENS = 100_000
MAX_CHARACTERS = 500_000
_DELIMITERS = {"$": "$", r"\[": r"\]", r"\(": r"\)"}
_PUNCTUATION = (".", ",", ";")


def read_formula(text: str, names: Names) -> Expression:
    r"""Return the expression that a formula in LaTeX is; definitions of macros may stand in it.

    ``$ $``, ``\[ \]`` or ``\( \)`` around all and a full stop or comma at the end count for
    nothing. Raises FormulaError, with line and column, for what cannot be read in exactly one way,
    and SizeLimitError for a formula of more than 500,000 characters or 100,000 tokens.

    >>> from symbolic_response.network import read_network_text
    >>> from symbolic_response.expressions.text import expression_text
    >>> from symbolic_response.hand.latex.names import names_of
    >>> network = read_network_text('''
    ... title = "pair"
    ... [symbols.k_on]
    ... [symbols.c]
    ... [states.A]
    ... [states.B]
    ... [[transitions]]
    ... name = "bind"
    ... between = ["A", "B"]
    ... rates = ["k_on*c", "1"]
    ... ''')
    >>> expression_text(read_formula(r"\frac{k_{on}c}{k_{\mathrm{on}} c + 1}", names_of(network)))
    'k_on*c/(k_on*c + 1)'
    """
    if len(text) > MAX_CHARACTERS:
        raise SizeLimitError(
            f"the formula is {len(text)} characters long; at most {MAX_CHARACTERS} are read"
        )
    rest, macros = take_definitions(tokenize(text), text)
    return read_formula_tokens(expand(rest, macros, text), names, text)


def read_formula_tokens(tokens: Sequence[Token], names: Names, source: str) -> Expression:
    """Return the expression of tokens whose macros are expanded; errors as in read_formula.

    ``source`` is the text the offsets of the tokens count in.
    """
    if len(tokens) > MAX_TOKENS:
        raise SizeLimitError(f"the formula has {len(tokens)} tokens; at most {MAX_TOKENS} are read")
    tokens = _bare(tokens)
    if not tokens:
        raise FormulaError("the formula is empty; write an expression", 1, 1)
    pieces = pieces_of(items_of(tokens, source), names, source)
    try:
        return parse(pieces)
    except Refusal as refusal:
        raise formula_error(source, refusal.start, refusal.message) from None


def _bare(tokens: Sequence[Token]) -> Sequence[Token]:
    """Return a formula without math delimiters around it and punctuation behind it."""
    first, last = 0, len(tokens)
    for _ in range(2):
        if last - first > 1 and tokens[last - 1].text in _PUNCTUATION:
            last -= 1
        if last - first > 1 and _DELIMITERS.get(tokens[first].text) == tokens[last - 1].text:
            first, last = first + 1, last - 1
    return tokens[first:last]
