"""Exit statuses, and the one line that says what went wrong."""

from __future__ import annotations

import contextlib

import click

REFUTED, UNUSABLE, UNDECIDED, INTERRUPTED = 1, 2, 3, 130
MAX_MESSAGE = 700


def fail(message: str, status: int) -> int:
    """Print one line on standard error; return the status."""
    line = " ".join(message.split())
    if len(line) > MAX_MESSAGE:
        line = f"{line[: MAX_MESSAGE - 100]} ... {line[-100:]}"
    with contextlib.suppress(OSError):
        click.echo(f"error: {line}", err=True)
    return status
