r"""Why a formula is refused, and what to write instead: the words of the lexer's errors."""

from __future__ import annotations

from dataclasses import dataclass, replace

from symbolic_response.hand.latex.items import CLOSING, FONTS, OPENING, Item, Items, key_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.pieces import numeric
from symbolic_response.hand.latex.table import Match
from symbolic_response.hand.latex.tokens import formula_error

FRACTION_POWER = (r"a power of a \frac is not visible as such; write \left(\frac{a}{b}\right)^{2}"
                  " with parentheses")
BARS = (r"bare | may open or close, and here more than one reading is possible; write \left| and"
        r" \right| around each absolute value")
PRODUCT_BODY = (r"where the body of \prod ends is not visible; put it in parentheses, as in"
                r" \prod_{k=1}^{3} (a_k b), and other factors before \prod")
BRACKETED = ("a superscript in parentheses is an index or an order, no power; write x^{2} for the"
             " power")
_LONG = 40
_WORDS = ("exp", "ln", "log", "tanh", "sinh", "cosh", "coth", "sqrt", "frac")
_COMMANDS = {
    r"\pm": r"\pm stands for two formulas; write each of them",
    r"\mp": r"\mp stands for two formulas; write each of them",
    "=": "an equals sign does not belong in one formula; write the right side alone",
    "*": r"* is no product in LaTeX; write \cdot",
    r"\ast": r"\ast is no product; write \cdot",
    r"\div": r"\div is not read; write \frac{a}{b}",
    r"\over": r"\over is not read; write \frac{a}{b}",
    **{f"\\{old}": rf"\{old} is not read; write \{new}{{...}}" for old, new in (
        ("cal", "mathcal"), ("rm", "mathrm"), ("bf", "mathbf"), ("it", "mathit"),
        ("sf", "mathsf"), ("tt", "mathtt"))},
    "!": "factorials are not read; write the number",
    r"\int": "integrals are not read; write the result",
    r"\lim": "limits are not read; write the result",
    r"\infty": "infinity is no number; write the limit as a formula",
    "e": r"e without a power is no number here; write \exp(1)",
    "$": "a $ inside a formula; write the formula without math delimiters",
    r"\&": "an & in a formula; leave it out",
    "#": "# belongs in a macro; write the argument",
    "^": "a ^ with nothing before it; write the symbol that carries it",
    "\u2212": "this is no minus sign of LaTeX; write -",
    "\u2013": "this is no minus sign of LaTeX; write -",
    "\u00b7": r"this is no product sign of LaTeX; write \cdot",
    "\u00d7": r"this is no product sign of LaTeX; write \times",
}
_DOTS = (r"\cdots", r"\ldots", r"\dots", r"\dotsb", r"\dotsc", r"\vdots", r"\dotsm", r"\dotsi")
_READ = frozenset(f"\\{word}" for word in (*_WORDS, "partial", "sum", "prod", "left", "lvert"))
_OTHER_FUNCTIONS = tuple(
    rf"\{name}" for name in ("sin", "cos", "tan", "arcsin", "arccos", "arctan", "max", "min", "det",
                             "sec", "csc", "cot", "lg", "sup", "inf", "arg", "gcd", "sgn")
)


@dataclass(frozen=True, slots=True)
class Unit:
    """One operand as it was read: from item to item, and what it is.

    ``kind``: ``name``, ``number``, ``closed`` (its end is visible), ``call`` (a function with its
    argument in brackets) or ``bare`` (a function whose argument ends nowhere visibly).
    """

    kind: str
    first: int
    after: int


def excerpt(items: Items) -> str:
    """Return items as LaTeX with spaces between them, cut where they are long."""
    text = ""
    for place, item in enumerate(items):
        tight = place and (items[place - 1].head in OPENING or item.head in CLOSING)
        digits = place and item.head.isdigit() and items[place - 1].head.isdigit()
        text += ("" if not place or tight or digits else " ") + key_of((item,))
    return text if len(text) <= _LONG else text[: _LONG - 4] + " ..."


def two_operators(items: Items, place: int) -> str:
    sign, before = items[place].head, items[place - 1].head
    return (f"{sign!r} stands right behind {before!r}; put a signed term in parentheses, as in"
            f" {before} ({sign}x)")


def no_operand(item: Item, items: Items, place: int) -> str:
    before = f" between {items[place - 1].head!r} and" if place else " before"
    return f"a value is missing{before} {item.head!r}; write it or leave the operator out"


def is_unread(items: Items, place: int, names: Names) -> bool:
    """Return whether a command stands at a place that nothing in a formula can be."""
    head = items[place].head
    known = head in _READ or head in FONTS or names.match(items, place) is not None
    return head[0] == "\\" and head[1:].isalpha() and not known


def after_bare(items: Items, left: Unit, place: int) -> str:
    """Say what to write where something follows the argument of a function without brackets."""
    item = items[place]
    head, argument = excerpt(items[left.first : left.first + 1]), _argument(items, left)
    if head.startswith((r"\partial", r"\frac")):
        return (f"where the derivative {head} {argument} ends is not visible before {item.head!r};"
                f" write \\left({head} {argument}\\right)")
    more = _joined(items, place)
    return (f"where the argument of {head} ends is not visible before {item.head!r}; write"
            f" {head}({argument})" + (f" or {head}({argument} {more})" if more else ""))


def _argument(items: Items, left: Unit) -> str:
    return excerpt(items[left.first + 1 : left.after])


def _joined(items: Items, place: int) -> str:
    """Return what may belong to an argument too, or nothing where that cannot be shown."""
    item = items[place]
    if item.head in ("/", r"\cdot", r"\times"):
        return f"{item.head} ..."
    if item.head == "|":
        return ""
    shown = excerpt(items[place : _closing(items, place) + 1])
    return "" if shown.endswith("...") else shown


def divided_twice(items: Items, slash: Unit) -> str:
    below = excerpt(items[slash.first : slash.after])
    return (f"a second / behind /{below} can be read in two ways; write \\frac{{a}}{{b c}} for"
            " a/(b c)")


def after_slash(items: Items, slash: Unit) -> str:
    end = slash.first - 1
    above = excerpt(items[_term_start(items, end) : end])
    below = excerpt(items[slash.first : slash.after])
    fraction = f"\\frac{{{above}}}{{{_inside(items, slash)}}}"
    cut = above.endswith("...") or below.endswith("...")
    return (f"what stands behind /{below} may be divided by or not; "
            + ("" if cut else f"write {fraction} before it, or ")
            + "put all that is divided by in parentheses")


def _inside(items: Items, unit: Unit) -> str:
    """Return a denominator, without the brackets around all of it."""
    first, last = items[unit.first], items[unit.after - 1]
    plain = last.above is None and last.below is None and _closing(items, unit.first) + 1
    around = first.head in OPENING and plain == unit.after
    return excerpt(items[unit.first + around : unit.after - around])


def _term_start(items: Items, end: int) -> int:
    """Return where the term begins that ends at a place."""
    depth = 0
    for at in range(end - 1, -1, -1):
        item = items[at]
        depth += (item.head in CLOSING) - (item.head in OPENING)
        sign = item.head in ("+", "-") and item.above is None and item.below is None
        if depth < 0 or (depth == 0 and sign):
            return at + 1
    return 0


def comma(items: Items, left: Unit, place: int) -> str:
    if left.kind == "number":
        digits = excerpt(items[left.first : left.after])
        return (f"a comma behind the number {digits}: write thousands without one, decimals with a"
                " point")
    return f"{items[place].head!r} does not belong here; leave it out, or write an operator"


def number_behind(items: Items, left: Unit, place: int, names: Names) -> str:
    last = place
    while last < len(items) and items[last].head.isdigit():
        last += 1
    digits = excerpt(items[place:last])
    before = excerpt(items[left.first : left.after])
    nucleus = items[left.after - 1]
    if left.kind == "name" and nucleus.below is None:
        scripted = replace(nucleus, below=items[place:last])
        found = names.match((*items[left.first : left.after - 1], scripted))
        if found is not None:
            return (f"{before}{digits}: write {found.shown} for the symbol, {before} \\cdot"
                    f" {digits} for the product")
    return (f"the number {digits} stands behind {before} without an operator; write {digits}"
            f" {before} or {before} \\cdot {digits}")


def call(items: Items, left: Unit, place: int) -> str:
    before = excerpt(items[left.first : left.after])
    inside = excerpt(items[place : _closing(items, place) + 1])
    return (f"{before}{inside} reads like a function of what is in the brackets; write {before}"
            f" \\cdot {inside}")


def _closing(items: Items, place: int) -> int:
    depth = 0
    for at in range(place, len(items)):
        depth += (items[at].head in OPENING) - (items[at].head in CLOSING)
        if depth == 0:
            return at
    return len(items) - 1


def after_call(items: Items, left: Unit) -> str:
    shown = excerpt(items[left.first : left.after])
    return (f"brackets right behind {shown} may belong to its argument; write {shown} \\cdot (...)"
            " for the product")


def mixed_number(items: Items, left: Unit, place: int) -> str:
    digits, fraction = excerpt(items[left.first : left.after]), excerpt((items[place],))
    return (f"{digits}{fraction} may be a sum or a product; write {digits} \\cdot {fraction} or"
            f" {digits} + {fraction}")


def spaced_number(items: Items, first: int, place: int) -> str:
    digits = excerpt(items[first:place])
    return (f"{digits} and {items[place].head} side by side may be one number or a product; write"
            f" the number without a space, or {digits} \\cdot {items[place].head}")


def scripted_number(items: Items, first: int, place: int) -> str:
    return (f"{excerpt(items[first : place + 1])}: a number carries no subscript or prime; write it"
            " on a symbol")


def two_readings(items: Items, place: int, match: Match) -> str:
    if match.others:
        return (f"{excerpt(items[place : place + match.count])} can be read as"
                f" {' or as '.join(match.others)}; put a \\cdot or parentheses between, or give the"
                " symbol another LaTeX name")
    return (f"{match.shown} has {len(match.meanings)} meanings in this network; give one of them"
            " another LaTeX name")


def unknown_power(items: Items, place: int, match: Match, names: Names) -> str:
    whole = items[place : place + match.count]
    above = key_of(match.power or ())
    hint = names.nearest(whole)
    if match.power and names.match(match.power) is not None:
        hint = f"; for a power write e^{{{above} \\ln {match.shown}}}"
    return f"unknown symbol {key_of(whole)}, and {above!r} is no exact exponent{hint}"


def bracketed_power(items: Items, place: int, match: Match, names: Names) -> str:
    whole, inside = items[place : place + match.count], (match.power or ())[1:-1]
    hint = names.nearest(whole)
    if numeric(inside):
        hint = f"; write {match.shown}^{{{key_of(inside)}}} for the power"
    return (f"unknown symbol {key_of(whole)}: a superscript in parentheses is an index or an order"
            f"{hint}")


def exponent(item: Item) -> str:
    above = key_of(item.above or ())
    if any(part.head in _DOTS for part in item.above or ()):
        return "dots leave out a part of the formula; write it all"
    return (f"the exponent {above!r} is no exact number; write e^{{{above} \\ln x}} for"
            f" x^{{{above}}}")


def check_opening(item: Item, source: str) -> None:
    """Raise FormulaError for a bracket that opens with the size of one that closes."""
    if item.side in ("r", "right"):
        raise formula_error(source, item.start,
                            f"{item.head!r} opens, but its size is that of a closing bracket; write"
                            rf" \left{item.head}")


def check_pair(opening: Item, closing: Item, source: str) -> None:
    """Raise FormulaError where the sizes of a pair do not fit: ``\\left`` needs ``\\right``."""
    wrong = closing.side in ("l", "left") or (
        (opening.side == "left") != (closing.side == "right")
    )
    if wrong:
        raise formula_error(source, closing.start,
                            f"the sizes of {opening.head!r} and {closing.head!r} do not fit; write"
                            rf" \left{opening.head} ... \right{closing.head}")


def differentiated(inside: Items) -> str:
    shown = excerpt(inside)
    return (f"how much of {shown} is differentiated is not visible; write"
            rf" \frac{{\partial}}{{\partial Y}}({shown})")


def no_argument(item: Item) -> str:
    head = excerpt((item,))
    return f"{head} has no argument that could be read; write {head}(...)"


def scripted_function(item: Item, function: str) -> str:
    head = excerpt((replace(item, above=None, below=None),))
    if item.below is not None:
        return (f"{head} with a subscript is not read; write logarithms as \\frac{{\\ln x}}"
                "{\\ln b}")
    above = key_of(item.above or ())
    if above == "-1":
        return (f"{head}^{{-1}} may be the inverse function or one over the function; write"
                rf" \frac{{1}}{{{head}(x)}}")
    return f"a power on the name {head} is not read; write ({head}(x))^{{{above or 2}}}"


def call_power(items: Items, first: int, after: int) -> str:
    call_ = excerpt((*items[first : after - 1], replace(items[after - 1], above=None)))
    above = key_of(items[after - 1].above or ())
    return (f"{call_} with a power may raise the function or its argument; write"
            f" ({call_})^{{{above}}} for the function")


def bare_power(items: Items, first: int, unit: Unit) -> str:
    head, inside = excerpt(items[first : first + 1]), excerpt(items[unit.first : unit.after])
    return (f"{head} {inside} may raise the function or its argument; write {head}({inside}) for"
            " the argument")


def nested_functions(item: Item, follower: Item) -> str:
    head, inner = excerpt((item,)), excerpt((follower,))
    return f"{head} {inner} needs brackets; write {head}({inner}(x))"


def check_spelled(items: Items, place: int, match: Match, source: str) -> None:
    r"""Raise FormulaError where symbols side by side spell a function: ``ln`` for ``\ln``."""
    word = spelled(items, place)
    if word and match.count < len(word):
        raise formula_error(source, items[place].start,
                            f"{word} spells a function; write \\{word} for it, and spaces between"
                            " the symbols of a product")


def spelled(items: Items, place: int) -> str:
    """Return the function that letters without spaces between them spell, or nothing."""
    for word in _WORDS:
        if items[place].head != word[0]:
            continue
        run = items[place : place + len(word)]
        joined = all(
            part.head == letter and not (n and part.space)
            and (n == len(word) - 1 or (part.below is None and part.above is None))
            for n, (part, letter) in enumerate(zip(run, word, strict=False))
        )
        if joined and len(run) == len(word):
            return word
    return ""


def _in_braces(inside: Items, command: str) -> str:
    r"""Say what to write for ``{a \over b}`` and ``{\cal D}``."""
    heads = [item.head for item in inside]
    place = heads.index(command)
    before, behind = excerpt(inside[:place]), excerpt(inside[place + 1 :])
    said = _COMMANDS[command]
    if not behind or before.endswith("...") or behind.endswith("..."):
        return said
    if command == r"\over" and before and heads.count(command) == 1:
        return said.replace(r"\frac{a}{b}", rf"\frac{{{before}}}{{{behind}}}")
    return said if before else said.replace("...", behind)


def unknown(items: Items, place: int, names: Names) -> str:
    """Say what is wrong with an item that begins no operand."""
    item = items[place]
    head, shown = item.head, excerpt((item,))
    if head in _COMMANDS:
        return _COMMANDS[head]
    if head in _DOTS:
        return "dots leave out a part of the formula; write it all"
    if head in _OTHER_FUNCTIONS or head == r"\binom":
        return f"{head} is not read; the functions are exp, ln, sqrt, tanh, sinh, cosh and coth"
    word = spelled(items, place)
    if word:
        return f"{word} spells a function; write \\{word}"
    if head == "{}":
        inside = excerpt(item.arguments[0])
        for part in item.arguments[0]:
            if part.head in _COMMANDS and part.head[0] == "\\":
                return _in_braces(item.arguments[0], part.head)
        return f"braces around {inside} are not visible; write ({inside}) or leave them out"
    if head in (",", ";", ":", ".", "?", '"', "`"):
        return f"{head!r} does not belong here; leave it out, or write an operator"
    if not head.isprintable():
        return f"the character {head!r} does not belong in a formula; leave it out"
    digits = place + 1
    while digits < len(items) and items[digits].head.isdigit():
        digits += 1
    if digits > place + 1 and item.below is None:
        found = names.match((replace(item, below=items[place + 1 : digits]),))
        if found is not None:
            return f"unknown symbol {shown}; write {found.shown} for the symbol with an index"
    kind = "unknown command" if head[0] == "\\" and item.below is None and (
        item.above is None and not item.arguments) else "unknown symbol"
    return f"{kind} {shown}{names.nearest((item,)) or '; name it in the network file'}"
