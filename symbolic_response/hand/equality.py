"""Whether two expressions are the same function: yes, no, or not settled."""

from __future__ import annotations

from symbolic_response.errors import EvaluationError, SizeLimitError
from symbolic_response.expressions.enclosure import nonzero_somewhere
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.ring import Domain
from symbolic_response.expressions.tree import Expression, add, negate


def equal(left: Expression, right: Expression, domain: Domain) -> bool | None:
    """Return whether two expressions in the symbols of ``domain`` are the same function.

    True is proved by a normal form of zero, False by an enclosure of the difference that excludes
    zero at a point or, for rational functions of the symbols, by the normal form; None is neither.

    >>> from symbolic_response.expressions.reader import read_expression as read
    >>> d = Domain(("a", "b"), frozenset({"a", "b"}))
    >>> [equal(read(x), read("a/(a + b)"), d) for x in ("1 - b/(a + b)", "b/(a + b)")]
    [True, False]
    """
    difference = add([left, negate(right)])
    if nonzero_somewhere(difference):
        return False
    try:
        form = normal_form(difference, domain)
    except (EvaluationError, SizeLimitError):
        return None
    if form.is_zero():
        return True
    return None if any(g.kind != "symbol" for g in form.ring.generators) else False
