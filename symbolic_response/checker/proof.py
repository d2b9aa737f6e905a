"""The proofs of a record: each is read and checked, its kind in a file of its own."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import Any

from .algebra import Algebra, Residues
from .coefficients import extremes
from .edge import check_edge
from .network import Graph
from .reading import choice, fraction, invalid, malformed, members, place, shown
from .record import Network, read_ends
from .rows import check_rows, read_rows
from .splitting import check_splitting, read_splittings
from .transport import check_transport
from .trees import Polynomials, read_trees

ENTRIES = {
    "edge": ("transition", "form", "cycles"),
    "splitting": ("transition", "form", "splittings"),
    "coefficients": ("low", "high"),
    "transport": ("transitions", "cycles", "pairs"),
    "paths": ("from", "to", "form", "paths"),
}
CHANCE = "compact, at a random point modulo 2^61-1, chance of error below 1e-15"


class Proofs:
    """The proofs of a record that were found right."""

    def __init__(self, network: Network, graph: Graph, moves: list[Fraction] | None,
                 trees: object, draw: Callable[[], int]) -> None:
        self.network, self.graph, self.moves, self.draw = network, graph, moves, draw
        self.trees = None if trees is None else read_trees(trees, graph)
        self.forms: dict[tuple[str, int], str] = {}  # by kind and transition, "" where none
        self.span = Fraction(0)  # high - low of coefficients
        self.bundle: tuple[int, ...] = ()  # of transport
        self.path = (-1, -1)
        self._polynomials: Polynomials | None = None
        self._residues: Residues | None = None

    def check(self, value: object, entry: str) -> None:
        """Check one proof."""
        kind = choice(value.get("kind") if isinstance(value, dict) else value, f"{entry}.kind",
                      *ENTRIES)
        _, *given = members(value, entry, "kind", *ENTRIES[kind])
        values = dict(zip(ENTRIES[kind], given, strict=True))
        e, form = -1, ""
        if "transition" in values:
            e = place(values["transition"], f"{entry}.transition", self.network.transitions)
        if (kind, e) in self.forms:
            raise malformed(entry, "each proof once", kind)
        if "form" in values:
            form = choice(values["form"], f"{entry}.form", "expanded", "compact")
        self.forms[kind, e] = form
        if kind == "coefficients":
            self._check_coefficients(values, entry)
        elif kind == "transport":
            self.bundle = check_transport(self._expanded(entry), self.network, given, entry)
        else:
            algebra: Algebra[Any] = self._compact() if form == "compact" else self._expanded(entry)
            self._check_identities(kind, e, values, algebra, entry)

    def _check_identities(self, kind: str, e: int, values: dict[str, object],
                          algebra: Algebra[Any], entry: str) -> None:
        if kind == "edge":
            goal, start = self.graph.ends[e]
            rows = read_rows(values["cycles"], f"{entry}.cycles", self.graph, start, goal, e)
            check_edge(algebra, e, rows, entry)
        elif kind == "splitting":
            sides = read_splittings(values["splittings"], f"{entry}.splittings", self.graph, e)
            check_splitting(algebra, e, sides, entry)
        else:
            self.path = read_ends(values["from"], values["to"], entry, self.network)
            rows = read_rows(values["paths"], f"{entry}.paths", self.graph, *self.path)
            check_rows(algebra, rows, *self.path, entry)

    def _check_coefficients(self, values: dict[str, object], entry: str) -> None:
        low, high = (fraction(values[key], f"{entry}.{key}") for key in ("low", "high"))
        if self.moves is None:
            raise invalid(f"{entry}.kind", "a perturbation for coefficients", "a path")
        least, most = extremes(self.graph, self.moves)
        for key, wanted, stated in (("low", least, low), ("high", most, high)):
            if wanted != stated:
                raise invalid(f"{entry}.{key}", shown(wanted), stated)
        self.span = most - least

    def _expanded(self, entry: str) -> Polynomials:
        if self.trees is None:
            raise malformed("trees", f"a list, as {entry} is expanded", None)
        self._polynomials = self._polynomials or Polynomials(self.graph, self.trees)
        return self._polynomials

    def _compact(self) -> Residues:
        self._residues = self._residues or Residues(self.graph, self.draw)
        return self._residues

    def said(self) -> str:
        """Return what was checked, for people."""
        found = []
        for (kind, e), form in self.forms.items():
            where = f" {self.network.transitions[e]}" if e >= 0 else ""
            found.append(kind + where + (f": {CHANCE if form == 'compact' else form}" * bool(form)))
        return "; ".join(["proof for all positive rates", *found])
