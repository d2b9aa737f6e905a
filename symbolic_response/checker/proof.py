"""The check of a record of proofs: each proof, then that claims have those they need."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from functools import cache
from typing import Any

from .algebra import Residues
from .bounds import paths_along, read_pieces
from .changes import bundle, changed, changes, check_pieces, directed, support
from .expressions import HALF, ONE, ZERO
from .extremes import extremes
from .forms import read_form
from .identities import check_edge, check_paths, check_splitting, read_paths, read_sets
from .network import Graph
from .point import Solved, observe
from .reading import choice, compare, invalid, malformed, members, place
from .record import Claim, Perturbation, Record, read_ends
from .transport import check_transport
from .trees import Polynomials, read_trees

ENTRIES = {
    "edge": ("transition", "form", "cycles"),
    "splitting": ("transition", "form", "splittings"),
    "coefficients": ("low", "high"),
    "transport": ("transitions", "cycles", "pairs"),
    "paths": ("from", "to", "form", "paths"),
}
UNMOVED = Perturbation("none")
CHANCE = "compact, at a random point modulo 2^61-1, chance of error below 1e-15"


def check_proof(record: Record, graph: Graph, draw: Callable[[], int]) -> str:
    """Check a record of proofs, and return what was checked."""
    network = record.network
    if record.target is not None:
        observe(record.target, network.states, lambda one, _: read_form(
            one, network.positive, UNMOVED, graph.work).sign, "a form that shows no negative value",
                "")
    for i in graph.rates:
        rate = network.rates[i >> 1][i & 1]
        if rate and read_form(rate, network.positive, UNMOVED, graph.work).sign != 1:
            raise invalid(network.entry(i), "a form that shows a positive rate", rate.text)
    moved = record.perturbation
    if moved and moved.amount and not read_form(moved.amount, network.positive, UNMOVED,
                                                graph.work).real:
        raise invalid("perturbation.amount", "a form that shows a real number", moved.amount.text)
    proofs = Proofs(record, graph, draw)
    for k, value in enumerate(record.proofs):
        proofs.check(value, f"proofs[{k}]")
    for i, claim in enumerate(record.claims):
        if record.path is not None:
            proofs.check_path(record.path, f"claims[{i}].name")
        else:
            proofs.check_claim(claim, f"claims[{i}].name")
    return proofs.said()


class Proofs:
    """The proofs of a record that were found right, and what claims need of them."""

    def __init__(self, record: Record, graph: Graph, draw: Callable[[], int]) -> None:
        self.record, self.network, self.graph = record, record.network, graph
        self.moves = changes(record.network, record.perturbation or UNMOVED, graph)
        self.forms: dict[tuple[str, int], str] = {}  # by kind and transition, "" where none
        self.span = ZERO  # high - low of coefficients
        self.bundle: list[int] = []  # of transport
        self.path = (-1, -1)
        masks = [] if record.trees is None else read_trees(record.trees, graph)
        self.residues = cache(lambda: Residues(graph, draw))
        self.polynomials = cache(lambda: Polynomials(graph, masks))

    def check(self, value: object, entry: str) -> None:
        """Check one proof."""
        kind = choice(value.get("kind") if isinstance(value, dict) else value, f"{entry}.kind",
                      *ENTRIES)
        _, *given = members(value, entry, "kind", *ENTRIES[kind])
        values = dict(zip(ENTRIES[kind], given, strict=True))
        e, form = -1, ""
        if "transition" in values:
            e = place(values["transition"], f"{entry}.transition", self.network.transitions)
        if "form" in values:
            form = choice(values["form"], f"{entry}.form", "expanded", "compact")
        if (kind, e) in self.forms:
            raise malformed(entry, "each proof once", kind)
        self.forms[kind, e] = form
        if kind == "coefficients":
            self._check_coefficients(values, entry)
            return
        if form != "compact" and self.record.trees is None:
            raise malformed("trees", f"a list, as {entry} is expanded", None)
        algebra: Any = self.residues() if form == "compact" else self.polynomials()
        if kind == "transport":
            self.bundle = check_transport(algebra, self.network, values, entry)
        elif kind == "paths":
            self.path = read_ends(given[:2], entry, self.network)
            paths = read_paths(values["paths"], f"{entry}.paths", self.graph, *self.path)
            check_paths(algebra, paths, *self.path, entry)
        elif kind == "edge":
            goal, start = self.graph.ends[e]
            cycles = read_paths(values["cycles"], f"{entry}.cycles", self.graph, start, goal, e)
            check_edge(algebra, e, cycles, entry)
        else:
            sides = read_sets(values["splittings"], f"{entry}.splittings", self.graph, e)
            check_splitting(algebra, e, sides, entry)

    def _check_coefficients(self, values: dict[str, object], entry: str) -> None:
        if self.record.path is not None:
            raise invalid(f"{entry}.kind", "a perturbation for coefficients", "a path")
        low, high = extremes(self.graph, self.moves)
        compare(values, {"low": low, "high": high}, entry)
        self.span = high - low

    def said(self) -> str:
        """Return what was checked, for people."""
        found = []
        for (kind, e), form in self.forms.items():
            where = f" {self.network.transitions[e]}" if e >= 0 else ""
            found.append(kind + where + (f": {CHANCE if form == 'compact' else form}" * bool(form)))
        return "; ".join(["proof for all positive rates", *found])

    def _need(self, kind: str, e: int, entry: str) -> None:
        if (kind, e) not in self.forms:
            where = f" for {self.network.transitions[e]}" if e >= 0 else ""
            raise invalid(entry, f"a proof by {kind}{where}", "none")

    def _need_span(self, most: Fraction, entry: str) -> None:
        self._need("coefficients", -1, entry)
        if self.span > most:
            raise invalid(entry, f"coefficients that differ by at most {most}", self.span)

    def check_path(self, path: tuple[int, int], entry: str) -> None:
        """Check that a path has its proof."""
        self._need("paths", -1, entry)
        if self.path != path:
            raise invalid(entry, "a proof for the ends of the path", "one for others")
        paths_along(self.graph, path, entry)

    def check_claim(self, claim: Claim, entry: str) -> None:
        """Check that a claim about a perturbation has the proofs it needs."""
        assert self.record.perturbation is not None
        name, e = claim.name, self.record.perturbation.place
        if name == "parameter":
            self._check_parameter(claim)
        elif name == "bundle":
            self._check_bundle(entry)
        elif name == "support":
            self._need_span(support(self.moves, self.graph, entry, ""), entry)
        elif name == "directed-bundle":
            self._need_span(directed(self.moves, self.graph, entry, ""), entry)
        elif name.startswith("energy"):
            self._need_span(ONE, entry)
        elif name in ("drive", "splitting-drive"):
            self._need_span(HALF if self.graph.one_way[e] else ONE, entry)
        else:
            if name.startswith("local"):
                e, *more = [*changed(self.moves), -1]
                if len(more) != 1:
                    raise invalid(entry, "one transition whose rates change", len(more))
            self._need("edge", e, entry)
        if name.startswith("splitting"):
            self._need("splitting", e, entry)

    def _check_parameter(self, claim: Claim) -> None:
        for key, given in claim.parts.items():
            for one in given.values():
                if one.symbols:
                    raise invalid(f"{claim.entry}.parts.{key}", "numbers", one.text[:80])
        nowhere = Solved("any point", {}, [], [])
        pieces = read_pieces(claim, self.network, nowhere, self.graph.work)
        check_pieces(self.moves, self.graph, pieces, self.network, f"{claim.entry}.parts", "")
        for e in sorted(pieces["barriers"]):
            self._need("edge", e, f"{claim.entry}.parts")

    def _check_bundle(self, entry: str) -> None:
        kappa, chosen = bundle(self.moves, self.graph, entry, "")
        if ("transport", -1) in self.forms and self.bundle == chosen:
            return
        if kappa and all(
                self.graph.can_run(cycle) == self.graph.can_run(i ^ 1 for i in cycle)
                for cycle in self.graph.mixed_cycles(chosen)):
            raise invalid(entry, "a proof by transport of the transitions that change", "none")
        self._need_span(kappa, entry)
