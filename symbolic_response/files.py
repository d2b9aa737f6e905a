"""Writing files that belong together, whole or not at all."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Mapping
from pathlib import Path

from symbolic_response.errors import OutputError


def check_output(
    path: str | os.PathLike[str], source: str | os.PathLike[str] | None = None
) -> None:
    """Raise OutputError where a file of that name cannot be made, or is ``source``, the input."""
    target = Path(path)
    if source is not None and _same_file(target, Path(source)):
        raise OutputError(f"{str(target)!r} is the network file itself; choose another name")
    if target.is_dir():
        raise OutputError(f"{str(target)!r} is a folder; give the name of a file")
    if not target.parent.is_dir():
        raise OutputError(f"there is no folder {str(target.parent)!r}; make it first")


def _same_file(one: Path, other: Path) -> bool:
    return one.exists() and other.exists() and one.samefile(other)


def write_files(contents: Mapping[Path, str | bytes]) -> None:
    """Write files, texts in UTF-8; OutputError where one cannot be written, then none is."""
    for target in contents:
        check_output(target)
    made: dict[Path, str] = {}
    target = next(iter(contents))
    try:
        for target, content in contents.items():
            made[target] = _temporary(target, content)
        for target, temporary in made.items():
            os.replace(temporary, target)
    except BaseException as error:
        for temporary in made.values():
            with contextlib.suppress(OSError):
                os.unlink(temporary)
        if isinstance(error, OSError):
            raise OutputError(f"cannot write {str(target)!r}: {error.strerror}") from None
        raise


def _temporary(target: Path, content: str | bytes) -> str:
    """Write a file beside its target, and return where; nothing is left behind on failure."""
    handle, temporary = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name}.")
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(content.encode() if isinstance(content, str) else content)
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(temporary, 0o666 & ~mask)
    except BaseException:
        os.unlink(temporary)
        raise
    return temporary
