"""What to say about a term that a numerator or a denominator lacks, has in excess or miscounts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from symbolic_response.expressions.text import expression_text, fraction_text
from symbolic_response.hand.diagnosis.case import Case
from symbolic_response.hand.diagnosis.products import rate_text, rates_text, why_no_tree
from symbolic_response.hand.diagnosis.references import Origin, Reference, Slot
from symbolic_response.hand.diagnosis.written import Monomial, Terms, term_expression

MAX_SHOWN = 300
ONE = Fraction(1)


@dataclass(frozen=True, slots=True)
class Factor:
    """A common factor of numerator and denominator: a monomial with a coefficient."""

    shift: Monomial
    coefficient: Fraction


@dataclass(frozen=True, slots=True)
class Comparison:
    """Hand sums divided by the common factor, less those of the reference."""

    reference: Reference
    factor: Factor
    top: Terms
    bottom: Terms

    def changes(self) -> int:
        """Return how many terms differ."""
        return len(self.top) + len(self.bottom)


@dataclass(frozen=True, slots=True)
class Note:
    """A remark on a sum. ``kind``: ``lacks``, ``extra`` or ``coefficient``.

    ``text`` follows the verb; ``small``: about one term, not said better by its place alone.
    """

    kind: str
    text: str
    small: bool = True

    @property
    def singular(self) -> str:
        """The remark about one sum."""
        return {"lacks": "lacks ", "extra": "has ", "coefficient": "is wrong in "}[
            self.kind] + self.text

    @property
    def plural(self) -> str:
        """The remark about two sums."""
        return {"lacks": "both lack ", "extra": "both have ", "coefficient": "are wrong in "}[
            self.kind] + self.text


def notes(slot: Slot, differences: Terms, found: Comparison, case: Case) -> list[Note]:
    """Return remarks that together say how a hand sum differs from the sum it should be."""
    rest, noted = dict(differences), []
    for origin in slot.origins:
        if len(origin.product) > 1 and all(
            rest.get(key) == -coefficient for key, coefficient in origin.product.items()
        ):
            for key in origin.product:
                del rest[key]
            noted.append(Note("lacks", _tree_text(origin, case)))
    for key, change in rest.items():
        noted.append(_term_note(slot, key, change, found, case))
    return noted


def _term_note(
    slot: Slot, key: Monomial, change: Fraction, found: Comparison, case: Case
) -> Note:
    right = slot.terms.get(key, Fraction(0))
    shown = _shown(found, key)
    origins = [origin for origin in slot.origins if key in origin.product]
    if not right:
        return _extra(slot, key, change, found, case)
    if right + change == 0:
        return Note("lacks", _missing(origins, shown, case))
    if right == -change / 2:
        return Note("coefficient", f"the sign of the term {shown}")
    if len(origins) > 1 and change == -origins[0].product[key]:
        listed = " or ".join(_tree_text(origin, case) for origin in origins[:2])
        return Note("lacks", f"one of the {len(origins)} spanning trees with the product {shown}"
                    f" ({listed}{', ...' if len(origins) > 2 else ''})")
    scale = found.factor.coefficient
    counted = (f"the term {shown}: it should have coefficient {fraction_text(right * scale)}, not"
               f" {fraction_text((right + change) * scale)}")
    if len(origins) > 1:
        counted += f" ({len(origins)} spanning trees have this product)"
    return Note("coefficient", counted)


def _missing(origins: Sequence[Origin], shown: str, case: Case) -> str:
    if not origins:
        return f"the term {shown}"
    if len(origins) == 1 and len(origins[0].product) == 1:
        return _tree_text(origins[0], case)
    if len(origins) == 1:
        return f"a part of {_tree_text(origins[0], case)}: the term {shown}"
    listed = "; ".join(_tree_text(origin, case) for origin in origins[:2])
    more = f" and {len(origins) - 2} more" if len(origins) > 2 else ""
    return f"the term {shown}, the sum of {len(origins)} trees of this product: {listed}{more}"


def _tree_text(origin: Origin, case: Case) -> str:
    tree = (f"the spanning tree towards {case.network.states[origin.root].name}:"
            f" {rates_text(origin.rates, case.network)}")
    if origin.leading is None:
        return tree
    return f"{rate_text(origin.leading, case.network)} times {tree}"


def _extra(
    slot: Slot, key: Monomial, change: Fraction, found: Comparison, case: Case
) -> Note:
    """Return a remark on a term that should not be there."""
    term = _shown(found, key, change * found.factor.coefficient)
    if not found.reference.rates:
        return Note("extra", f"the term {term}, which does not belong there")
    if any(origin.leading is not None for origin in slot.origins):
        return Note("extra", f"the term {term}, which is no rate of the transition times a"
                    " spanning tree towards the state it leads out of")
    reason = why_no_tree(key, found.reference.rates, slot.roots, case.analysis)
    because = "is no product of rates that makes a spanning tree" if reason is None else (
        "does not belong there")
    return Note("extra", f"the term {term}, which {because}"
                + ("" if reason is None else f": {reason}"))


def _shown(found: Comparison, key: Monomial, coefficient: Fraction = ONE) -> str:
    """Return a term as it stands in the hand form."""
    exponents = tuple(a + b for a, b in zip(key, found.factor.shift, strict=True))
    text = expression_text(term_expression(found.reference.ring, exponents, coefficient))
    return text if len(text) <= MAX_SHOWN else text[:MAX_SHOWN] + "..."
