"""Hand results as given: ``[[hand]]`` entries, ``QUANTITY = FORMULA``, formulas from Python."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from numbers import Rational
from typing import Any

from symbolic_response.bounds.sides import quantity_text
from symbolic_response.errors import ExpressionError, FormulaError, InputError, QuantityError
from symbolic_response.expressions.names import nearest
from symbolic_response.expressions.sympy_exchange import expression_from_sympy
from symbolic_response.expressions.tree import Expression, number, symbols_of
from symbolic_response.hand.latex.names import Names
from symbolic_response.hand.latex.reading import read_formula
from symbolic_response.network.entries import DocumentError, check_keys, one_line, shown
from symbolic_response.network.model import Network
from symbolic_response.network.quantities import Response
from symbolic_response.network.quantity_reader import read_quantity
from symbolic_response.network.toml_reader import place_in_file

KEYS = ("quantity", "latex", "plain", "given", "label")


@dataclass(frozen=True, slots=True)
class HandResult:
    """A formula for a quantity, read.

    ``quantity_text`` and ``formula`` as they were written, ``latex`` where the formula is LaTeX;
    ``where`` it stands, for people; ``given``: relations that may be used, as texts.
    """

    quantity: Expression
    quantity_text: str
    expression: Expression
    formula: str
    latex: bool
    where: str
    label: str | None = None
    given: tuple[str, ...] = ()


def read_entries(network: Network, names: Names) -> tuple[HandResult, ...]:
    """Return the ``[[hand]]`` entries of a network.

    Raises InputError, in one line that begins with file and line, at the first that cannot be
    read; FormulaError where the place in the LaTeX is known.
    """
    found = []
    for place in range(len(network.hand)):
        try:
            found.append(_entry(network, names, place))
        except DocumentError as error:
            where = place_in_file(network.path, error.place)
            raise QuantityError(f"{where}: {error}") from None
    return tuple(found)


def _entry(network: Network, names: Names, ordinal: int) -> HandResult:
    table, place = network.hand[ordinal], ("hand", ordinal)
    what = f"hand entry {ordinal + 1}"
    check_keys(table, KEYS, what, place)
    if "quantity" not in table:
        raise DocumentError(f'{what} has no quantity; write quantity = "p[A]" or the like', *place)
    chosen = [key for key in ("latex", "plain") if key in table]
    if len(chosen) != 1:
        raise DocumentError(f"{what} has {' and '.join(chosen) or 'no formula'}; write the formula"
                            " once, as latex = '...' or as plain = \"...\"", *place)
    (key,) = chosen
    formula, quantity = table[key], table["quantity"]
    for name, text in (("quantity", quantity), (key, formula)):
        if type(text) is not str or not text.strip():
            raise DocumentError(f"{what}: {name} is {shown(text)}; write a text in quotes",
                                *place, name)
    where = place_in_file(network.path, (*place, key))
    label = one_line(table["label"], f"{what}: label", (*place, "label")) if "label" in table \
        else None
    return HandResult(
        quantity=_located(lambda: read_quantity(str(quantity), network), where, what, "quantity"),
        quantity_text=str(quantity),
        expression=_located(lambda: read_hand_formula(str(formula), network, names, key == "latex"),
                            where, what, key),
        formula=str(formula).strip(),
        latex=key == "latex",
        where=where,
        label=label,
        given=_given(table.get("given", ()), what, (*place, "given")),
    )


def _given(value: object, what: str, place: tuple[str | int, ...]) -> tuple[str, ...]:
    if not isinstance(value, list | tuple) or not all(type(entry) is str for entry in value):
        raise DocumentError(f'{what}: given is not an array of texts; write given = ["a*b = c*d"]',
                            *place)
    return tuple(str(entry) for entry in value)


def _located(read: Callable[[], Expression], where: str, what: str, key: str) -> Expression:
    """Return what ``read`` reads, with file, line and entry before the message of an error."""
    try:
        return read()
    except FormulaError as error:
        raise FormulaError(error.message, error.line, error.column, error.excerpt, error.pointer,
                           f"{where}: {what}: {key}") from None
    except InputError as error:
        raise QuantityError(f"{where}: {what}: {key}: {error}") from None


def read_hand_formula(
    text: str, network: Network, names: Names, latex: bool | None = None
) -> Expression:
    r"""Return a formula in LaTeX or in the plain syntax of quantities.

    ``latex`` None: LaTeX if it holds a backslash, a brace or ``^``, none of which plain syntax
    has. Raises FormulaError or QuantityError.
    """
    if latex is None:
        latex = is_latex(text)
    return read_formula(text, names) if latex else read_quantity(text, network, hyperbolic=True)


def read_line(text: str, network: Network, names: Names, given: Sequence[str]) -> HandResult:
    """Return a hand result written as ``QUANTITY = FORMULA``, each side plain or LaTeX."""
    left, equals, right = text.partition("=")
    if not equals or not left.strip() or not right.strip():
        raise QuantityError(f"{shown(text)}: write QUANTITY = FORMULA")
    quantity = read_hand_formula(left.strip(), network, names)
    expression = read_hand_formula(right, network, names)
    written = text_of(quantity, network) if is_latex(left) else left.strip()
    return HandResult(quantity, written, expression, right.strip(), is_latex(right),
                      "command line", given=tuple(given))


def is_latex(text: str) -> bool:
    """Return whether a text is LaTeX: plain syntax has no backslash, brace or ``^``."""
    return any(mark in text for mark in "\\{^")


def text_of(quantity: Expression, network: Network) -> str:
    """Return a quantity as it is asked for; a response by itself stands without parentheses."""
    shown = quantity_text(quantity, network)
    return shown[1:-1] if isinstance(quantity, Response) else shown


def from_python(formula: Any, network: Network, names: Names) -> tuple[Expression, str, bool]:
    """Return a formula given as text, as an Expression or in SymPy; with its text, and if LaTeX.

    Raises ExpressionError for a symbol that the network does not have, and all that the readers do.
    """
    if isinstance(formula, str):
        return read_hand_formula(formula, network, names), formula, is_latex(formula)
    if isinstance(formula, Rational) and not isinstance(formula, bool):
        exact = Fraction(int(formula.numerator), int(formula.denominator))
        return number(exact), str(exact), False
    expression = formula if isinstance(formula, Expression) else expression_from_sympy(formula)
    known = [entry.name for entry in network.symbols]
    for name in sorted(symbols_of(expression) - set(known)):
        raise ExpressionError(f"the network has no symbol {name!r}{nearest(name, known)}")
    return expression, str(formula), False
