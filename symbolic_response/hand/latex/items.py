r"""Items of a formula: raw tokens with their arguments and scripts in canonical form.

Spacing, alignment marks, labels and known environments are dropped, arguments of one token get
their braces, ``\tfrac`` and ``\dfrac`` are ``\frac``, scripts come in the order subscript, primes,
superscript. Two texts that TeX prints alike have the same items.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from symbolic_response.errors import FormulaError
from symbolic_response.hand.latex.tokens import Token, formula_error

MAX_NESTING = 60


def commands(words: str) -> frozenset[str]:
    """Return words, separated by spaces, as control words."""
    return frozenset("\\" + word for word in words.split())


OPENING = {"(": ")", "[": "]", r"\{": r"\}"}
CLOSING = frozenset(OPENING.values())
PLAIN_FONTS = commands(
    "mathrm mathit mathnormal text textrm textit textup textnormal mbox operatorname mathsf"
    " textsf mathtt texttt"
)
"""Fonts that do not make another letter; calligraphic and bold ones do."""
FONTS = PLAIN_FONTS | commands("mathbf boldsymbol textbf mathcal mathbb mathfrak mathscr bm")
_ACCENTS = commands(
    "hat bar tilde vec dot ddot acute grave breve check mathring widehat widetilde overline"
    " underline overrightarrow overleftarrow"
)
_FRACTIONS = commands("frac tfrac dfrac")
_SPACES = frozenset((*(f"\\{c}" for c in ",;:!> \n"), "~", "&")) | commands(
    "quad qquad enspace enskip thinspace medspace thickspace negthinspace displaystyle textstyle"
    " scriptstyle nonumber notag limits nolimits mathstrut allowbreak relax strut"
)
_WITH_ARGUMENT = commands("label tag hspace phantom hphantom vphantom")
_ENVIRONMENTS = frozenset(
    f"{name}{star}" for star in ("", "*") for name in (
        "aligned", "alignedat", "split", "gathered", "equation", "align", "multline", "gather",
        "displaymath", "math", "subequations",
    )
)
_SIZES = {
    "\\" + size + end: end or "m"
    for size in ("big", "Big", "bigg", "Bigg") for end in ("l", "r", "")
} | {r"\left": "left", r"\right": "right"}
_DELIMITERS = {
    r"\lbrace": r"\{", r"\rbrace": r"\}", r"\lbrack": "[", r"\rbrack": "]", r"\vert": "|",
    r"\lvert": "|", r"\rvert": "|",
}
_WITHOUT_SCRIPTS = frozenset((*OPENING, "+", "-", "/", "=", ",", ";", r"\cdot", r"\times"))
_SIDES = {r"\lvert": "l", r"\rvert": "r"}


@dataclass(frozen=True, slots=True)
class Item:
    r"""One nucleus with its arguments and scripts; the head of a braced group is ``{}``.

    ``side``: the size before a bracket opens (``l``, ``left``) or closes (``r``, ``right``) it,
    or says neither (``m``). ``end``: where the nucleus ends in the source.
    """

    head: str
    start: int
    end: int
    space: bool = False
    arguments: tuple[tuple[Item, ...], ...] = ()
    option: tuple[Item, ...] | None = None
    below: tuple[Item, ...] | None = None
    primes: int = 0
    above: tuple[Item, ...] | None = None
    side: str = ""


Items = tuple[Item, ...]


def items_of(tokens: Sequence[Token], source: str) -> Items:
    """Return the items of tokens whose macros are expanded.

    Raises FormulaError for braces that do not match, a missing argument, two subscripts,
    ``x_12`` and its like, and more than 60 braces within each other.
    """
    return _Builder(tokens, source).items(None)


def key_of(items: Iterable[Item]) -> str:
    r"""Return items as canonical LaTeX, by which they are compared.

    >>> from symbolic_response.hand.latex.tokens import tokenize
    >>> print(key_of(items_of(tokenize(r"k^+_\mathrm{on}"), "")))
    k_{\mathrm{on}}^{+}
    """
    parts: list[str] = []
    word = False
    for item in items:
        if word and item.head[:1].isalpha():
            parts.append(" ")
        parts.append(_item_key(item))
        word = parts[-1] == item.head and len(item.head) > 1 and item.head[-1].isalpha()
    return "".join(parts)


def _item_key(item: Item) -> str:
    text = "" if item.head == "{}" else item.head
    if item.option is not None:
        text += f"[{key_of(item.option)}]"
    text += "".join(f"{{{key_of(argument)}}}" for argument in item.arguments)
    if item.below is not None:
        text += f"_{{{key_of(item.below)}}}"
    text += "'" * item.primes
    return text if item.above is None else text + f"^{{{key_of(item.above)}}}"


def without_fonts(items: Iterable[Item]) -> Items:
    r"""Return items with fonts dissolved: ``\mathrm{on}`` is ``on``."""
    found: list[Item] = []
    for item in items:
        if not item.arguments and item.below is None and item.above is None:
            found.append(item)
            continue
        below = None if item.below is None else without_fonts(item.below)
        above = None if item.above is None else without_fonts(item.above)
        if item.head in PLAIN_FONTS:
            inside = list(without_fonts(item.arguments[0]))
            scripted = below is not None or above is not None or item.primes
            if inside and scripted:
                last = inside[-1]
                if last.below is None and last.above is None and not last.primes:
                    inside[-1] = replace(last, below=below, above=above, primes=item.primes)
                    found.extend(inside)
                    continue
            elif inside:
                found.extend(inside)
                continue
        found.append(replace(item, arguments=tuple(map(without_fonts, item.arguments)),
                             below=below, above=above))
    return tuple(found)


def end_of(item: Item) -> int:
    """Return where an item ends in the source, its scripts included."""
    ends = [item.end]
    for script in (item.below, item.above):
        ends += [end_of(part) for part in script or ()]
    return max(ends)


@dataclass(slots=True)
class _Builder:
    tokens: Sequence[Token]
    source: str
    place: int = 0
    depth: int = 0

    def error(self, token: Token, message: str) -> FormulaError:
        return formula_error(self.source, token.start, message)

    def items(self, opening: Token | None) -> Items:
        """Read items up to the closing brace of a group, or all of them."""
        found: list[Item] = []
        spaced = False
        while self.place < len(self.tokens):
            token = self.tokens[self.place]
            if token.text == "}":
                if opening is None:
                    raise self.error(token, "'}' without a '{' before it; leave it out")
                self.place += 1
                return tuple(found)
            if token.text in ("^", "_", "'"):
                self.script(found, token)
            elif token.text == "{" and found and not spaced and self.carries_on(found[-1], token):
                self.place += 2
            elif self.dropped(token, found):
                spaced = True
            else:
                nucleus = self.nucleus(token)
                if nucleus and spaced:
                    nucleus[0] = replace(nucleus[0], space=True)
                found += nucleus
                spaced = spaced and not nucleus
        if opening is not None:
            raise self.error(opening, "'{' is never closed; write the missing }")
        return tuple(found)

    def carries_on(self, before: Item, token: Token) -> bool:
        """Return whether ``{}`` right behind a symbol only stands between it and its script."""
        ahead = [part.text for part in self.tokens[self.place + 1 : self.place + 3]]
        scripted = len(ahead) == 2 and ahead[0] == "}" and ahead[1] in ("^", "_", "'")
        return scripted and not token.space and before.head not in _WITHOUT_SCRIPTS

    def dropped(self, token: Token, found: list[Item]) -> bool:
        """Pass over what sets no symbol; False where a symbol follows."""
        if token.text in _SPACES:
            self.place += 1
        elif token.text in _WITH_ARGUMENT:
            self.place += 1
            self.argument(token)
        elif token.text in (r"\begin", r"\end"):
            self.place += 1
            name = "".join(item.head for item in self.argument(token))
            if name not in _ENVIRONMENTS:
                raise self.error(token, f"the environment {name!r} is not read in a formula; write"
                                        " the formula itself")
        elif token.text == r"\\":
            self.place += 1
            if self.text() == "[":
                while self.place < len(self.tokens) and self.text() != "]":
                    self.place += 1
                self.place += 1
            self.line_break(token, found)
        else:
            return False
        return True

    def line_break(self, token: Token, found: list[Item]) -> None:
        r"""Accept ``\\`` only where a sum or product visibly goes on, or at the end."""
        signs = ("+", "-", r"\cdot", r"\times")
        ahead = self.place
        while ahead < len(self.tokens) and (
            self.tokens[ahead].text in _SPACES or self.tokens[ahead].text in "{}"
        ):
            ahead += 1
        after = self.tokens[ahead].text if ahead < len(self.tokens) else ""
        ends = not after or after == r"\end"
        if not ends and after not in signs and not (found and found[-1].head in signs):
            raise self.error(token, r"a new line begins without an operator; begin it with +, - or"
                                    r" \cdot")

    def text(self) -> str:
        return self.tokens[self.place].text if self.place < len(self.tokens) else ""

    def nucleus(self, token: Token) -> list[Item]:
        if token.text == "{":
            return self.group(token)
        self.place += 1
        if token.text in _SIZES:
            return [self.delimiter(token)]
        head = r"\frac" if token.text in _FRACTIONS else _DELIMITERS.get(token.text, token.text)
        option: Items | None = None
        arguments: tuple[Items, ...] = ()
        if token.text == r"\sqrt" and self.text() == "[":
            option = self.option(token)
        if head == r"\frac":
            arguments = (self.argument(token), self.argument(token))
        elif head == r"\sqrt" or head in FONTS or head in _ACCENTS:
            arguments = (self.argument(token),)
        return [Item(head, token.start, self.last_end(), token.space, arguments, option,
                     side=_SIDES.get(token.text, ""))]

    def last_end(self) -> int:
        return self.tokens[self.place - 1].end

    def delimiter(self, size: Token) -> Item:
        if self.place >= len(self.tokens):
            raise self.error(size, f"a bracket is missing after {size.text}; write {size.text}(")
        token = self.tokens[self.place]
        self.place += 1
        head = _DELIMITERS.get(token.text, token.text)
        if head not in (*OPENING, *CLOSING, "|", r"\langle", r"\rangle", "/"):
            raise self.error(size, f"{size.text}{token.text} is no bracket; write ( and )")
        return Item(head, size.start, token.end, size.space, side=_SIZES[size.text])

    def option(self, call: Token) -> Items:
        self.place += 1
        begin = self.place
        while self.place < len(self.tokens) and self.text() != "]":
            self.place += 1
        if self.place >= len(self.tokens):
            raise self.error(call, "'[' is never closed; write the missing ]")
        self.place += 1
        return _Builder(self.tokens[begin : self.place - 1], self.source).items(None)

    def group(self, token: Token) -> list[Item]:
        """Read a braced group: dissolved where it holds nothing, one item, or one bracket."""
        inside = self.braced()
        if not inside and self.text() not in ("^", "_", "'"):
            return []
        if len(inside) == 1 or _one_bracket(inside):
            return [replace(inside[0], space=token.space), *inside[1:]]
        return [Item("{}", token.start, self.last_end(), token.space, (inside,))]

    def braced(self) -> Items:
        token = self.tokens[self.place]
        self.depth += 1
        if self.depth > MAX_NESTING:
            raise self.error(token, f"braces nested more than {MAX_NESTING} deep; name a part of"
                                    " the formula")
        self.place += 1
        inside = self.items(token)
        self.depth -= 1
        return inside

    def argument(self, call: Token) -> Items:
        while self.text() in _SPACES and self.text():
            self.place += 1
        if self.place >= len(self.tokens) or self.text() in ("}", "^", "_", "'"):
            raise self.error(call, f"an argument of {call.text} is missing; write it in braces")
        if self.text() == "{":
            return self.braced()
        token = self.tokens[self.place]
        if token.text in _FRACTIONS or token.text in FONTS or token.text == r"\sqrt":
            if call.text not in ("^", "_"):
                raise self.error(call, f"the argument {token.text} of {call.text} needs braces")
            self.depth += 1
            if self.depth > MAX_NESTING:
                raise self.error(token, f"scripts nested more than {MAX_NESTING} deep")
            found = tuple(self.nucleus(token))
            self.depth -= 1
            return found
        self.place += 1
        return (Item(token.text, token.start, token.end, token.space),)

    def script(self, found: list[Item], token: Token) -> None:
        if not found:
            raise self.error(token, f"{token.text!r} stands behind nothing; write the symbol that"
                                    " carries it")
        item = found[-1]
        if item.head in _WITHOUT_SCRIPTS:
            raise self.error(token, f"{token.text!r} right behind {item.head!r}; write the symbol"
                                    " that carries it")
        self.place += 1
        if token.text == "'":
            found[-1] = replace(item, primes=item.primes + 1)
            return
        primes = self.primes_in_braces() if token.text == "^" else 0
        if primes:
            found[-1] = replace(item, primes=item.primes + primes)
            return
        braced = self.text() == "{"
        inside = self.argument(token)
        if not braced:
            self.check_single(token, inside)
        primes = sum(part.head == r"\prime" for part in inside)
        if token.text == "^" and inside and primes == len(inside):
            found[-1] = replace(item, primes=item.primes + primes)
        elif token.text == "^":
            if item.above is not None:
                raise self.error(token, "two superscripts on one symbol; write (x^{a})^{b}")
            found[-1] = replace(item, above=inside)
        else:
            if item.below is not None:
                raise self.error(token, "two subscripts on one symbol; write one, as in k_{1,2}")
            found[-1] = replace(item, below=inside)

    def primes_in_braces(self) -> int:
        """Pass over ``{'}`` or ``{''}`` and return how many primes these are; 0 for all else."""
        end = self.place + 1
        while end < len(self.tokens) and self.tokens[end].text == "'":
            end += 1
        count = end - self.place - 1
        if self.text() != "{" or not count or end == len(self.tokens) or (
            self.tokens[end].text != "}"
        ):
            return 0
        self.place = end + 1
        return count

    def check_single(self, script: Token, inside: Items) -> None:
        """Refuse ``x_12``, ``2^10`` and ``k_on``, which TeX sets as x_1 2, 2^1 0 and k_o n."""
        token = self.tokens[self.place - 1]
        after = self.tokens[self.place] if self.place < len(self.tokens) else None
        if after is None or len(inside) != 1 or inside[0].head != token.text:
            return
        digits = token.text.isdigit() and after.text.isdigit()
        letters = token.text.isalpha() and after.text.isalpha() and not after.space
        if digits or letters:
            run, place = token.text, self.place
            while place < len(self.tokens) and len(run) < 40 and (
                self.tokens[place].text.isalnum() and not self.tokens[place].space
            ):
                run += self.tokens[place].text
                place += 1
            run = run if len(run) > 1 else token.text + after.text
            raise self.error(
                script, f"{script.text}{run} takes only {token.text!r} into the script; write"
                f" {script.text}{{{run}}}, or {script.text}{{{token.text}}} and a space or \\cdot"
                " behind it",
            )


def bracketed(items: Items) -> bool:
    """Return whether items are one pair of parentheses around something: no power, an index."""
    return bool(items) and items[0].head == "(" and _one_bracket(items)


def _one_bracket(items: Items) -> bool:
    """Return whether items are one pair of brackets with all else inside."""
    depth = 0
    for place, item in enumerate(items):
        depth += (item.head in OPENING) - (item.head in CLOSING)
        if depth <= 0:
            return place > 0 and place == len(items) - 1 and depth == 0
    return False
