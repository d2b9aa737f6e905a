"""The verb about hand results: compare."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

import click

from symbolic_response.cli.options import (
    analysis_of,
    json_option,
    network_argument,
    quiet_option,
    read,
    terms_option,
    trees_option,
)
from symbolic_response.cli.status import REFUTED, UNDECIDED, UNUSABLE, fail
from symbolic_response.errors import EvaluationError, QuantityError
from symbolic_response.progress import Progress

if TYPE_CHECKING:
    from symbolic_response.hand.entries import HandResult
    from symbolic_response.hand.papers.document import PassedOver
    from symbolic_response.network.model import Network


@click.command(short_help="Hand results: right or wrong, and where the slip is.")
@network_argument
@click.option("--hand", "lines", multiple=True, metavar="'QUANTITY = FORMULA'",
              help="A formula, plain or LaTeX; may be repeated.")
@click.option("--tex", "papers", multiple=True, type=click.Path(), metavar="FILE.tex",
              help="Read the displayed equations of a LaTeX file; may be repeated.")
@click.option("--given", multiple=True, metavar="RELATION",
              help="A relation that may be used, such as 'k1*k2 = k3*k4'; may be repeated.")
@click.option("--table", type=click.Path(), metavar="FILE.tex",
              help="Write a LaTeX table of the formulas checked.")
@json_option
@quiet_option
@trees_option
@terms_option
def compare(
    network: str,
    lines: tuple[str, ...],
    papers: tuple[str, ...],
    given: tuple[str, ...],
    table: str | None,
    as_json: bool,
    quiet: bool,
    trees: int | None,
    terms: int | None,
) -> int:
    """Compare hand results with the derived ones: a verdict, a witness, and what went wrong.

    The formulas are those of --hand and --tex, without these the [[hand]] entries of
    the network file. Exit status: 0 all equal, 1 one differs or needs a condition,
    2 one cannot be read, 3 one is undecided.

    \b
    Examples:
      symbolic-response compare net.toml
      symbolic-response compare net.toml --hand 'p[A] = k_off/(k_off + k_on*c)'
      symbolic-response compare net.toml --tex paper.tex --table checked.tex
    """
    from symbolic_response.files import check_output
    from symbolic_response.hand.compare import compared
    from symbolic_response.hand.report import report_data, report_text

    described = read(network)
    if table is not None:
        check_output(table, network)
        for paper in papers:
            check_output(table, paper)
    asked, passed_over = _asked(described, lines, papers, given)
    with Progress(quiet) as progress:
        analysis = analysis_of(described, progress, trees, terms)
        found = []
        for hand in asked:
            progress.stage(f"comparing {hand.quantity_text}")
            try:
                found.append(compared(analysis, hand))
            except (EvaluationError, QuantityError) as error:
                passed_over.append(_without_value(hand, error))
    if table is not None:
        from symbolic_response.appendix.checked_table import write_checked

        write_checked(analysis, found, table)
    if as_json:
        click.echo(json.dumps(report_data(described.title, found, passed_over), indent=1))
    else:
        click.echo(report_text(found, passed_over))
    kinds = {one.verdict.kind for one in found}
    if kinds & {"different", "conditional"}:
        return REFUTED
    if "undecided" in kinds:
        return UNDECIDED
    unread = [one for one in passed_over if one.unread]
    if unread:
        first = unread[0]
        placed = first.reason.startswith("line ") or f":{first.line}:" in first.reason
        where = "" if placed else f"line {first.line}: "
        return fail(f"{len(unread)} of the formulas for known quantities could not be used; the"
                    f" first: {where}{first.reason}", UNUSABLE)
    return 0


def _without_value(hand: HandResult, error: Exception) -> PassedOver:
    from symbolic_response.hand.papers.document import PassedOver

    line = hand.where.rpartition(":")[2]
    return PassedOver(int(line) if line.isdigit() else 1, f"{hand.quantity_text} = {hand.formula}",
                      f"{hand.where}: {error}", unread=True)


def _asked(
    network: Network, lines: tuple[str, ...], papers: tuple[str, ...], given: tuple[str, ...]
) -> tuple[list[HandResult], list[PassedOver]]:
    """Return what is to be compared, and the displays that were passed over."""
    from dataclasses import replace

    from symbolic_response.hand.entries import read_entries, read_line
    from symbolic_response.hand.latex.names import names_of
    from symbolic_response.hand.paper_results import read_paper

    names = names_of(network)
    asked = [read_line(text, network, names, given) for text in lines]
    passed_over: list[PassedOver] = []
    for paper in papers:
        results, rest = read_paper(paper, network, names, given)
        asked += results
        passed_over += rest
    if not lines and not papers:
        asked = [replace(entry, given=(*entry.given, *given))
                 for entry in read_entries(network, names)]
        if not asked:
            raise QuantityError("the network file has no [[hand]] entries; add some, or give"
                                " formulas with --hand or --tex")
    if not asked:
        raise QuantityError(_nothing(papers, passed_over))
    return asked, passed_over


def _nothing(papers: tuple[str, ...], passed_over: list[PassedOver]) -> str:
    first = f"; the first display, line {passed_over[0].line}: {passed_over[0].reason}" \
        if passed_over else ""
    return (f"no displayed equation of {', '.join(papers)} has a known quantity on its left side"
            f"{first}")
