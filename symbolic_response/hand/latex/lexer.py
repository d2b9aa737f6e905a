r"""From items to the pieces the grammar reads; what can be read in two ways is refused here.

Names are matched, sums over an index written out, and every place where a printed formula could
mean something else (``\tanh F/4``, ``a/bc``, ``k(c)``) is an error that says what to write.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from fractions import Fraction
from functools import partial

from symbolic_response.errors import FormulaError, SizeLimitError
from symbolic_response.expressions.tree import Expression
from symbolic_response.hand.latex import refusals
from symbolic_response.hand.latex.derivatives import (
    Derivative,
    as_derivative,
    differentiated,
    subscripted,
)
from symbolic_response.hand.latex.items import (
    CLOSING,
    MAX_NESTING,
    OPENING,
    Item,
    Items,
    bracketed,
    key_of,
)
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.neighbours import (
    check_before_operator,
    check_side_by_side,
    closes,
    refuse_empty,
)
from symbolic_response.hand.latex.pieces import (
    DOTS,
    SIGNS,
    Piece,
    end_of_term,
    function_of,
    is_e,
    numeric,
    scripted,
)
from symbolic_response.hand.latex.refusals import Unit
from symbolic_response.hand.latex.summation import indexed, read_range
from symbolic_response.hand.latex.table import Match
from symbolic_response.hand.latex.tokens import formula_error

MAX_PIECES = 150_000
MAX_DIGITS = 1_000


def pieces_of(items: Items, names: Names, source: str) -> list[Piece]:
    """Return the pieces of a formula; FormulaError for what cannot be read in one way only."""
    lexer = _Lexer(names, source)
    after = lexer.level(items, 0, None, None)
    assert after == len(items)
    return lexer.pieces


@dataclass(slots=True)
class _Lexer:
    names: Names
    source: str
    pieces: list[Piece] = field(default_factory=list)
    depth: int = 0
    bars: int = 0

    # -- errors and output ---------------------------------------------------------------------

    def error(self, item: Item, message: str) -> FormulaError:
        return formula_error(self.source, item.start, message)

    def put(self, kind: str, item: Item, value: object = None) -> None:
        if len(self.pieces) >= MAX_PIECES:
            raise SizeLimitError(f"the formula has more than {MAX_PIECES} parts; sums over an index"
                                 " are written out, name a part of it")
        self.pieces.append(Piece(kind, value, item.start))

    def deeper(self, item: Item) -> None:
        self.depth += 1
        if self.depth > MAX_NESTING:
            raise self.error(item, f"nested more than {MAX_NESTING} deep; name a part of the"
                                   " formula")

    def level(self, items: Items, place: int, opening: Item | None, closer: str | None) -> int:
        """Read a sum up to the bracket that closes it; return the place of that bracket.

        ``closer`` None: up to the end of the items; ``opening`` then only says where they stand.
        """
        left: Unit | None = None  # the operand before, None after an operator
        slash: Unit | None = None  # what is divided by, from the first / of a term
        divided = False
        begin = place
        while place < len(items):
            item = items[place]
            if closes(item, closer, self.source):
                break
            if item.head in SIGNS and not scripted(item):
                if left is None and place > begin:
                    raise self.error(item, refusals.two_operators(items, place))
                self.put(SIGNS[item.head], item)
                left, slash, divided, place = None, None, False, place + 1
                continue
            if item.head in DOTS or item.head == "/":
                if left is None:
                    raise self.error(item, refusals.no_operand(item, items, place))
                check_before_operator(items, left, item, slash, self.source)
                divided = item.head == "/"
                self.put("SLASH" if divided else "DOT", item)
                left, place = None, place + 1
                continue
            if left is not None:
                check_side_by_side(items, left, place, slash, self.names, self.source)
            unit = self.unit(items, place, divided)
            if divided:
                slash = unit
            left, divided, place = unit, False, unit.after
        if left is None:
            refuse_empty(items, place, begin, opening, self.source)
        return place

    # -- operands --------------------------------------------------------------------------------

    def unit(self, items: Items, place: int, divided: bool = False) -> Unit:
        """Read the operand at ``place``; ``divided``: a slash stands before it."""
        item = items[place]
        if (item.head.isdigit() and item.head.isascii()) or item.head == ".":
            return Unit("number", place, self.number(items, place))
        match = self.names.match(items, place)
        refused = self.names.refusal(items, place, match)
        if refused:
            raise self.error(item, refused)
        if match is not None:
            refusals.check_spelled(items, place, match, self.source)
            self.name(items, place, match)
            return Unit("name", place, place + match.count)
        if item.head in OPENING:
            after = self.bracket(items, place)
            self.power(items[after - 1])
            return Unit("closed", place, after)
        if item.head == "|":
            return Unit("closed", place, self.bar(items, place))
        return self.command(items, place, divided)

    def command(self, items: Items, place: int, divided: bool) -> Unit:
        item = items[place]
        function = function_of(item)
        if function is not None:
            return self.function(items, place, function)
        if is_e(item):
            self.put("FUNCTION", item, "exp")
            self.group(item.above, item)
            return Unit("closed", place, place + 1)
        if item.head == r"\frac":
            return self.fraction(items, place)
        if item.head == r"\sqrt":
            self.root(item)
            return Unit("closed", place, place + 1)
        if item.head == r"\partial":
            derivative = subscripted(item, self.names, self.source)
            return self.differentiated(items, place, derivative)
        if item.head in (r"\sum", r"\prod"):
            if divided:
                raise self.error(item, f"/ before {item.head}: put the {item.head} in parentheses,"
                                       " as in a/(\\sum ...)")
            return self.summation(items, place)
        raise self.error(item, refusals.unknown(items, place, self.names))

    def number(self, items: Items, place: int) -> int:
        first, text = place, ""
        while place < len(items):
            item = items[place]
            if not (item.head.isdigit() and item.head.isascii()) and item.head != ".":
                break
            if text and item.space:
                raise self.error(item, refusals.spaced_number(items, first, place))
            if item.below is not None or item.primes:
                raise self.error(item, refusals.scripted_number(items, first, place))
            text += item.head
            place += 1
            if item.above is not None:
                break
        if not (text.replace(".", "", 1).isdigit() and text[-1] != "."):
            raise self.error(items[first], f"{text!r} is no number; write decimals as in 2.5")
        if len(text) > MAX_DIGITS:
            raise self.error(items[first], f"a number of more than {MAX_DIGITS} digits; write it"
                                           " with a power of 10")
        if place < len(items) and items[place].head == ",":
            raise self.error(items[place], refusals.comma(items, Unit("number", first, place),
                                                          place))
        self.put("NUMBER", items[first], Fraction(text))
        self.power(items[place - 1])
        return place

    def name(self, items: Items, place: int, match: Match) -> None:
        if match.others or len(match.meanings) > 1:
            raise self.error(items[place], refusals.two_readings(items, place, match))
        if match.power is not None and bracketed(match.power):
            raise self.error(items[place], refusals.bracketed_power(items, place, match,
                                                                    self.names))
        if match.power is not None and not numeric(match.power):
            raise self.error(items[place], refusals.unknown_power(items, place, match, self.names))
        self.put("NAME", items[place], match.meanings[0])
        if match.power is not None:
            self.exponent(items[place + match.count - 1], match.power)

    def power(self, item: Item) -> None:
        if item.below is not None or item.primes:
            raise self.error(item, f"{item.head!r} cannot carry a subscript or prime; write it on a"
                                   " symbol")
        if item.above is not None:
            if bracketed(item.above):
                raise self.error(item, refusals.BRACKETED)
            if not numeric(item.above):
                raise self.error(item, refusals.exponent(item))
            self.exponent(item, item.above)

    def exponent(self, item: Item, above: Items) -> None:
        self.put("CARET", item)
        self.group(above, item)

    def group(self, inside: Items | None, around: Item) -> None:
        assert inside is not None
        self.deeper(around)
        self.put("OPEN", around)
        self.level(inside, 0, around, None)
        self.put("CLOSE", around)
        self.depth -= 1

    def bracket(self, items: Items, place: int) -> int:
        """Read a pair of brackets and what is inside; return the place after them."""
        opening = items[place]
        refusals.check_opening(opening, self.source)
        self.deeper(opening)
        self.put("OPEN", opening)
        after = self.level(items, place + 1, opening, OPENING[opening.head])
        if after >= len(items):
            raise self.error(opening, f"{opening.head!r} is never closed; write the missing"
                                      f" {OPENING[opening.head]!r}")
        refusals.check_pair(opening, items[after], self.source)
        self.put("CLOSE", items[after])
        self.depth -= 1
        return after + 1

    def bar(self, items: Items, place: int) -> int:
        opening = items[place]
        if scripted(opening):
            raise self.error(opening, refusals.BARS)
        sided = opening.side in ("l", "left")
        if not sided:
            if opening.side:
                raise self.error(opening, refusals.BARS)
            bare = sum(item.head == "|" and not item.side for item in items)
            if self.bars or bare != 2:
                raise self.error(opening, refusals.BARS)
        self.deeper(opening)
        self.bars += not sided
        self.put("BAR", opening)
        self.put("OPEN", opening)
        after = self.level(items, place + 1, opening, "|")
        if after >= len(items) or (items[after].side in ("r", "right")) != sided:
            raise self.error(opening, refusals.BARS)
        self.put("CLOSE", items[after])
        self.bars -= not sided
        self.depth -= 1
        self.power(items[after])
        return after + 1

    def root(self, item: Item) -> None:
        degree = 2
        if item.option is not None:
            shown = key_of(item.option)
            if not (shown.isdigit() and shown.isascii() and len(shown) < 3 and int(shown) > 1):
                raise self.error(item, f"the root of degree {shown!r}: write a number from 2 to 64")
            degree = int(shown)
        self.put("ROOT", item, degree)
        self.group(item.arguments[0], item)
        self.power(item)

    def fraction(self, items: Items, place: int) -> Unit:
        item = items[place]
        derivative = as_derivative(item, self.names, self.source)
        if derivative is not None:
            if scripted(item):
                raise self.error(item, refusals.FRACTION_POWER)
            if not derivative.inside:
                return self.differentiated(items, place, derivative)
            self.put("DERIVATIVE", item, self.differentiating(derivative, item))
            self.inside_derivative(item, derivative)
            return Unit("closed", place, place + 1)
        if scripted(item):
            raise self.error(item, refusals.FRACTION_POWER)
        self.put("FRACTION", item)
        for side in item.arguments:
            self.group(side, item)
        return Unit("closed", place, place + 1)

    def inside_derivative(self, item: Item, derivative: Derivative) -> None:
        """Read what is differentiated, where it stands in the fraction: one operand."""
        inside = derivative.inside
        self.deeper(item)
        self.put("OPEN", item)
        unit = self.unit(inside, 0)
        if unit.after != len(inside) or (unit.kind == "name" and self.powered(inside, unit)):
            raise self.error(inside[0], refusals.differentiated(inside))
        self.put("CLOSE", item)
        self.depth -= 1

    def differentiating(
        self, derivative: Derivative, item: Item
    ) -> Callable[[Expression], Expression]:
        return partial(differentiated, derivative=derivative, names=self.names,
                       source=self.source, start=item.start)

    def powered(self, items: Items, unit: Unit) -> bool:
        match = self.names.match(items, unit.first)
        return match is not None and match.power is not None

    def differentiated(self, items: Items, place: int, derivative: Derivative) -> Unit:
        """Read the operand behind a derivative; nothing may follow it in its term."""
        item = items[place]
        if place + 1 >= len(items):
            raise self.error(item, refusals.no_argument(item))
        self.put("DERIVATIVE", item, self.differentiating(derivative, item))
        return self.bare(items, place)

    def function(self, items: Items, place: int, function: str) -> Unit:
        item = items[place]
        if scripted(item):
            raise self.error(item, refusals.scripted_function(item, function))
        if place + 1 >= len(items):
            raise self.error(item, refusals.no_argument(item))
        self.put("FUNCTION", item, function)
        follower = items[place + 1]
        if follower.head in OPENING and self.names.match(items, place + 1) is None:
            after = self.bracket(items, place + 1)
            if scripted(items[after - 1]):
                raise self.error(items[after - 1], refusals.call_power(items, place, after))
            return Unit("call", place, after)
        if function_of(follower) is not None:
            raise self.error(follower, refusals.nested_functions(item, follower))
        return self.bare(items, place)

    def bare(self, items: Items, place: int) -> Unit:
        """Read the one operand a function without brackets is applied to."""
        item, follower = items[place], items[place + 1]
        if follower.head in SIGNS or follower.head in (*DOTS, "/") or follower.head in CLOSING:
            raise self.error(item, refusals.no_argument(item))
        self.deeper(follower)
        self.put("OPEN", follower)
        unit = self.unit(items, place + 1)
        self.put("CLOSE", follower)
        self.depth -= 1
        last = items[unit.after - 1]
        powered = last.above is not None and not is_e(last)
        if powered and not (unit.kind == "name" and not self.powered(items, unit)):
            raise self.error(last, refusals.bare_power(items, place, unit))
        return Unit("bare", place, unit.after)

    # -- sums and products over an index ---------------------------------------------------------

    def summation(self, items: Items, place: int) -> Unit:
        """Write a sum out: its body is the rest of the term; that of a product is one operand."""
        item = items[place]
        bounds = read_range(item, self.source)
        after = end_of_term(items, place + 1, bool(self.bars))
        body = items[place + 1 : after]
        if not body:
            raise self.error(item, refusals.no_argument(item))
        bounds.check_index(body, self.names, self.source)
        self.deeper(item)
        self.put("OPEN", item)
        for value in bounds.values:
            if value != bounds.values[0] and item.head == r"\sum":
                self.put("PLUS", item)
            written = indexed(body, bounds.index, value)
            self.put("OPEN", item)
            if item.head == r"\sum":
                self.level(written, 0, item, None)
            elif self.unit(written, 0).after != len(written):
                raise self.error(item, refusals.PRODUCT_BODY)
            self.put("CLOSE", item)
        self.put("CLOSE", item)
        self.depth -= 1
        return Unit("bare", place, after)
