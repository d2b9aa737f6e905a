"""The command line: verbs, progress, exit status. No mathematics.

Exit status: 0 done; 1 something was refuted; 2 the input cannot be used; 3 undecided or beyond a
size limit; 130 interrupted.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from typing import Any

import click

from symbolic_response.cli.bounding import bound, certify, recheck
from symbolic_response.cli.comparing import compare
from symbolic_response.cli.controlling import cloud, curve, steepness
from symbolic_response.cli.deriving import appendix, derive, survey
from symbolic_response.cli.drawing import draw
from symbolic_response.cli.exporting import export
from symbolic_response.cli.status import INTERRUPTED, REFUTED, UNDECIDED, UNUSABLE, fail
from symbolic_response.errors import (
    FormulaError,
    InputError,
    RefutedError,
    SizeLimitError,
    SymbolicResponseError,
    UndecidedError,
)


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
        return fail(error.format_message().rstrip(".") + hint, UNUSABLE)
    except click.ClickException as error:
        return fail(error.format_message(), UNUSABLE)
    except FormulaError as error:
        status = fail(str(error), UNUSABLE)
        if error.excerpt:
            click.echo(error.pointed(), err=True)
        return status
    except InputError as error:
        return fail(str(error), UNUSABLE)
    except (SizeLimitError, UndecidedError) as error:
        return fail(str(error), UNDECIDED)
    except RefutedError as error:
        return fail(str(error), REFUTED)
    except SymbolicResponseError as error:
        return fail(str(error), UNUSABLE)
    except (_InterruptedError, KeyboardInterrupt, click.Abort):
        return fail("interrupted", INTERRUPTED)
    except MemoryError:
        return fail("out of memory: the network is too large for a closed form; exact values with"
                     " --at still work", UNDECIDED)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except OSError as error:
        place = f"{error.filename}: " if error.filename else ""
        return fail(f"{place}{(error.strerror or str(error)).lower()}", UNUSABLE)


@click.group(
    cls=_Verbs, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100}
)
@click.version_option(package_name="symbolic-response", message="%(version)s")
def main() -> None:
    """Exact steady states and responses of small driven kinetic networks.

    NETWORK is a network file (TOML); its format is in the README.
    """


for _verb in (survey, derive, bound, certify, recheck, steepness, curve, cloud, compare,
              appendix, draw, export):
    main.add_command(_verb)
