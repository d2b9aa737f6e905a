r"""Auxiliary quantities of a file: what can be a name, and definitions put in terms of the network.

Definitions may stand in any order. Of a name that is defined by different formulas none counts.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from symbolic_response.errors import SizeLimitError, SymbolicResponseError
from symbolic_response.expressions.names import default_latex
from symbolic_response.expressions.tree import Expression, children
from symbolic_response.hand.latex.items import items_of, key_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.reading import read_formula_tokens
from symbolic_response.hand.latex.tokens import Token, joined, tokenize
from symbolic_response.network.quantities import Change, Response

MAX_DEFINITIONS = 300
MAX_ROUNDS = 10
MAX_NODES = 20_000
MAX_DEPTH = 200
_FONTS = frozenset("\\" + word for word in (
    "mathrm", "mathbf", "mathcal", "mathit", "mathsf", "mathbb", "mathfrak", "mathscr", "bm",
    "boldsymbol", "text", "textrm", "mbox", "tilde", "widetilde", "hat", "widehat", "bar",
    "overline", "underline", "check", "breve", "operatorname", "vec",
))
_VARIANTS = frozenset("\\" + word for word in (
    "varepsilon", "varphi", "vartheta", "varrho", "varsigma", "varpi", "varkappa", "ell", "hbar",
))
_DIFFERENCES = frozenset((r"\Delta", r"\delta"))
_MARKS = frozenset(("*", "+", "-", "'", r"\ast", r"\star", r"\dagger", r"\prime", r"\circ", r"\pm"))
_SPACING = frozenset((r"\,", r"\;", r"\:", r"\!", r"\ ", "~"))


def is_name(tokens: Sequence[Token]) -> bool:
    r"""Return whether tokens have the form of a name: a letter or a word in a font or under an
    accent, with a subscript, primes and a superscript that is no exponent.

    >>> from symbolic_response.hand.latex.tokens import tokenize
    >>> [is_name(tokenize(text)) for text in (r"\tilde{Z}_{\mathrm{on}}'", r"\Delta\mu", "Z^2")]
    [True, True, False]
    """
    texts = [token.text for token in tokens if token.text not in _SPACING]
    place = _base(texts, 0)
    if texts[:1] and texts[0] in _DIFFERENCES and _base(texts, 1) > 1:
        place = _base(texts, 1)
    if place == 0:
        return False
    while place < len(texts):
        if texts[place] == "'":
            place += 1
            continue
        if texts[place] not in ("_", "^") or place + 1 == len(texts):
            return False
        after = _argument(texts, place + 1)
        if texts[place] == "^" and not _is_mark(texts[place + 1 : after]):
            return False
        place = after
    return True


def _base(texts: Sequence[str], place: int) -> int:
    """Return the place behind the letter that begins at ``place``, or ``place`` if none does."""
    if place >= len(texts):
        return place
    text = texts[place]
    if text in _FONTS and place + 1 < len(texts):
        return _argument(texts, place + 1)
    greek = text[:1] == "\\" and default_latex(text[1:]) == text
    return place + 1 if greek or text in _VARIANTS or (len(text) == 1 and text.isalpha()) else place


def _argument(texts: Sequence[str], place: int) -> int:
    """Return the place behind an argument: a group, a token, or a font with its argument."""
    if texts[place] in _FONTS and place + 1 < len(texts):
        return _argument(texts, place + 1)
    depth = 0
    for end in range(place, len(texts)):
        depth += {"{": 1, "}": -1}.get(texts[end], 0)
        if depth <= 0:
            return end + 1
    return len(texts)


def _is_mark(texts: Sequence[str]) -> bool:
    """Whether a superscript is a mark such as ``*``, ``(0)`` or upright words: no exponent."""
    inside = texts[1:-1] if texts[0] == "{" else texts
    if inside[:1] == [r"\left"] and inside[-2:-1] == [r"\right"]:
        inside = [*inside[1:-2], inside[-1]]
    if not inside:
        return False
    return (all(text in _MARKS for text in inside) or inside[0] in _FONTS
            or (inside[0] == "(" and inside[-1] == ")" and len(inside) > 2))


@dataclass(slots=True)
class Auxiliary:
    """A definition: its name, and the formulas given for it, of which the first that can be read
    counts. What came of it: ``expression`` with the formula ``used``, or a ``refusal``."""

    name: tuple[Token, ...]
    formulas: tuple[tuple[Token, ...], ...]
    source: str
    line: int
    expression: Expression | None = None
    used: tuple[Token, ...] = ()
    refusal: Exception | str | None = None

    def key(self) -> str:
        """Return the name as names are compared."""
        return key_of(items_of(self.name, self.source))

    def attempt(self, names: Names) -> None:
        """Try to read the formula."""
        if isinstance(self.refusal, SizeLimitError):
            return  # further names make it no smaller
        first: Exception | None = None
        for tokens in self.formulas:
            try:
                found = read_formula_tokens(tokens, names, self.source)
                check_size(found)
            except SymbolicResponseError as error:
                first = first or error
            else:
                self.expression, self.used, self.refusal = found, tokens, None
                return
        self.refusal = first or "nothing stands right of the = sign"


def resolve(auxiliaries: Sequence[Auxiliary], names: Names) -> Names:
    """Read definitions in an order in which each uses only those before; return the names with
    those that count. What came of each is set in it."""
    for late in auxiliaries[MAX_DEFINITIONS:]:
        late.refusal = f"more than {MAX_DEFINITIONS} definitions stand before it"
    groups: dict[str, list[Auxiliary]] = {}
    for auxiliary in auxiliaries[:MAX_DEFINITIONS]:
        groups.setdefault(auxiliary.key(), []).append(auxiliary)
    waiting = list(groups.values())
    partly = False
    for _ in range(MAX_ROUNDS):
        left = []
        for group in waiting:
            for auxiliary in group:
                if auxiliary.expression is None:
                    auxiliary.attempt(names)
            read = [auxiliary for auxiliary in group if auxiliary.expression is not None]
            if read and (partly or len(read) == len(group)):
                names = _settled(read, names)
            else:
                left.append(group)
        if not left or (partly and len(left) == len(waiting)):
            break
        partly = len(left) == len(waiting)  # only then may another formula be beyond reading
        waiting = left
    return names


def _settled(group: Sequence[Auxiliary], names: Names) -> Names:
    """Add a name to the names, or refuse it if its formulas are not the same."""
    expression = group[0].expression
    assert expression is not None
    latex = joined(group[0].name)
    if all(auxiliary.expression == expression for auxiliary in group):
        try:
            return names.with_definitions({latex: expression})
        except SymbolicResponseError as error:
            return _refuse(group, names, error)
    lines = [str(auxiliary.line) for auxiliary in group]
    number = "two" if len(lines) == 2 else str(len(lines))
    reason = (f"has {number} different definitions (lines {', '.join(lines[:-1])} and {lines[-1]});"
              " give each a name of its own")
    return _refuse(group, names.with_refused(latex, reason), f"{latex} {reason}")


def _refuse(group: Sequence[Auxiliary], names: Names, refusal: Exception | str) -> Names:
    for auxiliary in group:
        auxiliary.expression, auxiliary.refusal = None, refusal
    return names


def used_names(
    tokens: Sequence[Token], names: Names, source: str, known: Mapping[str, str]
) -> Iterator[str]:
    """Yield the keys of the names in a formula; ``known``: the key of each defined name by its
    text, which is looked for where the formula is not well formed."""
    try:
        waiting = [items_of(tokens, source)]
    except SymbolicResponseError:
        written = joined(tokens)
        yield from (key for name, key in known.items() if name in written)
        return
    while waiting:
        items = waiting.pop()
        place = 0
        while place < len(items):
            item = items[place]
            waiting += [inside for inside in (item.above, *item.arguments) if inside]
            if item.head == r"\partial" and item.below:
                waiting.append(item.below)
            found = names.match(items, place)
            if found is not None:
                yield key_of(items_of(tokenize(found.shown), found.shown))
            place += 1 if found is None else found.count


def check_size(expression: Expression) -> None:
    """Raise SizeLimitError for an expression of more than 20,000 nodes or 200 levels, each part
    counted as often as it occurs."""
    sizes: dict[int, tuple[int, int]] = {}
    stack = [expression]
    while stack:
        node = stack[-1]
        parts = _parts(node)
        unknown = [part for part in parts if id(part) not in sizes]
        if unknown:
            stack += unknown
            continue
        stack.pop()
        known = [sizes[id(part)] for part in parts]
        sizes[id(node)] = (1 + sum(size for size, _ in known),
                           1 + max((depth for _, depth in known), default=0))
    nodes, depth = sizes[id(expression)]
    if nodes > MAX_NODES or depth > MAX_DEPTH:
        raise SizeLimitError(f"with its definitions put in, the formula has more than {MAX_NODES} "
                             f"parts or is nested more than {MAX_DEPTH} deep")


def _parts(node: Expression) -> tuple[Expression, ...]:
    if isinstance(node, Response):
        return (node.quantity,)
    if isinstance(node, Change):
        return (node.quantity, node.amount)
    return children(node)
