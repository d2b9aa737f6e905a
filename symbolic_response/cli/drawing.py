"""The verb about diagrams: draw."""

from __future__ import annotations

import json

import click

from symbolic_response.cli.options import (
    analysis_of,
    json_option,
    network_argument,
    quiet_option,
    read,
)
from symbolic_response.progress import Progress

KINDS = ("network", "cycles", "trees", "splittings", "forests")


@click.command(short_help="Diagrams: the network, its cycles, trees, splittings, forests.")
@network_argument
@click.option("-o", "--output", "outputs", multiple=True, required=True, type=click.Path(),
              metavar="FILE.tex|FILE.pdf|FILE.svg", help="The file to write; may be repeated.")
@click.option("--what", type=click.Choice(KINDS), default="network", show_default=True,
              help="What to draw.")
@click.option("--transition", metavar="NAME",
              help="Set off this transition; splittings and forests need one.")
@click.option("--root", metavar="STATE", help="Trees towards this state only; forests need one.")
@click.option("--letters", type=click.Choice(["rate", "generator"]),
              help="Letters for rates, instead of the expressions of the file.")
@click.option("--width", type=click.FloatRange(min=40, max=2000), default=345.0,
              show_default=True, metavar="PT", help="The width of the text it goes into.")
@click.option("--limit", type=click.IntRange(min=1), default=32, show_default=True, metavar="N",
              help="Draw up to N small pictures, beyond that an example.")
@json_option
@quiet_option
def draw(
    network: str,
    outputs: tuple[str, ...],
    what: str,
    transition: str | None,
    root: str | None,
    letters: str | None,
    width: float,
    limit: int,
    as_json: bool,
    quiet: bool,
) -> int:
    """Draw the network with its rates, or its cycles, spanning trees, splittings or forests.

    FILE.tex is a small document of one page (pictures in TikZ); a .pdf needs
    pdflatex, an .svg nothing.

    \b
    Examples:
      symbolic-response draw net.toml -o net.svg
      symbolic-response draw net.toml --what trees --root A -o trees.pdf
      symbolic-response draw net.toml --what splittings --transition bind -o splittings.tex
    """
    from symbolic_response.figures.diagrams import write_drawing
    from symbolic_response.files import check_output

    for output in outputs:
        check_output(output, network)
    with Progress(quiet) as progress:
        analysis = analysis_of(read(network), progress)
        for output in outputs:
            progress.stage(f"drawing {output}")
            drawing = write_drawing(
                analysis, output, what=what, transition=transition, root=root, width=width,
                limit=limit, letters=letters, expressions=letters is None,
            )
    counted = f": {drawing.shown} of {drawing.total} shown" if drawing.shown < drawing.total else ""
    if as_json:
        click.echo(json.dumps({"files": list(outputs), "what": what, "shown": drawing.shown,
                               "total": drawing.total}))
    else:
        click.echo("\n".join(f"wrote {output}{counted}" for output in outputs), err=True)
    return 0
