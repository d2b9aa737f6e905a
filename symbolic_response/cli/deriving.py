"""The verbs that derive: survey, derive, appendix."""

from __future__ import annotations

import json
from pathlib import Path
from typing import TYPE_CHECKING, Any

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
from symbolic_response.cli.status import UNDECIDED, fail
from symbolic_response.progress import Progress

if TYPE_CHECKING:
    from symbolic_response.response.deriving import Derived


@click.command(short_help="What was read: states, trees, cycles, forces, splittings.")
@network_argument
@json_option
@quiet_option
def survey(network: str, as_json: bool, quiet: bool) -> int:
    """Say what was read: states, trees, cycles and their forces, splittings.

    \b
    Example:
      symbolic-response survey worked_cases/turnstile/network.toml
    """
    from symbolic_response.response.survey import survey as make_survey
    from symbolic_response.response.survey import survey_data, survey_text

    with Progress(quiet) as progress:
        progress.stage("surveying the network")
        result = make_survey(analysis_of(read(network), progress))
    click.echo(json.dumps(survey_data(result), indent=1) if as_json else survey_text(result))
    if result.beyond:
        return fail("beyond a limit: " + "; ".join(result.beyond), UNDECIDED)
    return 0


@click.command(short_help="Closed forms and exact values of quantities and responses.")
@network_argument
@click.argument("quantities", nargs=-1, required=True, metavar="QUANTITY...")
@click.option("--at", multiple=True, metavar="SYMBOL=VALUE",
              help="Give a symbol an exact value, such as 3/7 or ln(3/2); may be repeated.")
@click.option("--set", "put", multiple=True, metavar="SYMBOL=EXPRESSION",
              help="Put an expression in the place of a symbol first; may be repeated.")
@click.option("--latex", "as_latex", is_flag=True,
              help="One formula a line, LEFT = RIGHT in LaTeX, and nothing else.")
@json_option
@quiet_option
@trees_option
@terms_option
def derive(
    network: str,
    quantities: tuple[str, ...],
    at: tuple[str, ...],
    put: tuple[str, ...],
    as_latex: bool,
    as_json: bool,
    quiet: bool,
    trees: int | None,
    terms: int | None,
) -> int:
    """Derive quantities and responses in closed form, or their exact values.

    \b
    Quantities: p[A]  p[A, B]  mean[name]  current[e]  traffic[e]  forward[e]
      backward[e]  entropy_production, and expressions of them and of symbols.
    Responses: d QUANTITY / d PERTURBATION with energy[A], barrier[e],
      drive[e], a symbol, or ln of a positive symbol.

    \b
    Examples:
      symbolic-response derive net.toml "p[A]" "d p[A] / d ln c"
      symbolic-response derive net.toml "current[bind]" --at c=3/7 --at k=2
      symbolic-response derive net.toml "mean[bound]" --latex
    """
    if as_json and as_latex:
        raise click.UsageError("choose --json or --latex, not both; --json holds LaTeX too")
    from symbolic_response.network.quantity_reader import read_quantity
    from symbolic_response.network.substitution import with_substitution
    from symbolic_response.response.deriving import (
        check_not_replaced,
        derive_quantity,
        read_assignments,
        replaced,
    )

    changes = read_assignments(put, "--set")
    values = read_assignments(at, "--at")
    described = read(network)
    asked = [(text, read_quantity(text, described)) for text in quantities]
    if changes:
        asked = [(text, replaced(quantity, changes, text)) for text, quantity in asked]
        described = with_substitution(described, changes)
        check_not_replaced(values, changes, described)
    results = []
    with Progress(quiet) as progress:
        analysis = analysis_of(described, progress, trees, terms)
        for text, quantity in asked:
            progress.stage(f"deriving {text}")
            results.append(derive_quantity(analysis, quantity, text, values))
    if as_json:
        data = {"network": described.title, "results": [_derived_data(r) for r in results]}
        click.echo(json.dumps(data, indent=1))
    elif as_latex:
        from symbolic_response.response.notation import notation_of
        from symbolic_response.response.quantity_latex import quantity_in

        notation = notation_of(described)
        click.echo("\n".join(f"{quantity_in(notation, quantity)} = {result.latex}"
                             for (_, quantity), result in zip(asked, results, strict=True)))
    else:
        click.echo("\n".join(_derived_text(result) for result in results))
    return 0


def _derived_data(result: Derived) -> dict[str, Any]:
    from symbolic_response.expressions.text import fraction_text

    data: dict[str, Any] = {"quantity": result.quantity, "expression": result.expression,
                            "latex": result.latex, "value": None}
    if result.value is not None:
        exact = result.value.exact
        data["value"] = str(result.value) if exact is None else fraction_text(exact)
        if result.value.enclosure is not None:
            data["enclosure"] = list(result.value.enclosure)
    return data


def _derived_text(result: Derived) -> str:
    line = f"{result.quantity} = {result.expression}"
    if result.value is not None and result.value.enclosure is not None:
        low, high = result.value.enclosure
        line += f"\n  between {low}\n      and {high}"
    elif result.value is not None and result.value.exact is not None:
        from symbolic_response.bounds.report import LONG, about
        from symbolic_response.expressions.enclosure import decimal_enclosure

        if len(result.expression) > LONG:
            line += f"\n  about {about(decimal_enclosure(result.value.expression))}"
    return line


@click.command(short_help="A complete LaTeX document, or a fragment for a paper.")
@network_argument
@click.option("-o", "--output", required=True, type=click.Path(), metavar="FILE.tex",
              help="The LaTeX file to write.")
@click.option("--class", "document_class", metavar="article|revtex", help="Class (article).")
@click.option("--columns", type=int, metavar="1|2", help="Columns of the page (1).")
@click.option("--size", type=int, metavar="10|11|12", help="Size of the type in article (10).")
@click.option("--fragment", is_flag=True, default=None,
              help="A file to \\input into a paper: no preamble, its sources in FILE.bib.")
@click.option("--prefix", metavar="NAME",
              help="What labels and citations begin with (in a fragment the name of the file).")
@click.option("--bibtex", is_flag=True, default=None, help="Write the sources to FILE.bib too.")
@json_option
@quiet_option
@trees_option
@terms_option
def appendix(
    network: str,
    output: str,
    document_class: str | None,
    columns: int | None,
    size: int | None,
    fragment: bool | None,
    prefix: str | None,
    bibtex: bool | None,
    as_json: bool,
    quiet: bool,
    trees: int | None,
    terms: int | None,
) -> int:
    """Write a complete LaTeX document: model, cycles, trees, steady state,
    results, bounds with their proofs.

    The [appendix] section of the network file chooses the quantities, and the class,
    columns, size, fragment and bibtex where no option does. The data of the proofs is
    written to FILE.proofs.json, which recheck takes.

    \b
    Examples:
      symbolic-response appendix worked_cases/turnstile/network.toml -o turnstile.tex
      symbolic-response appendix net.toml -o net.tex --class revtex --columns 2 --fragment
    """
    from symbolic_response.appendix import Layout, write_appendix

    layout = Layout(document_class, columns, size, None, fragment, prefix, bibtex)

    described = read(network)
    with Progress(quiet) as progress:
        progress.stage("writing the appendix")
        analysis = analysis_of(described, progress, trees, terms)
        made = write_appendix(described, output, analysis=analysis, layout=layout)
    files = [str(file) for file in made]
    proofs = next((file for file in files if file.endswith(".proofs.json")), None)
    sources = next((file for file in files if file.endswith(".bib")), None)
    older = Path(output).with_suffix(".proofs.json")
    if proofs is None and older.exists():
        click.echo(f"note: {older} is of an earlier run; this document has no proofs", err=True)
    if as_json:
        click.echo(json.dumps({"network": described.title, "file": output, "proofs": proofs,
                               "sources": sources}))
    else:
        click.echo("\n".join(f"wrote {file}" for file in files), err=True)
    return 0
