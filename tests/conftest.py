"""Fixtures shared by the tests."""

from __future__ import annotations

import os
import shutil

import pytest
from hypothesis import settings

# Random examples are new at every run, except in CI, where a run must be repeatable.
settings.register_profile("repeatable", derandomize=True)
if os.environ.get("CI"):
    settings.load_profile("repeatable")


@pytest.fixture
def requires_latex() -> None:
    """Skip where pdflatex or pdftotext is missing; fail there if the variable CI is set."""
    missing = [name for name in ("pdflatex", "pdftotext") if shutil.which(name) is None]
    if not missing:
        return
    message = f"{' and '.join(missing)} not installed"
    if os.environ.get("CI"):
        pytest.fail(f"{message}, and CI must not skip what needs it")
    pytest.skip(message)
