"""The verb that exports: functions and data for use elsewhere."""

from __future__ import annotations

import json

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
from symbolic_response.progress import Progress


@click.command(short_help="Python functions or JSON data of the results.")
@network_argument
@click.argument("quantities", nargs=-1, metavar="[QUANTITY]...")
@click.option("-o", "--output", multiple=True, required=True, type=click.Path(),
              metavar="FILE.py|FILE.json", help="Write a file, by its suffix; may be repeated.")
@json_option
@quiet_option
@trees_option
@terms_option
def export(
    network: str,
    quantities: tuple[str, ...],
    output: tuple[str, ...],
    as_json: bool,
    quiet: bool,
    trees: int | None,
    terms: int | None,
) -> int:
    """Write the results for use elsewhere.

    FILE.py is a Python module that needs nothing else: rates, steady state and a
    function for each quantity, for fractions (exact), floats and NumPy arrays.
    FILE.json holds network, cycles, closed forms and exact values as data.
    Quantities default to those of [appendix], or to a bounded choice.

    \b
    Example:
      symbolic-response export net.toml "d p[A] / d ln c" -o net.py -o net.json
    """
    from symbolic_response.export.writing import check_paths, export_files

    check_paths(output, network)
    described = read(network)
    with Progress(quiet) as progress:
        progress.stage("exporting")
        analysis = analysis_of(described, progress, trees, terms)
        files = export_files(analysis, output, list(quantities) or None)
    if as_json:
        data = {"network": described.title, "files": [str(file) for file in files]}
        click.echo(json.dumps(data, indent=1))
    else:
        click.echo("\n".join(f"wrote {file}" for file in files), err=True)
    return 0
