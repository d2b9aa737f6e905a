"""The command line: verbs, progress, exit status. No mathematics.

Exit status: 0 done; 1 something was refuted; 2 the input cannot be used; 3 undecided or beyond a
size limit; 130 interrupted.
"""

from __future__ import annotations

import contextlib
import json
import os
import sys
from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import click

from symbolic_response.errors import (
    InputError,
    RefutedError,
    SizeLimitError,
    SymbolicResponseError,
    UndecidedError,
)
from symbolic_response.progress import Progress

if TYPE_CHECKING:
    from symbolic_response.network.model import Network
    from symbolic_response.response.analysis import Analysis
    from symbolic_response.response.deriving import Derived

REFUTED, UNUSABLE, UNDECIDED, INTERRUPTED = 1, 2, 3, 130
MAX_MESSAGE = 700

_json = click.option("--json", "as_json", is_flag=True, help="One JSON object on standard output.")
_quiet = click.option("--quiet", is_flag=True, help="No progress on standard error.")
_trees = click.option("--trees", type=click.IntRange(min=1), metavar="N",
                      help="Enumerate up to N rooted spanning trees (default 2000000).")
_terms = click.option("--terms", type=click.IntRange(min=1), metavar="N",
                      help="Expand polynomials up to N terms (default 200000).")
_network = click.argument("network", type=click.Path())


class _InterruptedError(Exception):
    """The user pressed Ctrl-C."""


class _Verbs(click.Group):
    """A group whose interruption is one line of our own; click adds an empty one."""

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except KeyboardInterrupt:
            if sys.stderr.isatty():
                click.echo(err=True)  # past the ^C
            raise _InterruptedError from None


def run(arguments: Sequence[str]) -> int:
    """Run one command; return the exit status."""
    try:
        status = main.main(args=list(arguments), prog_name="symbolic-response",
                           standalone_mode=False)
        return int(status or 0)
    except click.exceptions.NoArgsIsHelpError as error:
        click.echo(error.ctx.get_help() if error.ctx else "", err=True)
        return UNUSABLE
    except click.NoSuchOption as error:
        hint = "; a quantity that begins with - stands in parentheses" if error.ctx and (
            error.ctx.info_name == "derive") else ""
        return _fail(error.format_message() + hint, UNUSABLE)
    except click.ClickException as error:
        return _fail(error.format_message(), UNUSABLE)
    except InputError as error:
        return _fail(str(error), UNUSABLE)
    except (SizeLimitError, UndecidedError) as error:
        return _fail(str(error), UNDECIDED)
    except RefutedError as error:
        return _fail(str(error), REFUTED)
    except SymbolicResponseError as error:
        return _fail(str(error), UNUSABLE)
    except (_InterruptedError, KeyboardInterrupt, click.Abort):
        return _fail("interrupted", INTERRUPTED)
    except MemoryError:
        return _fail("out of memory: the network is too large for a closed form; exact values with"
                     " --at still work", UNDECIDED)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except OSError as error:
        place = f"{error.filename}: " if error.filename else ""
        return _fail(f"{place}{(error.strerror or str(error)).lower()}", UNUSABLE)


def _fail(message: str, status: int) -> int:
    line = " ".join(message.split())
    if len(line) > MAX_MESSAGE:
        line = f"{line[: MAX_MESSAGE - 100]} ... {line[-100:]}"
    with contextlib.suppress(OSError):
        click.echo(f"error: {line}", err=True)
    return status


@click.group(
    cls=_Verbs, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100}
)
@click.version_option(package_name="symbolic-response", message="%(version)s")
def main() -> None:
    """Exact steady states and responses of small driven kinetic networks.

    NETWORK is a network file (TOML); its format is in the README.
    """


@main.command(short_help="What was read: states, trees, cycles, forces, splittings.")
@_network
@_json
@_quiet
def survey(network: str, as_json: bool, quiet: bool) -> int:
    """Say what was read: states, trees, cycles and their forces, splittings.

    \b
    Example:
      symbolic-response survey worked_cases/rectifier/network.toml
    """
    from symbolic_response.response.survey import survey as make_survey
    from symbolic_response.response.survey import survey_data, survey_text

    with Progress(quiet) as progress:
        progress.stage("surveying the network")
        result = make_survey(_analysis(_read(network), progress))
    click.echo(json.dumps(survey_data(result), indent=1) if as_json else survey_text(result))
    if result.beyond:
        return _fail("beyond a limit: " + "; ".join(result.beyond), UNDECIDED)
    return 0


@main.command(short_help="Closed forms and exact values of quantities and responses.")
@_network
@click.argument("quantities", nargs=-1, required=True, metavar="QUANTITY...")
@click.option("--at", multiple=True, metavar="SYMBOL=VALUE",
              help="Give a symbol an exact value, such as 3/7 or ln(3/2); may be repeated.")
@click.option("--set", "put", multiple=True, metavar="SYMBOL=EXPRESSION",
              help="Put an expression in the place of a symbol first; may be repeated.")
@_json
@_quiet
@_trees
@_terms
def derive(
    network: str,
    quantities: tuple[str, ...],
    at: tuple[str, ...],
    put: tuple[str, ...],
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
    """
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
    described = _read(network)
    asked = [(text, read_quantity(text, described)) for text in quantities]
    if changes:
        asked = [(text, replaced(quantity, changes, text)) for text, quantity in asked]
        described = with_substitution(described, changes)
        check_not_replaced(values, changes, described)
    results = []
    with Progress(quiet) as progress:
        analysis = _analysis(described, progress, trees, terms)
        for text, quantity in asked:
            progress.stage(f"deriving {text}")
            results.append(derive_quantity(analysis, quantity, text, values))
    if as_json:
        data = {"network": described.title, "results": [_derived_data(r) for r in results]}
        click.echo(json.dumps(data, indent=1))
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
    return line


@main.command(short_help="The inequalities that limit a response, with their data.")
@_network
@click.argument("response")
@click.option("--at", multiple=True, metavar="SYMBOL=VALUE",
              help="Give a symbol an exact value; every symbol needs one, or none has.")
@_json
@_quiet
def bound(network: str, response: str, at: tuple[str, ...], as_json: bool, quiet: bool) -> int:
    """Say which inequalities limit a response, what in the network sets the limit, and the source.

    With --at both sides are evaluated and the verdict is exact.

    \b
    Example:
      symbolic-response bound net.toml "d ln(p[A]/p[B]) / d barrier[bind]"
    """
    from symbolic_response.bounds.report import bound as make_report
    from symbolic_response.bounds.report import report_data, report_text
    from symbolic_response.response.deriving import read_assignments

    values = read_assignments(at, "--at")
    with Progress(quiet) as progress:
        progress.stage(f"bounding {response}")
        report = make_report(_analysis(_read(network), progress), response, values)
    click.echo(json.dumps(report_data(report), indent=1) if as_json else report_text(report))
    if report.refuted():
        return REFUTED
    return UNDECIDED if report.undecided() else 0


@main.command(short_help="Certificates that inequalities hold, and how tight they are.")
@_network
@click.argument("response")
@click.option("--bound", "only", metavar="NAME", help="Only the inequality of this name.")
@click.option("--points", type=click.IntRange(min=1), default=1000, show_default=True, metavar="N",
              help="Sample N exact points.")
@click.option("--seed", default="0", show_default=True, metavar="TEXT",
              help="Any text; the same text draws the same points.")
@click.option("--workers", type=click.IntRange(min=1), metavar="N",
              help="Use N processes (default: all cores).")
@click.option("-o", "--output", type=click.Path(), metavar="FILE", help="Write the certificate.")
@_json
@_quiet
def certify(
    network: str,
    response: str,
    only: str | None,
    points: int,
    seed: str,
    workers: int | None,
    output: str | None,
    as_json: bool,
    quiet: bool,
) -> int:
    """Try every inequality that limits a response at many exact points, and where it is tight.

    \b
    Example:
      symbolic-response certify net.toml "d p[A] / d barrier[bind]" -o bind.json
    """
    from symbolic_response.certificates.certify import certify as make_certificate
    from symbolic_response.certificates.record import check_output, write_certificate
    from symbolic_response.certificates.report import certificate_data, certificate_text

    if output is not None:
        check_output(output)
    with Progress(quiet) as progress:
        progress.stage(f"certifying {response}")
        analysis = _analysis(_read(network), lambda done, total: None)
        made = make_certificate(analysis, response, only=only, count=points, seed=seed,
                                workers=workers, progress=progress)
    written = output if made.refuted is None else None
    if written is not None:
        write_certificate(made, analysis, written)
    if as_json:
        click.echo(json.dumps(certificate_data(made, written), indent=1))
    elif made.refuted is None:
        click.echo(certificate_text(made, written))
    return 0 if made.refuted is None else _fail(made.refuted.message(), REFUTED)


@main.command(short_help="The independent check of certificates.")
@click.argument("files", nargs=-1, required=True, metavar="FILE...", type=click.Path())
@_json
def recheck(files: tuple[str, ...], as_json: bool) -> int:
    """Check certificates independently of the code that wrote them.

    \b
    Each FILE is valid, invalid (exit status 1), malformed or unreadable (2),
    or beyond a size limit (3); of several the first of 1, 2, 3 counts.

    \b
    Example:
      symbolic-response recheck certificate.json
    """
    from symbolic_response.checker import check_file, exit_status

    verdicts = []
    for path in files:
        verdicts.append(check_file(path))
        if not as_json:
            click.echo(" ".join(f"{path}: {verdicts[-1]}".split()))
    if as_json:
        results = [{"file": path, **verdict.data()}
                   for path, verdict in zip(files, verdicts, strict=True)]
        click.echo(json.dumps({"results": results}, indent=1))
    return exit_status(verdicts)


@main.command(short_help="A complete LaTeX document.")
@_network
@click.option("-o", "--output", required=True, type=click.Path(), metavar="FILE.tex",
              help="The LaTeX file to write.")
@_json
@_quiet
@_trees
@_terms
def appendix(
    network: str,
    output: str,
    as_json: bool,
    quiet: bool,
    trees: int | None,
    terms: int | None,
) -> int:
    """Write a complete LaTeX document: model, cycles, trees, steady state, results.

    The [appendix] section of the network file chooses the quantities.

    \b
    Example:
      symbolic-response appendix worked_cases/rectifier/network.toml -o rectifier.tex
    """
    from symbolic_response.appendix import write_appendix

    described = _read(network)
    with Progress(quiet) as progress:
        progress.stage("writing the appendix")
        analysis = _analysis(described, progress, trees, terms)
        write_appendix(described, output, analysis=analysis)
    if as_json:
        click.echo(json.dumps({"network": described.title, "file": output}))
    else:
        click.echo(f"wrote {output}", err=True)
    return 0


def _read(path: str) -> Network:
    from symbolic_response.network.toml_reader import read_network

    return read_network(path)


def _analysis(
    network: Network,
    progress: Callable[[int, int], None],
    trees: int | None = None,
    terms: int | None = None,
) -> Analysis:
    from symbolic_response.response.analysis import TERM_LIMIT, TREE_LIMIT
    from symbolic_response.response.analysis import Analysis as Analysis_

    return Analysis_(
        network,
        tree_limit=trees or TREE_LIMIT,
        term_limit=terms or TERM_LIMIT,
        progress=progress,
    )
