"""The verbs about control parameters: steepness, curve, cloud."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING

import click

from symbolic_response.cli.options import (
    analysis_of,
    json_option,
    network_argument,
    quiet_option,
    read,
)
from symbolic_response.errors import AssignmentError, ExpressionError, OutputError
from symbolic_response.progress import Progress

if TYPE_CHECKING:
    from symbolic_response.control.curve_data import CurveData
    from symbolic_response.expressions.tree import Expression

at_option = click.option("--at", multiple=True, metavar="SYMBOL=VALUE",
                         help="Give another symbol an exact value.")
output_option = click.option("-o", "--output", multiple=True, type=click.Path(), metavar="FILE",
                             help="Write a file, by its suffix; may be repeated.")
columns_option = click.option("--columns", type=click.Choice(["single", "double"]),
                              default="single", show_default=True, help="Width of the figure.")


@click.command(short_help="How steep a response to a parameter can be, and is.")
@network_argument
@click.argument("observable")
@click.argument("parameter")
@at_option
@click.option("--from", "low", metavar="VALUE", help="Where the parameter begins (default: open).")
@click.option("--to", "high", metavar="VALUE", help="Where it ends (default: open).")
@click.option("--measured", metavar="H", help="A measured steepness, to be read backwards.")
@json_option
@quiet_option
def steepness(
    network: str,
    observable: str,
    parameter: str,
    at: tuple[str, ...],
    low: str | None,
    high: str | None,
    measured: str | None,
    as_json: bool,
    quiet: bool,
) -> int:
    """Limit the steepness of an observable in a parameter for all rates: abs(d q/d ln x) is at most
    H q (1 - q), H the least sum of energies, bundles, drives and sets of rates.

    With --at for every other symbol also the actual sensitivity as an exact function of the
    parameter, and where it is largest.

    \b
    Example:
      symbolic-response steepness net.toml "mean[open]" c
    """
    from symbolic_response.control.report import steepness_data, steepness_text
    from symbolic_response.control.result import steepness as find
    from symbolic_response.response.deriving import read_assignments

    values = read_assignments(at, "--at")
    first, last = _value(low, "--from"), _value(high, "--to")
    h = _fraction(measured, "--measured")
    with Progress(quiet) as progress:
        progress.stage(f"steepness of {observable} in {parameter}")
        found = find(analysis_of(read(network), progress), observable, parameter, values,
                     low=first, high=last, measured=h)
    click.echo(json.dumps(steepness_data(found), indent=1) if as_json else steepness_text(found))
    return 0


@click.command(short_help="The response curve of a parameter: table and figure.")
@network_argument
@click.argument("observable")
@click.argument("parameter")
@at_option
@click.option("--from", "low", required=True, metavar="VALUE", help="Where the curve begins.")
@click.option("--to", "high", required=True, metavar="VALUE", help="Where it ends.")
@click.option("--points", type=click.IntRange(min=2), default=200, show_default=True, metavar="N",
              help="Exact points, even in ln of a positive parameter.")
@output_option
@columns_option
@json_option
@quiet_option
def curve(
    network: str,
    observable: str,
    parameter: str,
    at: tuple[str, ...],
    low: str,
    high: str,
    points: int,
    output: tuple[str, ...],
    columns: str,
    as_json: bool,
    quiet: bool,
) -> int:
    """Follow an observable in a parameter: the exact curve, the steepest one that the network
    allows, that without forces, the sensitivity under its limits.

    FILE is .csv (table), .pdf, .png or .svg (figure) or .tex (the figure for pgfplots). Without -o
    the table goes to standard output.

    \b
    Example:
      symbolic-response curve net.toml "mean[open]" c --at k=1 --from 1/100 --to 100 -o open.pdf
    """
    from symbolic_response.control.curve_data import curve_csv
    from symbolic_response.control.report import curve_data_json
    from symbolic_response.control.response_curve import response_curve
    from symbolic_response.figures.curve import curve_figure
    from symbolic_response.response.deriving import read_assignments

    _check_outputs(network, output, (".csv", ".tex"))
    values = read_assignments(at, "--at")
    first, last = _value(low, "--from"), _value(high, "--to")
    assert first is not None and last is not None
    described = read(network)
    with Progress(quiet) as progress:
        progress.stage(f"curve of {observable}")
        data = response_curve(analysis_of(described, lambda done, total: None), observable,
                              parameter, values, low=first, high=last, count=points,
                              progress=progress)
        table = curve_csv(data)
        _write(output, {".csv": lambda: table, ".tex": lambda: _pgfplots(data)},
               lambda path: curve_figure(data, path, columns))
    _say(output, table, as_json, lambda: {
        "network": described.title, "observable": observable, "parameter": data.parameter,
        **curve_data_json(data)})
    return 0


@click.command(short_help="Responses to a barrier at many sampled rates, under their envelope.")
@network_argument
@click.argument("response")
@click.option("--points", type=click.IntRange(min=1), default=2000, show_default=True, metavar="N",
              help="Exact points.")
@click.option("--seed", default="0", show_default=True, metavar="TEXT",
              help="Any text; the same text draws the same points.")
@click.option("--workers", type=click.IntRange(min=1), metavar="N",
              help="Use N processes (default: all cores).")
@output_option
@columns_option
@json_option
@quiet_option
def cloud(
    network: str,
    response: str,
    points: int,
    seed: str,
    workers: int | None,
    output: tuple[str, ...],
    columns: str,
    as_json: bool,
    quiet: bool,
) -> int:
    """Draw the normalised response to a barrier at sampled rates against the largest cycle force,
    under its envelope tanh(F/4); each point is exact.

    FILE is .csv (table), .pdf, .png or .svg (figure). Without -o the table goes to standard output.

    \b
    Example:
      symbolic-response cloud net.toml "d ln(p[A]/p[B]) / d barrier[bind]" -o cloud.pdf
    """
    from symbolic_response.control.cloud import cloud as sample
    from symbolic_response.control.cloud import cloud_csv
    from symbolic_response.control.report import cloud_json
    from symbolic_response.figures.cloud import cloud_figure

    _check_outputs(network, output, (".csv",))
    described = read(network)
    with Progress(quiet) as progress:
        progress.stage(f"sampling {response}")
        data = sample(analysis_of(described, lambda done, total: None), response, points, seed,
                      workers, progress)
        table = cloud_csv(data)
        _write(output, {".csv": lambda: table}, lambda path: cloud_figure(data, path, columns))
    if data.skipped is not None and not quiet:
        click.echo(f"no points near the envelope are constructed: {data.skipped}", err=True)
    _say(output, table, as_json, lambda: {
        "network": described.title, "response": response, **cloud_json(data)})
    return 0


def _pgfplots(data: CurveData) -> str:
    from symbolic_response.appendix.escape import escaped
    from symbolic_response.figures.pgfplots import curve_pgfplots

    return curve_pgfplots(data, escaped)


def _value(text: str | None, option: str) -> Expression | None:
    """Return the constant that an option gives."""
    from symbolic_response.expressions.reader import read_expression
    from symbolic_response.expressions.tree import symbols_of

    if text is None:
        return None
    try:
        value = read_expression(text)
    except ExpressionError as error:
        raise AssignmentError(f"{option} {text[:60]!r}: {error}") from None
    if symbols_of(value):
        raise AssignmentError(f"{option} {text}: write an exact value without symbols, such as 3/7")
    return value


def _fraction(text: str | None, option: str) -> Fraction | None:
    """Return the rational number that an option gives."""
    from symbolic_response.expressions.tree import Number

    value = _value(text, option)
    if value is None or isinstance(value, Number):
        return None if value is None else value.value
    raise AssignmentError(f"{option} {text}: write a number such as 3/2 or 1.5")


def _check_outputs(network: str, output: tuple[str, ...], texts: tuple[str, ...]) -> None:
    """Refuse at once what cannot be written."""
    from symbolic_response.files import check_output

    for path in output:
        if Path(path).suffix.lower() not in (*texts, ".pdf", ".png", ".svg"):
            raise OutputError(f"{path!r}: write {', '.join(texts)}, .pdf, .png or .svg")
        check_output(path, network)


def _write(
    output: tuple[str, ...],
    texts: dict[str, Callable[[], str]],
    draw: Callable[[str], None],
) -> None:
    """Write all files or, where one cannot be written, none."""
    from symbolic_response.files import write_files

    contents: dict[Path, str | bytes] = {}
    with tempfile.TemporaryDirectory() as folder:
        for path in map(Path, output):
            suffix = path.suffix.lower()
            if suffix in texts:
                contents[path] = texts[suffix]()
            else:
                drawn = Path(folder) / f"figure{suffix}"
                draw(str(drawn))
                contents[path] = drawn.read_bytes()
    if contents:
        write_files(contents)


def _say(
    output: tuple[str, ...], table: str, as_json: bool, data: Callable[[], dict[str, object]]
) -> None:
    if as_json:
        click.echo(json.dumps({**data(), "files": list(output)}, indent=1))
    elif output:
        click.echo("\n".join(f"wrote {path}" for path in output))
    else:
        click.echo(table, nl=False)
