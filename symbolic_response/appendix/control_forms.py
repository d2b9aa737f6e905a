"""The limit H as a minimum of linear forms in t = tanh(F/4), each F explained by its cycles."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction

from symbolic_response.appendix.bounds_section import MAX_LISTED_CYCLES, side_latex
from symbolic_response.appendix.control_pieces import set_latex
from symbolic_response.appendix.cycles_section import MAX_LISTED
from symbolic_response.appendix.paper import Paper
from symbolic_response.bounds.claim import MixedCycles
from symbolic_response.bounds.topological import competing
from symbolic_response.control.decomposition import LinearForm
from symbolic_response.control.separations import Part
from symbolic_response.expressions.breaking import (
    Equation,
    Piece,
    align,
    fits,
    line_limit,
    product_pieces,
)
from symbolic_response.expressions.layout import without_sign
from symbolic_response.expressions.tree import ONE, ZERO, Expression, Number, Sum, add
from symbolic_response.topology import Cycle

MAX_LISTED_BUNDLES = 4


@dataclass(frozen=True, slots=True)
class Form:
    """``constant`` + sum of ``slopes`` * t, one t for all bundles that have the same cycles."""

    constant: Expression
    slopes: Mapping[int, Expression]

    def numbers(self) -> tuple[Fraction, dict[int, Fraction]] | None:
        """Return constant and slopes, None where they are not all numbers."""
        if not isinstance(self.constant, Number):
            return None
        found: dict[int, Fraction] = {}
        for place, slope in self.slopes.items():
            if not isinstance(slope, Number):
                return None
            found[place] = slope.value
        return self.constant.value, found


@dataclass(slots=True)
class Forces:
    """The different t of the forms of one parameter, in the order in which they occur."""

    paper: Paper
    places: dict[tuple[Cycle, ...], int] = field(default_factory=dict)
    bundles: list[list[Part]] = field(default_factory=list)
    infinite: list[Part] = field(default_factory=list)

    def form(self, form: LinearForm) -> Form:
        """Return a form with its slopes gathered by t; where the force is infinite, t is one."""
        constant, slopes = [form.constant], dict[int, list[Expression]]()
        for part, slope in form.slopes:
            place = self._place(part)
            if place is None:
                constant.append(slope)
            else:
                slopes.setdefault(place, []).append(slope)
        return Form(add(constant), {place: add(found) for place, found in sorted(slopes.items())})

    def _place(self, part: Part) -> int | None:
        cycles = competing(MixedCycles(part), self.paper.analysis)
        one_way = self.paper.analysis.graph.one_way
        if any(one_way[e] for cycle in cycles for e in cycle.transitions):
            if part not in self.infinite:
                self.infinite.append(part)
            return None
        place = self.places.setdefault(cycles, len(self.places))
        if place == len(self.bundles):
            self.bundles.append([])
        if part not in self.bundles[place]:
            self.bundles[place].append(part)
        return place

    def name(self, place: int) -> str:
        """Return the letter of one t."""
        letter = self.paper.letters["tanh"]
        return letter if len(self.places) == 1 else f"{letter}_{{{place + 1}}}"

    def text(self) -> str:
        """Return what each t is, with the cycles whose forces set it."""
        texts = [self._explained()] if self.places else []
        if self.infinite:
            sets = _several([set_latex(self.paper, part) for part in self.infinite])
            texts.append(f"The force of {sets} is infinite, for a cycle with a one-way step: its"
                         r" $\tanh$ is one and contained in the numbers.")
        return " ".join(texts)

    def _explained(self) -> str:
        paper = self.paper
        letter = paper.letters["force"]
        if len(self.places) == 1:
            ((cycles, place),) = self.places.items()
            inside = _several([set_latex(paper, part) for part in self.bundles[place]])
            if len(cycles) == 1:
                number = paper.analysis.cycles.index(cycles[0]) + 1
                force = paper.notation.indexed("force", f"{number}")
                return (rf"Here ${self.name(0)} = \tanh (|{force}|/4)$, as cycle {number} alone has"
                        f" transitions both inside and outside of {inside}.")
            return (rf"Here ${self.name(0)} = \tanh ({letter}_{{\max}}/4)$, and"
                    rf" ${letter}_{{\max}}$ is {self._largest(cycles)}: the cycles with transitions"
                    f" both inside and outside of {inside}.")
        texts = []
        for cycles, place in self.places.items():
            inside = _several([set_latex(paper, part) for part in self.bundles[place]])
            texts.append(f"for ${self.name(place)}$ ({inside}) {self._largest(cycles)}")
        return (rf"Here each ${paper.letters['tanh']}_i = \tanh ({letter}_{{\max}}/4)$ with"
                rf" ${letter}_{{\max}}$ the largest force of the cycles with transitions both"
                f" inside and outside of a set of transitions: {'; '.join(texts)}.")

    def _largest(self, cycles: Sequence[Cycle]) -> str:
        """Return the largest force of some cycles: listed where few and numbered, else counted."""
        paper = self.paper
        every = paper.analysis.cycles
        if len(every) > MAX_LISTED or len(cycles) > MAX_LISTED_CYCLES:
            return f"the largest of {len(cycles)}"
        shown = [f"$|{paper.notation.indexed('force', str(every.index(cycle) + 1))}|$"
                 for cycle in cycles]
        return shown[0] if len(shown) == 1 else f"the largest of {', '.join(shown)}"


def _several(sets: Sequence[str]) -> str:
    """Return a few sets, the rest counted."""
    if len(sets) == 1:
        return sets[0]
    if len(sets) > MAX_LISTED_BUNDLES:
        return f"{', '.join(sets[:MAX_LISTED_BUNDLES])} and {len(sets) - MAX_LISTED_BUNDLES} more"
    return f"{', '.join(sets[:-1])} or {sets[-1]}"


def least(paper: Paper, forms: Iterable[LinearForm]) -> list[LinearForm]:
    """Return the forms that none is below for all t, the smallest without forces first."""
    forces = Forces(paper)
    kept: list[tuple[Form, LinearForm]] = []
    for linear in forms:
        form = forces.form(linear)
        if not any(_below(other, form) for other, _ in kept):
            kept = [pair for pair in kept if not _below(form, pair[0])]
            kept.append((form, linear))
    return [linear for _, linear in sorted(kept, key=lambda pair: _constant(pair[0]))]


def _constant(form: Form) -> Fraction:
    parts = form.numbers()
    return Fraction(0) if parts is None else parts[0]


def _below(one: Form, other: Form) -> bool:
    pair = one.numbers(), other.numbers()
    if pair[0] is None or pair[1] is None:
        return one == other
    (constant, slopes), (larger, others) = pair[0], pair[1]
    return constant <= larger and all(
        slope <= others.get(place, 0) for place, slope in slopes.items())


def at_equal(forms: Sequence[Form], t: int) -> Fraction | None:
    """Return H where every t that is not fixed is ``t``, None where it depends on symbols."""
    found = []
    for form in forms:
        parts = form.numbers()
        if parts is None:
            return None
        found.append(parts[0] + t * sum(parts[1].values(), Fraction(0)))
    return min(found)


# -- printing --------------------------------------------------------------------------------------


def steepness_equations(forces: Forces, forms: Sequence[Form], left: str) -> str:
    """Return H as an equation: one form, or the least of several, each by itself where wide."""
    paper = forces.paper
    if len(forms) == 1:
        return align([form_equation(forces, forms[0], left)], paper.width)
    limit = line_limit(left, paper.width)
    listed = r", \; ".join(_inline(forces, form) for form in forms)
    whole = rf"\min \{{ {listed} \}}"
    if fits(whole, limit):
        return align([Equation(left, (Piece("", whole),))], paper.width)
    names = [f"{left}_{{{place}}}" for place in range(1, len(forms) + 1)]
    ends = rf"\min_{{1 \le i \le {len(forms)}}} {left}_i"
    return align([Equation(left, (Piece("", ends),)), *(
        form_equation(forces, form, name) for form, name in zip(forms, names, strict=True))],
        paper.width)


def form_equation(forces: Forces, form: Form, left: str) -> Equation:
    """Return a form as an equation whose terms fit the lines."""
    paper = forces.paper
    limit = line_limit(left, paper.width)
    pieces: list[Piece] = []
    for negative, factors in _terms(forces, form):
        sign = "-" if negative else "+" if pieces else ""
        body = r" \, ".join(factors)
        pieces += [Piece(sign, body)] if fits(body, limit) else product_pieces(
            factors, limit, sign)
    return Equation(left, tuple(pieces))


def _inline(forces: Forces, form: Form) -> str:
    text = ""
    for negative, factors in _terms(forces, form):
        sign = "-" if negative else "+" if text else ""
        text += f" {sign} " + r" \, ".join(factors)
    return text.strip()


def _terms(forces: Forces, form: Form) -> list[tuple[bool, list[str]]]:
    """Return the terms of a form: whether it is subtracted, and its printed factors."""
    paper = forces.paper
    constants = form.constant.terms if isinstance(form.constant, Sum) else (form.constant,)
    terms = []
    for term in constants:
        if term != ZERO:
            negative, size = without_sign(term)
            terms.append((negative, [side_latex(paper, size)]))
    terms.sort(key=lambda term: term[0])
    for place, slope in form.slopes.items():
        latex = side_latex(paper, slope)
        latex = f"({latex})" if isinstance(slope, Sum) else latex
        name = forces.name(place)
        terms.append((False, [name] if slope == ONE else [latex, name]))
    return terms or [(False, ["0"])]
