"""The section of proofs for all rates, and the record that holds their data."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass

from symbolic_response.appendix import theorem_ends, theorem_sums
from symbolic_response.appendix.bounded import Bounded, shown
from symbolic_response.appendix.bounds_section import WORDS
from symbolic_response.appendix.escape import escaped, typed
from symbolic_response.appendix.formulas import filled, is_one
from symbolic_response.appendix.paper import Paper
from symbolic_response.appendix.proofs_data import cycles_data, paths_data, splittings_data
from symbolic_response.appendix.tables import Column, digest_latex, table
from symbolic_response.bounds.claim import Claim
from symbolic_response.bounds.sides import quantity_text
from symbolic_response.certificates.certify import Certificate
from symbolic_response.certificates.proofs.coefficients import CoefficientsProof
from symbolic_response.certificates.proofs.edge import EdgeProof
from symbolic_response.certificates.proofs.prove import Proof, Proved, prove
from symbolic_response.certificates.proofs.record import form_of
from symbolic_response.certificates.proofs.rows import PathsProof
from symbolic_response.certificates.proofs.splitting import SplittingProof
from symbolic_response.certificates.proofs.transport import TransportProof
from symbolic_response.certificates.record import FORMAT, proof_record, record_text
from symbolic_response.expressions.latex import fraction_latex

CURRENTS = frozenset(("current-exact", "current-range"))
BY_BARRIER = frozenset(("barrier", "end-pair", "splitting-barrier", "splitting-end-pair"))
LOCAL = frozenset(("local-change", "local-end-pair"))
FINITE = frozenset(("finite-change", "finite-end-pair"))
ENERGIES = frozenset(("energy-covariance", "energy-range"))
DRIVES = frozenset(("drive", "splitting-drive"))

EQUATIONS: dict[str, tuple[str, ...]] = {
    "energy-covariance": ("energy",), "energy-range": ("trees",),
    "end-pair": ("mixture", "tanh"), "barrier": ("mixture", "tanh", "mediant"),
    "splitting-end-pair": ("covariance", "tanh"),
    "splitting-barrier": ("covariance", "tanh", "mediant"),
    "drive": ("trees",), "splitting-drive": ("covariance", "trees"),
    "local-end-pair": ("mixture", "local"), "local-change": ("mixture", "local", "mediant"),
    "current-exact": ("current", "drive"), "current-range": ("current", "drive"),
    "bundle": ("bundle",), "directed-bundle": ("trees",), "support": ("trees",),
    "second-order": ("second",), "finite-end-pair": ("mixture", "finite"),
    "finite-change": ("mixture", "finite", "mediant"),
    "parameter": ("parameter",), "path": ("paths",),
}
"""The equations that each inequality follows from."""


@dataclass(frozen=True, slots=True)
class Proofs:
    """The section, and the text of the record, None where nothing is proved."""

    section: str
    record: str | None


def proofs_section(
    paper: Paper, entries: Sequence[Bounded], file: str | None, digest: bool
) -> Proofs:
    """Return the proofs of the inequalities for all rates, and their record.

    ``file``: the name of the record, None where the text is made without one; ``digest``: whether
    its SHA-256 is printed.
    """
    if not entries:
        return Proofs("", None)
    made = [prove(paper.analysis, entry.quantity, entry.claims) for entry in entries]
    proved = [(entry, found) for entry, found in zip(entries, made, strict=True) if found.claims]
    title = "Proofs" if proved else "Inequalities without a proof"
    parts = [rf"\section{{{title}}}"]
    record = None
    if proved:
        record = record_text({**FORMAT, "kind": "several", "records": [
            _record(paper, entry, found) for entry, found in proved]})
        parts += [_opening(paper), *_theory(paper, [found for _, found in proved]),
                  _listing(paper, proved), _file(paper, file, record if digest else None)]
    parts.append(_without(paper, list(zip(entries, made, strict=True))))
    return Proofs("\n\n".join(part for part in parts if part), record)


def _record(paper: Paper, entry: Bounded, found: Proved) -> dict[str, object]:
    text = quantity_text(entry.quantity, paper.network)
    whole = Certificate(paper.network, text, entry.quantity, found, None)
    return proof_record(whole, found, paper.analysis)


def _opening(paper: Paper) -> str:
    text = r"""The inequalities listed at the end of this section hold for all positive values of
the directed rates, each rate being a variable of its own. Apart from the tree theorem, and the
all-minors theorem where it is cited, the proofs are complete."""
    if not is_one(paper):
        text += " Here tree sums are not divided by $@factor@$."
    return filled(paper, text)


def _theory(paper: Paper, found: Sequence[Proved]) -> list[str]:
    """Return the theorems that are used, each with its proof, and the data they speak of."""
    names = {claim.name for each in found for claim in each.claims}
    proofs = list(dict.fromkeys(proof for each in found for proof in each.proofs))
    edges = sorted((proof for proof in proofs if isinstance(proof, EdgeProof)),
                   key=lambda proof: proof.transition)
    cuts = sorted((proof for proof in proofs if isinstance(proof, SplittingProof)),
                  key=lambda proof: proof.transition)
    paths = [proof for proof in proofs if isinstance(proof, PathsProof)]
    parts = []
    if names - CURRENTS - {"path"}:
        parts.append(theorem_sums.observables(paper))
    if "parameter" in names or any(isinstance(proof, CoefficientsProof) for proof in proofs):
        parts.append(theorem_sums.sums_over_trees(paper))
        parts += [theorem_sums.energies(paper)] if names & ENERGIES else []
        parts += [theorem_sums.drives(paper)] if names & DRIVES else []
    if edges or cuts:
        parts += _ends(paper, names, edges, cuts)
    if any(isinstance(proof, TransportProof) for proof in proofs):
        parts.append(theorem_sums.bundles(paper))
    if "parameter" in names:
        parts.append(theorem_sums.parameters(paper, bool(edges)))
    if paths:
        parts += [theorem_sums.paths(paper), paths_data(paper, paths)]
    return parts


def _ends(
    paper: Paper, names: set[str], edges: Sequence[EdgeProof], cuts: Sequence[SplittingProof]
) -> list[str]:
    """Return what follows from the two ends of a transition."""
    used = [*(proof.transition for proof in edges), *(proof.transition for proof in cuts)]
    one_way = any(paper.analysis.graph.one_way[e] for e in used)
    barriers = bool(names & (BY_BARRIER | FINITE)) or bool(edges and "parameter" in names)
    local = bool(names & LOCAL)
    parts = [theorem_ends.theorem(paper, one_way)]
    parts += [theorem_ends.mixtures(paper)] if barriers or local or cuts else []
    parts += [theorem_ends.shares(paper)] if barriers or local else []
    parts += [theorem_ends.barrier(paper)] if barriers else []
    parts += [theorem_ends.finite(paper)] if names & FINITE else []
    parts += [theorem_ends.local(paper)] if local else []
    parts += [theorem_ends.second(paper)] if "second-order" in names else []
    if barriers or local:
        parts += [theorem_ends.cycles(paper), cycles_data(paper, edges)]
    if cuts:
        parts += [theorem_ends.splittings(paper), splittings_data(paper, cuts)]
    if names & CURRENTS:
        parts.append(theorem_sums.currents(paper))
    return parts


# -- what is proved by what ----------------------------------------------------------------------


def _listing(paper: Paper, proved: Sequence[tuple[Bounded, Proved]]) -> str:
    """Return the table of responses, inequalities and proofs, equal rows put together."""
    forms = {form_of(proof) for _, found in proved for proof in found.proofs} - {None}
    alike: dict[tuple[tuple[str, str], ...], list[str]] = {}
    for entry, found in proved:
        rows = tuple(_rows(paper, found, len(forms) > 1))
        alike.setdefault(rows, []).append(shown(paper, entry))
    lines: list[list[str]] = []
    for rows, names in alike.items():
        lines += [[", ".join(names) if row == rows[0] else "", *row] for row in rows]
    columns = (Column("Quantity", "wrap"), Column("Limited", "wrap", "limited "),
               Column("Proof", "wrap", "proof: "))
    return ("\\subsection{What is proved}\n" + _forms(forms)
            + table(paper.page, columns, lines))


def _rows(paper: Paper, found: Proved, marked: bool) -> list[tuple[str, str]]:
    """Return what limits a response, and the proof, for all that have the same proof."""
    by_proofs: dict[tuple[Proof, ...], list[Claim]] = {}
    for claim, needs in zip(found.claims, found.needs, strict=True):
        by_proofs.setdefault(needs, []).append(claim)
    rows = []
    for needs, claims in by_proofs.items():
        words = "; ".join(WORDS[claim.name] for claim in claims)
        proofs = [*(_words(paper, proof, marked) for proof in needs), _equations(needs, claims)]
        rows.append((words, "; ".join(proofs)))
    return rows


def _equations(needs: Sequence[Proof], claims: Sequence[Claim]) -> str:
    """Return references to the equations that inequalities follow from."""
    every = dict.fromkeys(label for claim in claims for label in EQUATIONS[claim.name])
    if any(isinstance(proof, CoefficientsProof) for proof in needs):
        every = {"trees" if label == "bundle" else label: None for label in every}
    noun = "Eq." if len(every) == 1 else "Eqs."
    return f"{noun}~" + ", ".join(rf"\eqref{{eq:{label}}}" for label in every)


def _forms(forms: set[str | None]) -> str:
    """Return what the check of a proof relies on, a sentence for each form there is."""
    several = len(forms) > 1
    texts = []
    if "expanded" in forms:
        texts.append(("Proofs marked as expanded are" if several else "The proofs are")
                     + " checked for this network without the theorem: the identities are "
                       "multiplied out term by term from the list of all spanning trees.")
    if "compact" in forms:
        texts.append(("The others rely" if several else "The check of the proofs relies")
                     + " on the theorem, and the identities are tried at a random point modulo "
                       "$2^{61} - 1$.")
    return " ".join(texts) + "\n" * bool(texts)


def _words(paper: Paper, proof: Proof, marked: bool) -> str:
    """Return a proof in a few words; ``marked``: whether to say that one is expanded."""
    notation = paper.notation
    match proof:
        case EdgeProof(e):
            text = f"ends of ${notation.transitions[e]}$"
        case SplittingProof(e):
            text = f"splittings of ${notation.transitions[e]}$"
        case CoefficientsProof(low, high):
            text = f"sums from ${fraction_latex(low)}$ to ${fraction_latex(high)}$"
        case PathsProof(start, goal):
            text = f"paths from ${notation.states[start]}$ to ${notation.states[goal]}$"
        case TransportProof(transitions):
            listed = ",$ $".join(notation.transitions[e] for e in transitions)
            text = rf"matching for $\{{{listed}\}}$"
    return text + (" (expanded)" if marked and form_of(proof) == "expanded" else "")


def _file(paper: Paper, file: str | None, record: str | None) -> str:
    """Return where the data of the proofs is, and how to check it."""
    if file is None:
        return ""
    text = rf"""The data of these proofs stand in a file beside this text. Either of
\begin{{flushleft}}
{typed("symbolic-response recheck")} {typed(file)}\\
{typed("python -I -S symbolic_response/checker")} {typed(file)}
\end{{flushleft}}
checks all of it; the second one shares no code with the program that made this text."""
    if record is not None:
        digest = hashlib.sha256(record.encode()).hexdigest()
        text += (" Its SHA-256 is\n\\begin{flushleft}\n" + digest_latex(digest)
                 + "\n\\end{flushleft}")
    return text


def _without(paper: Paper, made: Sequence[tuple[Bounded, Proved]]) -> str:
    """Return what has no proof, with the reasons."""
    reasons: dict[str, dict[str, list[str]]] = {}
    for entry, found in made:
        for claim, why in found.without:
            listed = reasons.setdefault(why, {}).setdefault(shown(paper, entry), [])
            listed.append(WORDS[claim.name])
    items = []
    for why, names in reasons.items():
        texts = [f"{name} limited {', '.join(words)}" for name, words in names.items()]
        items.append(rf"\item {'; '.join(texts)}: {escaped(why)}.")
    if not items:
        return ""
    return ("Not proved here for all rates, with the reason, are:\n\\begin{itemize}\n"
            + "\n".join(items) + "\n\\end{itemize}")
