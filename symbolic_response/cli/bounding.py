"""The verbs about inequalities: bound, certify, recheck."""

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
from symbolic_response.cli.status import REFUTED, UNDECIDED, fail
from symbolic_response.progress import Progress


@click.command(short_help="The inequalities that limit a response, with their data.")
@network_argument
@click.argument("response")
@click.option("--bound", "only", metavar="NAME", help="Only the inequality of this name.")
@click.option("--at", multiple=True, metavar="SYMBOL=VALUE",
              help="Give a symbol an exact value; every symbol needs one, or none has.")
@json_option
@quiet_option
def bound(
    network: str,
    response: str,
    only: str | None,
    at: tuple[str, ...],
    as_json: bool,
    quiet: bool,
) -> int:
    """Say which inequalities limit a response, what in the network sets the limit, and the source.

    With --at both sides are evaluated: exactly where all rates are rational (give energies and
    drives as 2*ln(fraction)), else by rigorous enclosures.

    \b
    Names: energy-covariance, energy-range, splitting-end-pair, end-pair,
      splitting-barrier, barrier, splitting-drive, drive, local-end-pair,
      local-change, bundle, parameter, directed-bundle, support, current-exact,
      current-range, second-order, finite-end-pair, finite-change, path

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
        report = make_report(analysis_of(read(network), progress), response, values, only)
    click.echo(json.dumps(report_data(report), indent=1) if as_json else report_text(report))
    if report.refuted():
        return REFUTED
    return UNDECIDED if report.undecided() else 0


@click.command(short_help="Certificates that inequalities hold, and how tight they are.")
@network_argument
@click.argument("response")
@click.option("--bound", "only", metavar="NAME", help="Only the inequality of this name.")
@click.option("--points", type=click.IntRange(min=1), default=1000, show_default=True, metavar="N",
              help="Sample N exact points.")
@click.option("--seed", default="0", show_default=True, metavar="TEXT",
              help="Any text; the same text draws the same points.")
@click.option("--workers", type=click.IntRange(min=1), metavar="N",
              help="Use N processes (default: all cores).")
@click.option("--proof-only", is_flag=True, help="No points.")
@click.option("--points-only", is_flag=True, help="No proofs.")
@click.option("-o", "--output", type=click.Path(), metavar="FILE", help="Write the certificate.")
@json_option
@quiet_option
def certify(
    network: str,
    response: str,
    only: str | None,
    points: int,
    seed: str,
    workers: int | None,
    proof_only: bool,
    points_only: bool,
    output: str | None,
    as_json: bool,
    quiet: bool,
) -> int:
    """Prove every inequality that limits a response for all positive rates of the network.

    What has no proof is tried at many exact points, and where it is tight.

    \b
    Names: energy-covariance, energy-range, splitting-end-pair, end-pair,
      splitting-barrier, barrier, splitting-drive, drive, local-end-pair,
      local-change, bundle, parameter, directed-bundle, support, current-exact,
      current-range, second-order, finite-end-pair, finite-change, path

    \b
    Example:
      symbolic-response certify net.toml "d p[A] / d barrier[bind]" -o bind.json
    """
    from symbolic_response.certificates.certify import certify as make_certificate
    from symbolic_response.certificates.record import write_certificate
    from symbolic_response.certificates.report import certificate_data, certificate_text
    from symbolic_response.files import check_output

    if proof_only and points_only:
        raise click.UsageError("--proof-only and --points-only exclude each other; give one")
    method = "proof" if proof_only else "points" if points_only else "strongest"
    if output is not None:
        check_output(output, network)
    with Progress(quiet) as progress:
        progress.stage(f"certifying {response}")
        analysis = analysis_of(read(network), lambda done, total: None)
        made = make_certificate(analysis, response, only=only, method=method,
                                count=points, seed=seed, workers=workers, progress=progress)
    anything = made.proved.claims or made.points is not None
    written = output if made.refuted is None and anything else None
    if written is not None:
        write_certificate(made, analysis, written)
    if as_json:
        click.echo(json.dumps(certificate_data(made, written), indent=1))
    elif made.refuted is None:
        click.echo(certificate_text(made, written))
    if made.refuted is not None:
        return fail(made.refuted.message(), REFUTED)
    return UNDECIDED if made.without else 0


@click.command(short_help="The independent check of certificates.")
@click.argument("files", nargs=-1, required=True, metavar="FILE...", type=click.Path())
@json_option
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
