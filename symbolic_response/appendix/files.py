"""Writing files that belong together, whole or not at all."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Mapping
from pathlib import Path

from symbolic_response.certificates.record import check_output
from symbolic_response.errors import OutputError


def write_files(texts: Mapping[Path, str]) -> None:
    """Write texts to files in UTF-8; OutputError where one cannot be written, then none is."""
    for target in texts:
        check_output(target)
    made: dict[Path, str] = {}
    target = next(iter(texts))
    try:
        for target, text in texts.items():
            made[target] = _temporary(target, text)
        for target, temporary in made.items():
            os.replace(temporary, target)
    except BaseException as error:
        for temporary in made.values():
            with contextlib.suppress(OSError):
                os.unlink(temporary)
        if isinstance(error, OSError):
            raise OutputError(f"cannot write {str(target)!r}: {error.strerror}") from None
        raise


def _temporary(target: Path, text: str) -> str:
    """Write a text beside its target, and return where; nothing is left behind on failure."""
    handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.")
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(text)
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(temporary, 0o666 & ~mask)
    except BaseException:
        os.unlink(temporary)
        raise
    return temporary
