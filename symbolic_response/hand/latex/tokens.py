r"""Raw TeX tokens with their places in a text: the layer below formulas and documents.

``tokenize`` never refuses anything: what may stand in a formula is decided by its readers.
White space and comments give no tokens; a token knows whether white space stood before it.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from symbolic_response.errors import FormulaError, SizeLimitError

MAX_CHARACTERS = 2_000_000
_EXCERPT = 72
_TOKEN = re.compile(
    r"(?P<skip>(?:\s+|%[^\n]*(?:\n[ \t]*|$))+)|\\[A-Za-z]+\*?|\\.|.", re.DOTALL
)
_STARRED = frozenset((r"\newcommand*", r"\renewcommand*", r"\providecommand*", r"\operatorname*"))


@dataclass(frozen=True, slots=True)
class Token:
    r"""A control word (``\frac``), a control symbol (``\,``) or one character.

    ``start`` and ``end`` are the offsets in the source of the characters the token stands for: a
    token that comes out of a macro has those of the macro call. ``space``: white space or a
    comment stood before it.
    """

    text: str
    start: int
    end: int
    space: bool = False

    @property
    def is_word(self) -> bool:
        """Whether this is a backslash with letters."""
        return len(self.text) > 1 and self.text[1].isalpha()


def tokenize(text: str) -> list[Token]:
    r"""Return the raw tokens of a text; SizeLimitError beyond 2,000,000 characters.

    The star of ``\newcommand*`` and its like belongs to the control word, any other is a token.

    >>> [token.text for token in tokenize(r"\frac1{k_\mathrm{on}} % note")]
    ['\\frac', '1', '{', 'k', '_', '\\mathrm', '{', 'o', 'n', '}', '}']
    """
    if len(text) > MAX_CHARACTERS:
        raise SizeLimitError(
            f"the text is {len(text)} characters long; at most {MAX_CHARACTERS} are read"
        )
    tokens: list[Token] = []
    space = False
    position = 0
    while position < len(text):
        found = _TOKEN.match(text, position)
        assert found is not None  # any character matches
        shown, position = found.group(), found.end()
        if found.lastgroup == "skip":
            space = True
            continue
        if shown[-1] == "*" and len(shown) > 1 and shown not in _STARRED:
            shown, position = shown[:-1], position - 1
        tokens.append(Token(shown, found.start(), position, space))
        space = False
    return tokens


def line_and_column(source: str, offset: int) -> tuple[int, int]:
    r"""Return line and column, both from 1, of an offset from 0.

    >>> line_and_column("a\nbc", 3)
    (2, 2)
    """
    before = source[: max(0, min(offset, len(source)))]
    return before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1


def formula_error(source: str, offset: int, message: str) -> FormulaError:
    """Return the error for a place in a text: line, column, its line as excerpt, a pointer.

    Of a long line the part around the place is shown; control characters are shown as spaces.
    """
    line, column = line_and_column(source, offset)
    here = min(max(0, offset), len(source))
    first = source.rfind("\n", 0, here) + 1
    last = source.find("\n", here)
    last = len(source) if last < 0 else last
    start = first if last - first <= _EXCERPT else max(first, here - _EXCERPT // 2)
    shown = source[start : min(last, start + _EXCERPT)]
    excerpt = "".join(c if c.isprintable() else " " for c in shown)
    return FormulaError(message, line, column, excerpt, here - start)


def source_of(tokens: Sequence[Token], source: str) -> str:
    """Return the part of the source that a run of tokens stands for, on one line."""
    if not tokens:
        return ""
    start, end = min(t.start for t in tokens), max(t.end for t in tokens)
    return " ".join(source[start:end].split())


def joined(tokens: Iterable[Token]) -> str:
    r"""Return tokens as TeX text, with a space where a control word would swallow a letter.

    >>> joined(tokenize(r"\pi A_ 1"))
    '\\pi A_1'
    """
    parts: list[str] = []
    word = False
    for token in tokens:
        if word and token.text[:1].isalpha():
            parts.append(" ")
        parts.append(token.text)
        word = token.is_word
    return "".join(parts)


def group_end(tokens: Sequence[Token], start: int, source: str) -> int:
    """Return the place just after the ``}`` that closes the ``{`` at ``start``.

    Raises FormulaError where it is never closed.
    """
    depth = 0
    for place in range(start, len(tokens)):
        text = tokens[place].text
        if text == "{":
            depth += 1
        elif text == "}":
            depth -= 1
            if depth == 0:
                return place + 1
    raise formula_error(source, tokens[start].start, "'{' is never closed; write the missing }")
